import { Decimal } from 'decimal.js'
import { describe } from 'vitest'
import { around, even, exponent, positive, precise, testAccuracyOfOne, wide } from './exact.js'

const tiny = [5e-324, 1e-320, 1e-310, 2.2250738585072014e-308]
const positives = [even(0.5, 2), positive(-1074, 1023)]

/** log(1 + x) loses digits that cancel; below 1e-12 a series has them. */
function exactLog1p(x: Decimal): Decimal {
  const y = new wide(x)
  if (y.abs().greaterThan('1e-12')) return y.plus(1).ln()
  return y.minus(y.pow(2).div(2)).plus(y.pow(3).div(3)).minus(y.pow(4).div(4))
}

describe('detmath: logarithms', () => {
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
