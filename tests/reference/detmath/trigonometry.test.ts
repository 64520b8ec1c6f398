import { Decimal } from 'decimal.js'
import { describe, expect, test } from 'vitest'
import { detMath } from '../../../shared/detmath/index.js'
import { powerOfTwo } from '../../../shared/detmath/words.js'
import { stream } from '../../../shared/streams.js'
import { around, even, exponent, precise, testAccuracyOfOne, wide } from './exact.js'

const halfPi = Decimal.clone({ precision: 400 }).acos(0)

/** Doubles next to multiples of pi/2, where nearly all digits of the reduction cancel. */
function nearHalfPis(): number[] {
  const s = stream(20_261_201, 'spare', 1)
  const multiples = Array.from({ length: 200 }, (_, i) =>
    i < 100 ? i + 1 : 1 + s.below(2 ** (8 + (i % 24))),
  )
  return multiples.map((n) => halfPi.times(n).toNumber())
}

// 6381956970095103 * 2^797 is the double that lies nearest to a multiple of pi/2, relative to its exponent
// (Muller: Elementary Functions, 2006, worst cases of range reduction; from memory). 1e22 is the example of Ng:
// Argument reduction for huge arguments: good to the last bit, 1992 (from memory).
const worst = 6381956970095103 * powerOfTwo(797)
const angles = [...nearHalfPis(), worst, 1e22, Number.MAX_VALUE, ...around(823549, Math.PI / 4, -Math.PI / 2)]
const ranges = [even(-4, 4), even(-1000, 1000), exponent(-40, 24), exponent(0, 1023)]
const tiny = [5e-324, -1e-310, 2.2250738585072014e-308]

describe('detmath: angles', () => {
  testAccuracyOfOne('sin', (x) => new precise(x).sin(), ranges, [...angles, ...tiny])
  testAccuracyOfOne('cos', (x) => new precise(x).cos(), ranges, [...angles, ...tiny])
  // Not decimal.js's own tangent, which loses digits beside its poles.
  testAccuracyOfOne('tan', (x) => new precise(x).sin().div(new wide(x).cos()), ranges, [...angles, ...tiny])

  // Source: Ng, 1992 (from memory): sin(10^22).
  test('the sine of a huge angle is the published one', () => {
    expect(detMath.sin(1e22)).toBe(-0.8522008497671888)
  })
})
