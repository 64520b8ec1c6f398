// sin, cos and tan, ported from fdlibm (k_sin.c, k_cos.c, k_tan.c, s_sin.c; Sun Microsystems 1993, see
// NOTICE.txt). The argument is first reduced to [-pi/4, pi/4] (reduction.ts), as a sum of two doubles.

import { reduceByHalfPi, reduced } from './reduction.js'
import { withoutLowWord } from './words.js'

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

/** tan of (x + y) on [-pi/4, pi/4], or -1/tan where `inverted` (fdlibm k_tan.c). */
function kernelTan(x: number, y: number, inverted: boolean): number {
  const negative = x < 0
  const large = Math.abs(x) >= 0.67434
  if (large) {
    const z = 0.7853981633974483 - (negative ? -x : x)
    x = z + (3.061616997868383e-17 - (negative ? -y : y))
    y = 0
  }
  const z = x * x
  const r = tanTail(z, x, y)
  const w = x + r
  if (large) {
    const v = inverted ? -1 : 1
    const result = v - 2 * (x - ((w * w) / (w + v) - r))
    return negative ? -result : result
  }
  if (!inverted) return w
  // -1 / (x + r), carefully: the quotient of the rounded sum alone would lose a bit.
  const upper = withoutLowWord(w)
  const v = r - (upper - x)
  const quotient = -1 / w
  const t = withoutLowWord(quotient)
  return t + quotient * (1 + t * upper + t * v)
}

/** tan(x + y) - x (coefficients of k_tan.c). */
function tanTail(z: number, x: number, y: number): number {
  const w = z * z
  const odd =
    0.13333333333320124 +
    w *
      (0.021869488294859542 +
        w *
          (0.0035920791075913124 +
            w * (0.0005880412408202641 + w * (7.817944429395571e-5 + w * -1.8558637485527546e-5))))
  const even =
    z *
    (0.05396825397622605 +
      w *
        (0.0088632398235993 +
          w *
            (0.0014562094543252903 +
              w * (0.0002464631348184699 + w * (7.140724913826082e-5 + w * 2.590730518636337e-5)))))
  const s = z * x
  return y + z * (s * (odd + even) + y) + 0.3333333333333341 * s
}

/** Tangent of x in radians. */
export function tan(x: number): number {
  const size = Math.abs(x)
  if (size < 3.725290298461914e-9 /* 2^-28 */) return x
  if (size <= 0.7853981633974483) return kernelTan(x, 0, false)
  if (!(size < Infinity)) return NaN
  const quadrant = reduceByHalfPi(x)
  return kernelTan(reduced[0]!, reduced[1]!, (quadrant & 1) === 1)
}
