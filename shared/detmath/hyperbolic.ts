// expm1, sinh, cosh, tanh and their inverses, ported from fdlibm (s_expm1.c, e_sinh.c, e_cosh.c,
// s_asinh.c, e_acosh.c, e_atanh.c; Sun Microsystems 1993, see NOTICE.txt), except tanh.

import { exp, expTimesPowerOfTwo, ln2High, ln2Low, log } from './exponential.js'
import { log1p } from './logarithms.js'
import { exactProductTail } from './pairs.js'
import { powerOfTwo } from './words.js'

const ln2 = Math.LN2

/** e^x - 1, accurate for small x. x = k ln 2 + r as in exp. */
export function expm1(x: number): number {
  if (Number.isNaN(x)) return x
  if (x > 709.782712893384) return Infinity
  const size = Math.abs(x)
  if (x < -38.816242411) return -1
  if (size < 5.551115123125783e-17 /* 2^-54 */) return x
  if (size <= 0.34657359027997264) return expm1Reduced(x, 0, 0)
  const k = size < 1.0397207708399179 ? (x < 0 ? -1 : 1) : Math.trunc(Math.LOG2E * x + (x < 0 ? -0.5 : 0.5))
  const upper = x - k * ln2High
  const lower = k * ln2Low
  const r = upper - lower
  return expm1Reduced(r, upper - r - lower, k)
}

/** 2^k e^(x + c) - 1 for |x| <= ln 2 / 2 (coefficients of s_expm1.c). */
function expm1Reduced(x: number, c: number, k: number): number {
  const half = 0.5 * x
  const square = x * half
  const r =
    1 +
    square *
      (-0.03333333333333313 +
        square *
          (0.0015873015872548146 +
            square *
              (-7.93650757867488e-5 + square * (4.008217827329362e-6 + square * -2.0109921818362437e-7))))
  const t = 3 - r * half
  let e = square * ((r - t) / (6 - x * t))
  if (k === 0) return x - (x * e - square)
  e = x * (e - c) - c - square
  if (k === -1) return 0.5 * (x - e) - 0.5
  if (k === 1) return x < -0.25 ? -2 * (e - (x + 0.5)) : 1 + 2 * (x - e)
  if (k <= -2 || k > 56) {
    const y = 1 - (e - x)
    return (k === 1024 ? y * 2 * powerOfTwo(1023) : y * powerOfTwo(k)) - 1
  }
  const small = powerOfTwo(-k)
  const y = k < 20 ? 1 - small - (e - x) : x - (e + small) + 1
  return y * powerOfTwo(k)
}

/** Hyperbolic sine. */
export function sinh(x: number): number {
  const size = Math.abs(x)
  if (!(size < Infinity) || size < 3.725290298461914e-9 /* 2^-28 */) return x
  const sign = x < 0 ? -0.5 : 0.5
  if (size < 22) {
    const t = expm1(size)
    return size < 1 ? sign * (2 * t - (t * t) / (t + 1)) : sign * (t + t / (t + 1))
  }
  const y = expTimesPowerOfTwo(size, -1)
  return x < 0 ? -y : y
}

/** Hyperbolic cosine. */
export function cosh(x: number): number {
  const size = Math.abs(x)
  if (!(size < Infinity)) return size
  if (size < 0.34657359027997264) {
    const t = expm1(size)
    const w = 1 + t
    return size < 2.7755575615628914e-17 /* 2^-55 */ ? w : 1 + (t * t) / (w + w)
  }
  if (size < 22) {
    const t = exp(size)
    return 0.5 * t + 0.5 / t
  }
  return expTimesPowerOfTwo(size, -1)
}

/**
 * Hyperbolic tangent, as t / (t + 2) with t = e^(2|x|) - 1. Errors of t shrink on the way; what the sum and the
 * quotient round away is put back, which keeps the error well below that of the usual form.
 */
export function tanh(x: number): number {
  const size = Math.abs(x)
  if (Number.isNaN(x) || size < 2.7755575615628914e-17 /* 2^-55 */) return x
  if (size >= 22) return x < 0 ? -1 : 1
  const t = expm1(2 * size)
  const sum = t + 2
  const sumTail = t > 2 ? 2 - (sum - t) : t - (sum - 2)
  const quotient = t / sum
  const product = quotient * sum
  const rest = t - product - exactProductTail(quotient, sum, product) - quotient * sumTail
  const z = quotient + rest / sum
  return x < 0 ? -z : z
}

/** Inverse hyperbolic sine. */
export function asinh(x: number): number {
  const size = Math.abs(x)
  if (!(size < Infinity) || size < 3.725290298461914e-9 /* 2^-28 */) return x
  let y: number
  if (size > 268435456) y = log(size) + ln2
  else if (size > 2) y = log(2 * size + 1 / (Math.sqrt(size * size + 1) + size))
  else {
    const t = size * size
    y = log1p(size + t / (1 + Math.sqrt(1 + t)))
  }
  return x < 0 ? -y : y
}

/** Inverse hyperbolic cosine; NaN below 1. */
export function acosh(x: number): number {
  if (!(x >= 1)) return NaN
  if (x >= 268435456) return log(x) + ln2
  if (x > 2) return log(2 * x - 1 / (x + Math.sqrt(x * x - 1)))
  // log(1 + u) with u = t + sqrt(2t + t^2); what rounding takes from u is put back afterwards.
  const t = x - 1
  const square = t * t
  const sum = 2 * t + square
  const sumTail = square - (sum - 2 * t) + exactProductTail(t, t, square)
  const root = Math.sqrt(sum)
  if (root === 0) return 0
  const rootSquare = root * root
  const rootTail = (sum - rootSquare - exactProductTail(root, root, rootSquare) + sumTail) / (2 * root)
  const u = root + t
  return log1p(u) + (t - (u - root) + rootTail) / (1 + u)
}

/** Inverse hyperbolic tangent; NaN beyond 1. */
export function atanh(x: number): number {
  const size = Math.abs(x)
  if (!(size <= 1)) return NaN
  if (size < 3.725290298461914e-9 /* 2^-28 */) return x
  if (size === 1) return x > 0 ? Infinity : -Infinity
  const t = size + size
  const y = 0.5 * (size < 0.5 ? log1p(t + (t * size) / (1 - size)) : log1p(t / (1 - size)))
  return x < 0 ? -y : y
}
