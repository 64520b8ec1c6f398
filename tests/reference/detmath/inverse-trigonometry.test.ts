import type { Decimal } from 'decimal.js'
import { describe } from 'vitest'
import { detMath } from '../../../shared/detmath/index.js'
import { around, even, exactly, exponent, precise, testAccuracy, testAccuracyOfOne, wide } from './exact.js'

const tiny = [5e-324, -1e-310, 2.2250738585072014e-308]

/**
 * The angle of the point (x, y), to 40 digits, from a double `near` it: by the addition theorems the difference
 * is atan((y cos a - x sin a) / (x cos a + y sin a)), which is its own tangent when a is off by 1e-16. (One
 * sine is a third of the work of an arc tangent.) An angle on the other side is answered by one far away.
 */
function angleOf(x: Decimal, y: Decimal, near: number): Decimal {
  const a = exactly(near)
  const sine = new wide(new precise(a).sin())
  const cosine = new wide(1)
    .minus(sine.times(sine))
    .sqrt()
    .times(Math.abs(near) > Math.PI / 2 ? -1 : 1)
  const along = cosine.times(x).plus(sine.times(y))
  const across = cosine.times(y).minus(sine.times(x))
  return along.isPositive() ? a.plus(across.div(along)) : a.plus(1)
}

/** The other side of a right triangle with hypotenuse 1. */
function side(x: Decimal): Decimal {
  return new wide(1).minus(new wide(x).times(x)).sqrt()
}

describe('detmath: inverse functions of angles', () => {
  const arcs = [even(-1, 1), exponent(-60, -2)]
  const edges = around(0.5, -0.5, 0.975, 0.9999999999999997, -0.9999999999999997)
  testAccuracyOfOne('asin', (x) => angleOf(side(x), x, detMath.asin(x.toNumber())), arcs, edges)
  testAccuracyOfOne('acos', (x) => angleOf(x, side(x), detMath.acos(x.toNumber())), arcs, edges)
  testAccuracyOfOne(
    'atan',
    (x) => angleOf(new wide(1), x, detMath.atan(x.toNumber())),
    [even(-4, 4), exponent(-1074, 1023)],
    [...around(0.4375, 0.6875, 1.1875, 2.4375, -1), ...tiny],
  )
  testAccuracy(
    'atan2',
    (y, x) => angleOf(x!, y!, detMath.atan2(y!.toNumber(), x!.toNumber())),
    [even(-4, 4), exponent(-20, 20)].map((range) => (s) => [range(s), range(s)]),
    around(1, -1, 1e-10, 1e10).flatMap((y) => [
      [y, 1],
      [y, -1],
      [1, y],
      [-1, y],
    ]),
  )
})
