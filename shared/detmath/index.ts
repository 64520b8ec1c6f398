// Mathematical functions that give the same bits on every processor and every version of the host: made of
// + - * / and square root, which IEEE 754 rounds alike everywhere. Errors are at most 2 units in the last
// place (measured in tests/reference/detmath). The host's own functions differ between processor
// families in the last bit, which is enough to make two searches differ.

import { exp, log } from './exponential.js'
import { acosh, asinh, atanh, cosh, expm1, sinh, tanh } from './hyperbolic.js'
import { acos, asin, atan, atan2 } from './inverse-trigonometry.js'
import { log1p, log2, log10 } from './logarithms.js'
import { cbrt, hypot, pow } from './power.js'
import { cos, sin, tan } from './trigonometry.js'

export {
  acos,
  acosh,
  asin,
  asinh,
  atan,
  atan2,
  atanh,
  cbrt,
  cos,
  cosh,
  exp,
  expm1,
  hypot,
  log,
  log1p,
  log2,
  log10,
  pow,
  sin,
  sinh,
  tan,
  tanh,
}

/** Math.random has no place in a problem. */
function random(): never {
  throw new Error(
    'Math.random() gives another number each time: draw from the stream that drawCondition is given instead.',
  )
}

/**
 * Stands in for the host's Math in plug-in bundles: the same names, host functions only where every host gives
 * the same bits.
 */
export const detMath = Object.freeze({
  E: Math.E,
  LN10: Math.LN10,
  LN2: Math.LN2,
  LOG10E: Math.LOG10E,
  LOG2E: Math.LOG2E,
  PI: Math.PI,
  SQRT1_2: Math.SQRT1_2,
  SQRT2: Math.SQRT2,
  abs: Math.abs,
  ceil: Math.ceil,
  clz32: Math.clz32,
  floor: Math.floor,
  fround: Math.fround,
  imul: Math.imul,
  max: Math.max,
  min: Math.min,
  round: Math.round,
  sign: Math.sign,
  sqrt: Math.sqrt,
  trunc: Math.trunc,
  acos,
  acosh,
  asin,
  asinh,
  atan,
  atan2,
  atanh,
  cbrt,
  cos,
  cosh,
  exp,
  expm1,
  hypot,
  log,
  log1p,
  log2,
  log10,
  pow,
  sin,
  sinh,
  tan,
  tanh,
  random,
})
