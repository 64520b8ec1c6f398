// exp and log, ported from fdlibm (e_exp.c, e_log.c; Sun Microsystems 1993, see NOTICE.txt). Errors below
// 1 ulp by their authors' analysis; measured in tests/reference/detmath.

import { highWord, powerOfTwo, scaleByPowerOfTwo, withHighWord } from './words.js'

/** ln 2 in two parts; the first has 21 trailing zero bits, so that small integers times it are exact. */
export const ln2High = 0.6931471803691238
export const ln2Low = 1.9082149292705877e-10
const perLn2 = Math.LOG2E
const two54 = 18014398509481984

/** e to the power of x. */
export function exp(x: number): number {
  return expTimesPowerOfTwo(x, 0)
}

/**
 * e^x * 2^n with one rounding at the end, n from -2 to 2. Method: x = k ln 2 + r with |r| <= ln 2 / 2; e^r from
 * the rational approximation e^r = 1 + 2r / (R(r) - r), where R(r) = r (e^r + 1) / (e^r - 1) is a polynomial
 * in r * r.
 */
export function expTimesPowerOfTwo(x: number, n: number): number {
  if (Number.isNaN(x)) return x
  if (x > 712) return Infinity
  if (x < -750) return 0
  const size = Math.abs(x)
  if (size <= 0.34657359027997264) {
    if (size < 3.725290298461914e-9 /* 2^-28 */) return (1 + x) * powerOfTwo(n)
    const c = x - expRational(x * x)
    return (1 - ((x * c) / (c - 2) - x)) * powerOfTwo(n)
  }
  const k = size < 1.0397207708399179 ? (x < 0 ? -1 : 1) : Math.trunc(perLn2 * x + (x < 0 ? -0.5 : 0.5))
  const upper = x - k * ln2High
  const lower = k * ln2Low
  const r = upper - lower
  const c = r - expRational(r * r)
  return scaleByPowerOfTwo(1 - (lower - (r * c) / (2 - c) - upper), k + n)
}

/** R(r) - 2 over r * r, as a polynomial in t = r * r, times t (coefficients of e_exp.c). */
export function expRational(t: number): number {
  return (
    t *
    (0.16666666666666602 +
      t *
        (-0.0027777777777015593 +
          t * (6.613756321437934e-5 + t * (-1.6533902205465252e-6 + t * 4.1381367970572385e-8))))
  )
}

/** (log(1 + f) - (f - f*f/2)) in the form of e_log.c: with s = f / (2 + f), a polynomial in z = s * s, times z. */
export function logPolynomial(z: number): number {
  const w = z * z
  const even = w * (0.3999999999940942 + w * (0.22222198432149784 + w * 0.15313837699209373))
  const odd =
    z * (0.6666666666666735 + w * (0.2857142874366239 + w * (0.1818357216161805 + w * 0.14798198605116586)))
  return even + odd
}

/**
 * Natural logarithm. Method: x = 2^k (1 + f) with sqrt(1/2) < 1 + f < sqrt(2);
 * log(1 + f) = 2s + (2/3)s^3 + (2/5)s^5 ... with s = f / (2 + f), its tail replaced by a minimax polynomial.
 */
export function log(x: number): number {
  if (x < 0 || Number.isNaN(x)) return NaN
  if (x === 0) return -Infinity
  if (x === Infinity) return x
  let k = 0
  if (x < 2.2250738585072014e-308) {
    x *= two54
    k = -54
  }
  const bits = highWord(x)
  const fraction = bits & 0xfffff
  const carry = (fraction + 0x95f64) & 0x100000
  k += (bits >> 20) - 1023 + (carry >> 20)
  const f = withHighWord(x, fraction | (carry ^ 0x3ff00000)) - 1
  if (f === 0) return k === 0 ? 0 : k * ln2High + k * ln2Low
  if ((0xfffff & (2 + fraction)) < 3) {
    // |f| < 2^-20: the series itself.
    const r = f * f * (0.5 - 0.3333333333333333 * f)
    return k === 0 ? f - r : k * ln2High - (r - k * ln2Low - f)
  }
  const s = f / (2 + f)
  const r = logPolynomial(s * s)
  if (((fraction - 0x6147a) | (0x6b851 - fraction)) > 0) {
    const half = 0.5 * f * f
    return k === 0 ? f - (half - s * (half + r)) : k * ln2High - (half - (s * (half + r) + k * ln2Low) - f)
  }
  return k === 0 ? f - s * (f - r) : k * ln2High - (s * (f - r) - k * ln2Low - f)
}
