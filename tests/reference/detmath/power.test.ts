import type { Decimal } from 'decimal.js'
import { describe } from 'vitest'
import type { Stream } from '../../../shared/streams.js'
import { around, even, exponent, positive, testAccuracy, testAccuracyOfOne, wide } from './exact.js'

const tiny = [5e-324, 1e-320, 1e-310, 2.2250738585072014e-308]

/** A base of any size and an exponent that keeps the result between the smallest and the largest double. */
function anyPower(s: Stream): number[] {
  const x = positive(-1074, 1023)(s)
  return [x, ((s.uniform() - 0.5) * 2146) / Math.log2(x)]
}
/** A base near 1 with a huge exponent: nearly all digits of the logarithm count. */
function nearOne(s: Stream): number[] {
  const x = 1 + exponent(-52, -4)(s)
  return [x, ((s.uniform() - 0.5) * 2146) / Math.log2(x)]
}
function wholePower(s: Stream): number[] {
  return [even(-30, 30)(s), s.below(101) - 50]
}

describe('detmath: powers and roots', () => {
  testAccuracy(
    'pow',
    (x, y) => new wide(x!).pow(y!),
    [(s) => [even(0.5, 2)(s), even(-1000, 1000)(s)], anyPower, nearOne, wholePower],
    [
      ...around(2, 10, 0.5, 1 / 3).flatMap((x) => around(0.5, 3, -1, 307.5).map((y) => [x, y])),
      ...around(1.0000000000000004).map((x) => [x, 1e15]),
      // e_pow.c is 319 units wrong here (found by this test).
      [0.9999999098962237, -7132083139.292806],
      ...around(-1074, 1023.9999999999999).map((y) => [2, y]),
    ],
  )
  testAccuracyOfOne(
    'cbrt',
    (x) => new wide(x).cbrt(),
    [even(-30, 30), exponent(-1074, 1023)],
    [...around(8, 27, -1, 1e300), ...tiny],
  )
  const sizes = [even(-4, 4), exponent(-1074, 1022), exponent(-1070, -1050)]
  testAccuracy(
    'hypot',
    (...x) => x.reduce<Decimal>((sum, y) => sum.plus(new wide(y).pow(2)), new wide(0)).sqrt(),
    sizes.flatMap((range) => [
      (s: Stream) => [range(s), range(s)],
      (s: Stream) => [range(s), range(s), range(s)],
    ]),
    around(1, -3, 1e154, 1e-154).map((x) => [x, 1, 1e154]),
  )
})
