// asin, acos, atan and atan2, ported from fdlibm (e_asin.c, e_acos.c, s_atan.c, e_atan2.c; Sun Microsystems
// 1993, see NOTICE.txt).

import { highWord, withoutLowWord } from './words.js'

const halfPi = 1.5707963267948966
const halfPiTail = 6.123233995736766e-17
const piTail = 1.2246467991473532e-16

/** (asin(s) - s) / s as a rational function of t = s * s, on s <= 1/2. */
function asinRational(t: number): number {
  const p =
    t *
    (0.16666666666666666 +
      t *
        (-0.3255658186224009 +
          t *
            (0.20121253213486293 +
              t * (-0.04005553450067941 + t * (0.0007915349942898145 + t * 3.479331075960212e-5)))))
  const q =
    1 +
    t * (-2.403394911734414 + t * (2.0209457602335057 + t * (-0.6882839716054533 + t * 0.07703815055590194)))
  return p / q
}

/** sqrt(z) as a sum of two: the first with its low word cleared. */
function sqrtTail(z: number, root: number, upper: number): number {
  return (z - upper * upper) / (root + upper)
}

/** Arc sine, in radians. Above 1/2 from asin(x) = pi/2 - 2 asin(sqrt((1 - x) / 2)). */
export function asin(x: number): number {
  const size = Math.abs(x)
  if (!(size <= 1)) return NaN
  if (size === 1) return x * halfPi
  if (size < 0.5) return size < 7.450580596923828e-9 /* 2^-27 */ ? x : x + x * asinRational(x * x)
  const t = (1 - size) * 0.5
  const r = asinRational(t)
  const s = Math.sqrt(t)
  let y: number
  if (size >= 0.975) y = halfPi - (2 * (s + s * r) - halfPiTail)
  else {
    const upper = withoutLowWord(s)
    const p = 2 * s * r - (halfPiTail - 2 * sqrtTail(t, s, upper))
    const quarter = 0.7853981633974483
    y = quarter - (p - (quarter - 2 * upper))
  }
  return x > 0 ? y : -y
}

/** Arc cosine, in radians. */
export function acos(x: number): number {
  if (!(Math.abs(x) <= 1)) return NaN
  if (x === 1) return 0
  if (x === -1) return Math.PI
  if (Math.abs(x) < 0.5) return halfPi - (x - (halfPiTail - x * asinRational(x * x)))
  if (x < 0) {
    const z = (1 + x) * 0.5
    const s = Math.sqrt(z)
    return Math.PI - 2 * (s + (asinRational(z) * s - halfPiTail))
  }
  const z = (1 - x) * 0.5
  const s = Math.sqrt(z)
  const upper = withoutLowWord(s)
  return 2 * (upper + (asinRational(z) * s + sqrtTail(z, s, upper)))
}

/** atan at 1/2, 1, 3/2 and infinity, each as a sum of two. */
const atanHigh = [0.4636476090008061, 0.7853981633974483, 0.982793723247329, halfPi]
const atanLow = [2.2698777452961687e-17, 3.061616997868383e-17, 1.3903311031230998e-17, halfPiTail]

/** (x - atan(x)) / x on |x| < 7/16 (coefficients of s_atan.c). */
function atanPolynomial(x: number): number {
  const z = x * x
  const w = z * z
  const even =
    z *
    (0.3333333333333293 +
      w *
        (0.14285714272503466 +
          w *
            (0.09090887133436507 +
              w * (0.06661073137387531 + w * (0.049768779946159324 + w * 0.016285820115365782)))))
  const odd =
    w *
    (-0.19999999999876483 +
      w *
        (-0.11111110405462356 +
          w * (-0.0769187620504483 + w * (-0.058335701337905735 + w * -0.036531572744216916))))
  return even + odd
}

/** Arc tangent, in radians. From atan(x) = atan(c) + atan((x - c) / (1 + c x)) with the nearest c. */
export function atan(x: number): number {
  const size = Math.abs(x)
  if (Number.isNaN(x)) return x
  if (size >= 73786976294838210000 /* 2^66 */) return x > 0 ? halfPi + halfPiTail : -halfPi - halfPiTail
  if (size < 0.4375) return size < 7.450580596923828e-9 /* 2^-27 */ ? x : x - x * atanPolynomial(x)
  let nearest = 3
  let y = -1 / size
  if (size < 0.6875) {
    nearest = 0
    y = (2 * size - 1) / (2 + size)
  } else if (size < 1.1875) {
    nearest = 1
    y = (size - 1) / (size + 1)
  } else if (size < 2.4375) {
    nearest = 2
    y = (size - 1.5) / (1 + 1.5 * size)
  }
  const result = atanHigh[nearest]! - (y * atanPolynomial(y) - atanLow[nearest]! - y)
  return x < 0 ? -result : result
}

/** Angle of the point (x, y) from the x axis, -pi to pi, with the special cases of ECMAScript. */
export function atan2(y: number, x: number): number {
  if (Number.isNaN(x) || Number.isNaN(y)) return NaN
  const left = highWord(x) < 0 // also x = -0
  const below = highWord(y) < 0
  if (y === 0) return left ? (below ? -Math.PI : Math.PI) : y
  if (x === 0) return below ? -halfPi : halfPi
  if (Math.abs(x) === Infinity || Math.abs(y) === Infinity) return atan2Infinite(y, x)
  const apart = ((highWord(y) & 0x7fffffff) - (highWord(x) & 0x7fffffff)) >> 20
  let z: number
  if (apart > 60) return below ? -halfPi : halfPi
  if (left && apart < -60) z = 0
  else z = atan(Math.abs(y / x))
  if (left) z = Math.PI - (z - piTail)
  return below ? -z : z
}

function atan2Infinite(y: number, x: number): number {
  const below = highWord(y) < 0
  let z: number
  if (Math.abs(y) === Infinity) z = Math.abs(x) < Infinity ? halfPi : x > 0 ? Math.PI / 4 : 2.356194490192345
  else z = x > 0 ? 0 : Math.PI
  return below ? -z : z
}
