import { describe } from 'vitest'
import { around, even, exponent, oddSeries, positive, testAccuracyOfOne, wide } from './exact.js'

describe('detmath: inverse hyperbolic functions', () => {
  testAccuracyOfOne(
    'asinh',
    oddSeries([-1, 6], [3, 40], (x) => {
      const size = x.abs().plus(x.times(x).plus(1).sqrt()).ln()
      return x.isNegative() ? size.neg() : size
    }),
    [even(-3, 3), exponent(-60, 1023)],
    around(2, 268435456, 3.725290298461914e-9),
  )
  testAccuracyOfOne(
    'acosh',
    (x) => {
      const y = new wide(x)
      return y.plus(y.minus(1).times(y.plus(1)).sqrt()).ln()
    },
    [even(1, 3), positive(0, 1023)],
    around(1.0000000000000004, 2, 268435456),
  )
  testAccuracyOfOne(
    'atanh',
    oddSeries([1, 3], [1, 5], (x) => x.plus(1).div(new wide(1).minus(x)).ln().div(2)),
    [even(-1, 1), exponent(-60, -2)],
    around(0.5, -0.5, 0.9999999999999997),
  )
})
