// pow, cbrt and hypot. pow is ported from fdlibm (e_pow.c; Sun Microsystems 1993, see NOTICE.txt): log2(x) in
// more than double precision, times y, split into an integer and a fraction. cbrt after the same library
// (s_cbrt.c, with the polynomial of B. Evans' later version, 2003); hypot from exact squares.

import { expRational } from './exponential.js'
import { exactProductTail } from './pairs.js'
import { fromWords, highWord, lowWord, scaleByPowerOfTwo, withHighWord, withoutLowWord } from './words.js'

/** Upper and lower part of log2 |x| as the last logarithm left it. */
const logarithm = new Float64Array(2)

/**
 * log2 of a = |x| close to 1: log(1 + t) from its series. |t| <= 2^-20. The product with 1 / ln 2 is taken
 * exactly: t can have 33 bits, too many for the shortened constant of e_pow.c, and exponents that come here
 * are above 2^31, where half a unit of the logarithm is hundreds of units of the power.
 */
function logNearOne(a: number): void {
  const t = a - 1
  const w = t * t * (0.5 - t * (0.3333333333333333 - t * 0.25))
  const u = Math.LOG2E * t
  const v = exactProductTail(Math.LOG2E, t, u) + t * 2.0355273740931033e-17 - w * Math.LOG2E
  const upper = withoutLowWord(u + v)
  logarithm[0] = upper
  logarithm[1] = v - (upper - u)
}

/** log2 of a > 0 as 2^n * (1 or 1.5) * (1 + s) / (1 - s), with s in two parts. */
function logInTwoParts(a: number): void {
  let n = 0
  if (a < 2.2250738585072014e-308) {
    a *= 9007199254740992
    n = -53
  }
  const bits = highWord(a)
  n += (bits >> 20) - 0x3ff
  const fraction = bits & 0xfffff
  let near15 = 0
  let high = fraction | 0x3ff00000
  if (fraction > 0x3988e) {
    if (fraction < 0xbb67a) near15 = 1
    else {
      n += 1
      high -= 0x100000
    }
  }
  a = withHighWord(a, high)
  const centre = near15 === 1 ? 1.5 : 1
  const u = a - centre
  const v = 1 / (a + centre)
  const s = u * v
  const sHigh = withoutLowWord(s)
  const tHigh = fromWords(((high >> 1) | 0x20000000) + 0x80000 + (near15 << 18), 0)
  const sLow = v * (u - sHigh * tHigh - sHigh * (a - (tHigh - centre)))
  sumOfLogarithm(s, sHigh, sLow, n, near15 === 1)
}

/** log2 = n + log2(centre) + 2/ln2 (s + s^3/3 + ...) in two parts (coefficients of e_pow.c). */
function sumOfLogarithm(s: number, sHigh: number, sLow: number, n: number, near15: boolean): void {
  let s2 = s * s
  let r =
    s2 *
    s2 *
    (0.5999999999999946 +
      s2 *
        (0.4285714285785502 +
          s2 *
            (0.33333332981837743 +
              s2 * (0.272728123808534 + s2 * (0.23066074577556175 + s2 * 0.20697501780033842)))))
  r += sLow * (sHigh + s)
  s2 = sHigh * sHigh
  const tHigh = withoutLowWord(3 + s2 + r)
  const tLow = r - (tHigh - 3 - s2)
  const u = sHigh * tHigh
  const v = sLow * tHigh + tLow * s
  const pHigh = withoutLowWord(u + v)
  const pLow = v - (pHigh - u)
  const zHigh = 0.9617967009544373 * pHigh
  const zLow = -7.028461650952758e-9 * pHigh + pLow * 0.9617966939259756 + (near15 ? 1.350039202129749e-8 : 0)
  const centreHigh = near15 ? 0.5849624872207642 : 0
  const upper = withoutLowWord(zHigh + zLow + centreHigh + n)
  logarithm[0] = upper
  logarithm[1] = zLow - (upper - n - centreHigh - zHigh)
}

/** 2 to the power of (high + low), |high + low| <= 1075, times sign. */
function exp2OfSum(high: number, low: number, sign: number): number {
  const n = Math.round(high + low)
  high -= n
  const t = withoutLowWord(low + high)
  const u = t * 0.6931471824645996
  const v = (low - (t - high)) * Math.LN2 + t * -1.904654299957768e-9
  const z = u + v
  const w = v - (z - u)
  const c = z - expRational(z * z)
  const r = (z * c) / (c - 2) - (w + z * w)
  return sign * scaleByPowerOfTwo(1 - (r - z), n)
}

