import type { Decimal } from 'decimal.js'
import { describe } from 'vitest'
import { around, even, exponent, precise, testAccuracyOfOne, wide } from './exact.js'

const ln2 = Math.LN2

/** e^x - 1 loses digits that cancel; below 1e-12 a series has them. */
function exactExpm1(x: Decimal): Decimal {
  const y = new wide(x)
  if (y.abs().greaterThan('1e-12')) return y.exp().minus(1)
  return y.plus(y.pow(2).div(2)).plus(y.pow(3).div(6)).plus(y.pow(4).div(24))
}
describe('detmath: exponentials', () => {
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
})
