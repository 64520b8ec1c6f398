import { describe } from 'vitest'
import { around, even, exponent, oddSeries, testAccuracyOfOne, wide } from './exact.js'

const ln2 = Math.LN2
const sizes = [even(-3, 3), even(-711, 711), exponent(-60, 9)]

describe('detmath: hyperbolic functions', () => {
  testAccuracyOfOne(
    'sinh',
    oddSeries([1, 6], [1, 120], (x) => {
      const t = x.exp()
      return t.minus(new wide(1).div(t)).div(2)
    }),
    sizes,
    around(1, 22, 710.4758600739439),
  )
  testAccuracyOfOne(
    'cosh',
    (x) => {
      const t = new wide(x).exp()
      return t.plus(new wide(1).div(t)).div(2)
    },
    sizes,
    around(ln2 / 2, 22, 710.4758600739439),
  )
  testAccuracyOfOne(
    'tanh',
    oddSeries([-1, 3], [2, 15], (x) => {
      const t = x.times(2).exp()
      return t.minus(1).div(t.plus(1))
    }),
    [even(-3, 3), even(-25, 25), exponent(-60, 9)],
    around(1, 22, -1, -22),
  )
})
