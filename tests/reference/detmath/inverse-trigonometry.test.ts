import { Decimal } from 'decimal.js'
import { describe } from 'vitest'
import { around, even, exponent, precise, testAccuracy, testAccuracyOfOne } from './exact.js'

const tiny = [5e-324, -1e-310, 2.2250738585072014e-308]

describe('detmath: inverse functions of angles', () => {
  const arcs = [even(-1, 1), exponent(-60, -2)]
  const edges = around(0.5, -0.5, 0.975, 0.9999999999999997, -0.9999999999999997)
  testAccuracyOfOne('asin', (x) => new precise(x).asin(), arcs, edges)
  testAccuracyOfOne('acos', (x) => new precise(x).acos(), arcs, edges)
  const exactAtan = (x: Decimal): Decimal => (x.abs().lessThan('1e-50') ? x : new precise(x).atan())
  testAccuracyOfOne(
    'atan',
    exactAtan,
    [even(-4, 4), exponent(-1074, 1023)],
    [...around(0.4375, 0.6875, 1.1875, 2.4375, -1), ...tiny],
  )
  testAccuracy(
    'atan2',
    (y, x) => Decimal.atan2.call(precise, y!, x!),
    [even(-4, 4), exponent(-20, 20)].map((range) => (s) => [range(s), range(s)]),
    around(1, -1, 1e-10, 1e10).flatMap((y) => [
      [y, 1],
      [y, -1],
      [1, y],
      [-1, y],
    ]),
  )
})