function isOddInteger(y: number): boolean {
  return Math.abs(y) < 9007199254740992 && Math.floor(y) === y && Math.floor(y / 2) !== y / 2
}

/** x to the power of y, with the special cases of ECMAScript (1 to the power of an infinity is NaN). */
export function pow(x: number, y: number): number {
  if (y === 0) return 1
  if (Number.isNaN(x) || Number.isNaN(y)) return NaN
  const size = Math.abs(x)
  if (Math.abs(y) === Infinity) {
    if (size === 1) return NaN
    return size > 1 === y > 0 ? Infinity : 0
  }
  const odd = isOddInteger(y)
  const sign = odd && highWord(x) < 0 ? -1 : 1
  if (size === 0 || size === Infinity) return sign * (size > 1 === y > 0 ? Infinity : 0)
  if (x < 0 && Math.floor(y) !== y) return NaN
  if (size === 1) return sign
  if (y === 1) return x
  if (y === 2) return x * x
  if (y === -1) return 1 / x
  if (y === 0.5) return Math.sqrt(x)
  return sign * powerOfPositive(size, y)
}

/** a to the power of y for finite a > 0 other than 1 and finite y. */
function powerOfPositive(a: number, y: number): number {
  if (Math.abs(y) > 2147483648) {
    const high = highWord(a)
    if (Math.abs(y) > 18446744073709552000 || high < 0x3fefffff || high > 0x3ff00000) {
      return a > 1 === y > 0 ? Infinity : 0
    }
    logNearOne(a)
  } else logInTwoParts(a)
  const upper = withoutLowWord(y)
  const low = (y - upper) * logarithm[0]! + y * logarithm[1]!
  const high = upper * logarithm[0]!
  if (high + low > 1025) return Infinity
  if (high + low < -1080) return 0
  return exp2OfSum(high, low, 1)
}

/** Cube root, with the sign of x. */
export function cbrt(x: number): number {
  const size = Math.abs(x)
  if (!(size < Infinity) || size === 0) return x
  // A first guess by dividing the exponent by 3: good to 5 bits.
  let t =
    size < 2.2250738585072014e-308
      ? fromWords(Math.floor(highWord(size * 18014398509481984) / 3) + 696219795, 0)
      : fromWords(Math.floor(highWord(size) / 3) + 715094163, 0)
  // A polynomial in r = t^3 / x: good to 23 bits.
  const r = t * t * (t / size)
  t *=
    1.87595182427177 +
    r * (-1.8849797954337717 + r * 1.6214297201053545) +
    r * r * r * (-0.758397934778766 + r * 0.14599619288661245)
  // Rounded up to 23 bits, so that t * t is exact; then one step of Newton's method: 53 bits.
  const lowBits = lowWord(t) + 0x80000000
  t = fromWords(highWord(t) + (lowBits >= 4294967296 ? 1 : 0), (lowBits & 0xc0000000) >>> 0)
  const quotient = size / (t * t)
  t += t * ((quotient - t) / (t + t + quotient))
  return x < 0 ? -t : t
}

/** Square root of the sum of squares, without overflow or underflow on the way; squares are summed exactly. */
export function hypot(...values: readonly number[]): number {
  let most = 0
  let notANumber = false
  for (const value of values) {
    const size = Math.abs(value)
    if (size === Infinity) return Infinity
    if (Number.isNaN(value)) notANumber = true
    else if (size > most) most = size
  }
  if (notANumber) return NaN
  if (most === 0) return 0
  const exponent = most < 2.2250738585072014e-308 ? -1074 : (highWord(most) >> 20) - 1023
  let sum = 0
  let tail = 0
  for (const value of values) {
    const scaled = scaleByPowerOfTwo(value, -exponent)
    const square = scaled * scaled
    tail += exactProductTail(scaled, scaled, square)
    const next = sum + square
    const shift = next - sum
    tail += sum - (next - shift) + (square - shift)
    sum = next
  }
  const root = Math.sqrt(sum)
  const square = root * root
  const correction = (sum - square - exactProductTail(root, root, square) + tail) / (2 * root)
  return scaleByPowerOfTwo(root + correction, exponent)
}
