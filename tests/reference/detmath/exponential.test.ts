import { Decimal } from 'decimal.js'
import { describe } from 'vitest'
import { around, even, exponent, positive, precise, testAccuracyOfOne, wide } from './exact.js'

const ln2 = Math.LN2
const tiny = [5e-324, 1e-320, 1e-310, 2.2250738585072014e-308]
const positives = [even(0.5, 2), positive(-1074, 1023)]

/** e^x - 1 and log(1 + x) lose digits that cancel; below 1e-12 a series has them. */
function exactExpm1(x: Decimal): Decimal {
  const y = new wide(x)
  if (y.abs().greaterThan('1e-12')) return y.exp().minus(1)
  return y.plus(y.pow(2).div(2)).plus(y.pow(3).div(6)).plus(y.pow(4).div(24))
}
function exactLog1p(x: Decimal): Decimal {
  const y = new wide(x)
  if (y.abs().greaterThan('1e-12')) return y.plus(1).ln()
  return y.minus(y.pow(2).div(2)).plus(y.pow(3).div(3)).minus(y.pow(4).div(4))
}

describe('detmath: exponentials and logarithms', () => {
  testAccuracyOfOne(
    'exp',
    (x) => new precise(x).exp(),
    [even(-2, 2), even(-745, 709.7), exponent(-60, 9)],
    around(709.782712893384, -708.3964185322641, -745.13, ln2 / 2, -ln2 / 2, 1.5 * ln2, 1, -1),
  )
  testAccuracyOfOne(
    'expm1',
    exactExpm1,
    [even(-2, 2), even(-50, 709.7), exponent(-1074, 9)],
    around(709.782712893384, -38.8, ln2 / 2, -ln2 / 2, 1.5 * ln2, -1.5 * ln2, 19.5 * ln2, 56.5 * ln2),
  )
  testAccuracyOfOne('log', (x) => new precise(x).ln(), positives, [
    ...around(1, Math.SQRT2, Math.SQRT1_2, 1.0000009536743164),
    ...tiny,
  ])
  testAccuracyOfOne(
    'log1p',
    exactLog1p,
    [even(-0.99, 2), exponent(-1074, -1), positive(-60, 1023)],
    around(-0.2928, 0.4142, 1.862645149230957e-9, 1, -0.9999999999999998, 9007199254740992),
  )
  testAccuracyOfOne('log2', (x) => Decimal.log2.call(precise, x), positives, [
    ...around(1, Math.SQRT2, 1024),
    ...tiny,
  ])
  testAccuracyOfOne('log10', (x) => Decimal.log10.call(precise, x), positives, [
    ...around(1, 10, 1000, 1e15),
    ...tiny,
  ])
})
