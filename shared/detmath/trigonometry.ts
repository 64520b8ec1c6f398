// sin, cos and tan, ported from fdlibm (k_sin.c, k_cos.c, k_tan.c, s_sin.c; Sun Microsystems 1993, see
// NOTICE.txt). The argument is first reduced to [-pi/4, pi/4] (reduction.ts), as a sum of two doubles.

import { reduceByHalfPi, reduced } from './reduction.js'

/** sin of (x + y) on [-pi/4, pi/4], y the tail of x. */
function kernelSin(x: number, y: number): number {
  const z = x * x
  const v = z * x
  const r =
    0.00833333333332249 +
    z *
      (-0.0001984126982985795 +
        z * (2.7557313707070068e-6 + z * (-2.5050760253406863e-8 + z * 1.58969099521155e-10)))
  return x - (z * (0.5 * y - v * r) - y - v * -0.16666666666666632)
}

/** cos of (x + y) on [-pi/4, pi/4], y the tail of x. */
function kernelCos(x: number, y: number): number {
  const z = x * x
  const w = z * z
  const r =
    z * (0.0416666666666666 + z * (-0.001388888888887411 + z * 2.480158728947673e-5)) +
    w * w * (-2.7557314351390663e-7 + z * (2.087572321298175e-9 + z * -1.1359647557788195e-11))
  const half = 0.5 * z
  const near = 1 - half
  return near + (1 - near - half + (z * r - x * y))
}

/** Sine of x in radians. */
export function sin(x: number): number {
  const size = Math.abs(x)
  if (size < 1.4901161193847656e-8 /* 2^-26 */) return x
  if (size <= 0.7853981633974483) return kernelSin(x, 0)
  if (!(size < Infinity)) return NaN
  const quadrant = reduceByHalfPi(x)
  const y = (quadrant & 1) === 0 ? kernelSin(reduced[0]!, reduced[1]!) : kernelCos(reduced[0]!, reduced[1]!)
  return (quadrant & 2) === 0 ? y : -y
}

/** Cosine of x in radians. */
export function cos(x: number): number {
  const size = Math.abs(x)
  if (size <= 0.7853981633974483) return kernelCos(x, 0)
  if (!(size < Infinity)) return NaN
  const quadrant = reduceByHalfPi(x)
  const y = (quadrant & 1) === 0 ? kernelCos(reduced[0]!, reduced[1]!) : kernelSin(reduced[0]!, reduced[1]!)
  return ((quadrant + 1) & 2) === 0 ? y : -y
}
