// log1p, log2 and log10, ported from fdlibm and its maintained descendant in FreeBSD (s_log1p.c, e_log2.c,
// e_log10.c; Sun Microsystems 1993, see NOTICE.txt).

import { ln2High, ln2Low, logPolynomial } from './exponential.js'
import { highWord, withHighWord, withoutLowWord } from './words.js'

/** Argument of the last reduction: log(x) = exponent * log(2) + log(1 + f), f about -0.29 to 0.41. */
const reducedArgument = new Float64Array(2)

/** x > 0, finite. Leaves [exponent, f] in `reducedArgument`. */
function reduceLogarithm(x: number): void {
  let k = 0
  if (x < 2.2250738585072014e-308) {
    x *= 18014398509481984
    k = -54
  }
  const bits = highWord(x)
  const fraction = bits & 0xfffff
  const carry = (fraction + 0x95f64) & 0x100000
  reducedArgument[0] = k + (bits >> 20) - 1023 + (carry >> 20)
  reducedArgument[1] = withHighWord(x, fraction | (carry ^ 0x3ff00000)) - 1
}

/**
 * log(x) in another base: `exponentHigh + exponentLow` is log of 2 and `perHigh + perLow` that of e in the base.
 * log(1 + f) is kept as f - f*f/2 (upper, low word cleared) plus the rest.
 */
function logInBase(
  x: number,
  perHigh: number,
  perLow: number,
  exponentHigh: number,
  exponentLow: number,
): number {
  if (x < 0 || Number.isNaN(x)) return NaN
  if (x === 0) return -Infinity
  if (x === Infinity) return x
  if (x === 1) return 0
  reduceLogarithm(x)
  const k = reducedArgument[0]!
  const f = reducedArgument[1]!
  const half = 0.5 * f * f
  const s = f / (2 + f)
  const rest = s * (half + logPolynomial(s * s))
  const upper = withoutLowWord(f - half)
  const lower = f - upper - half + rest
  const product = upper * perHigh
  const whole = k * exponentHigh
  const sum = whole + product
  const tail = k * exponentLow + (lower + upper) * perLow + lower * perHigh + (whole - sum + product)
  return tail + sum
}

/** Logarithm to base 2; exact for powers of two. */
export function log2(x: number): number {
  return logInBase(x, 1.4426950407214463, 1.6751713164886512e-10, 1, 0)
}

/** Logarithm to base 10. */
export function log10(x: number): number {
  return logInBase(x, 0.4342944818781689, 2.5082946711645275e-11, 0.30102999566361177, 3.694239077158931e-13)
}

/** log(1 + x), accurate for small x: the rounding error of 1 + x is carried along. */
export function log1p(x: number): number {
  if (x < -1 || Number.isNaN(x)) return NaN
  if (x === -1) return -Infinity
  if (x === Infinity) return x
  const size = Math.abs(x)
  if (size < 1.862645149230957e-9 /* 2^-29 */) return size < 5.551115123125783e-17 ? x : x - x * x * 0.5
  if (x > -0.2928 && x < 0.4142) return logOfReduced(0, x, 0)
  let u = x
  let c = 0
  if (x < 9007199254740992) {
    u = 1 + x
    c = (u >= 2 ? 1 - (u - x) : x - (u - 1)) / u
  }
  reduceLogarithm(u)
  return logOfReduced(reducedArgument[0]!, reducedArgument[1]!, c)
}

/** k log 2 + log(1 + f) + c, smallest terms first. */
function logOfReduced(k: number, f: number, c: number): number {
  const half = 0.5 * f * f
  const s = f / (2 + f)
  const rest = s * (half + logPolynomial(s * s))
  if (k === 0) return f - (half - (rest + c))
  return k * ln2High - (half - (rest + (k * ln2Low + c)) - f)
}
