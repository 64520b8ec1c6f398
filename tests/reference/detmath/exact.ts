// How the tests of detmath measure: inputs from fixed streams and hard points, exact values to 40 digits from
// decimal.js (which shares neither method nor code with detmath), errors in units in the last place.

import { Decimal } from 'decimal.js'
import { expect, test } from 'vitest'
import { detMath } from '../../../shared/detmath/index.js'
import { powerOfTwo } from '../../../shared/detmath/words.js'
import { type Stream, stream } from '../../../shared/streams.js'

/** Chosen before anything was measured. */
const seed = 20_261_201
const drawsPerFunction = 2000
/** Seconds on a quiet machine; much more only where many others compute at the same time. */
const timeLimitMs = 120_000

export const precise = Decimal.clone({ precision: 40 })
/** For values whose leading digits cancel. */
export const wide = Decimal.clone({ precision: 56 })
const long = Decimal.clone({ precision: 90 })
const halves: Decimal[] = [new long(1)]
for (let n = 1; n <= 1074; n++) halves.push(halves[n - 1]!.div(2))

/**
 * The value of a double: integers exactly, others to 90 digits. (decimal.js itself would take the shortest
 * decimal that names the double, which is up to half a unit away.)
 */
export function exactly(x: number): Decimal {
  let n = 0
  for (; !Number.isInteger(x); n++) x *= 2
  const whole = BigInt(x).toString()
  return n === 0 ? new long(whole) : new long(whole).times(halves[n]!)
}

/** Where inputs are drawn: evenly between two numbers, or evenly in the exponent of two, with either sign. */
export type Range = (s: Stream) => number
export const even =
  (from: number, to: number): Range =>
  (s) =>
    from + s.uniform() * (to - from)
export const positive =
  (from: number, to: number): Range =>
  (s) => {
    const power = from + s.below(to - from + 1)
    return (
      (1 + s.uniform()) * (power < -1022 ? powerOfTwo(-1022) * powerOfTwo(power + 1022) : powerOfTwo(power))
    )
  }
export const exponent =
  (from: number, to: number): Range =>
  (s) =>
    positive(from, to)(s) * (s.chance(1, 2) ? 1 : -1)

/** The five doubles at each number: where methods change over and where results are near 0 or 1. */
export function around(...centres: readonly number[]): number[] {
  const view = new DataView(new ArrayBuffer(8))
  return centres.flatMap((centre) =>
    [-2n, -1n, 0n, 1n, 2n].map((step) => {
      view.setFloat64(0, centre)
      view.setBigInt64(0, view.getBigInt64(0) + step)
      return view.getFloat64(0)
    }),
  )
}

/** Spacing of doubles where the exact value lies. */
function unitInLastPlace(exact: Decimal): Decimal {
  let power = -1022
  const size = Math.abs(exact.toNumber())
  if (size > powerOfTwo(-1022)) {
    power = Math.min(1023, Math.floor(Math.log2(size)))
    if (exactly(powerOfTwo(power)).greaterThan(exact.abs())) power--
    else if (power < 1023 && exactly(powerOfTwo(power + 1)).lessThanOrEqualTo(exact.abs())) power++
  }
  return new long(2).pow(power - 52)
}

const largest = exactly(Number.MAX_VALUE)

/** Error in units in the last place; an infinity is right only beyond the largest double. */
function errorOf(found: number, exact: Decimal): number {
  if (!Number.isFinite(found)) return exact.abs().greaterThan(largest) ? 0 : Infinity
  return exactly(found).minus(exact).abs().div(unitInLastPlace(exact)).toNumber()
}

const functions = detMath as unknown as { readonly [name: string]: (...x: readonly number[]) => number }

/** Draws from the kinds of input in turn, then the hard points; all must be at most 2 units wrong. */
export function testAccuracy(
  name: string,
  exact: (...x: readonly Decimal[]) => Decimal,
  inputs: readonly ((s: Stream) => readonly number[])[],
  hard: readonly (readonly number[])[],
): void {
  test(`${name} is at most 2 units in the last place wrong`, { timeout: timeLimitMs }, () => {
    const s = stream(seed, 'spare', ...(Array.from(name.slice(0, 3), (c) => c.charCodeAt(0)) as [number]))
    const drawn = Array.from({ length: drawsPerFunction }, (_, i) => inputs[i % inputs.length]!(s))
    let error = 0
    let at = ''
    for (const point of [...drawn, ...hard]) {
      const found = errorOf(functions[name]!(...point), exact(...point.map(exactly)))
      if (found <= error) continue // a NaN goes on
      error = found
      at = point.join(', ')
    }
    console.log(`${name}: largest error ${error.toFixed(3)} units in the last place, at ${at}`)
    expect(error, `at ${at}`).toBeLessThanOrEqual(2)
  })
}

/** The same for a function of one argument. */
export function testAccuracyOfOne(
  name: string,
  exact: (x: Decimal) => Decimal,
  ranges: readonly Range[],
  hard: readonly number[],
): void {
  testAccuracy(
    name,
    (x) => exact(x!),
    ranges.map((range) => (s) => [range(s)]),
    hard.map((x) => [x]),
  )
}

/** x + c3 x^3 + c5 x^5 for |x| below 1e-8 (enough for 40 digits), where the exact formula would cancel. */
export function oddSeries(
  c3: readonly [number, number],
  c5: readonly [number, number],
  exact: (x: Decimal) => Decimal,
): (x: Decimal) => Decimal {
  return (x) => {
    const y = new wide(x)
    if (y.abs().greaterThan('1e-8')) return exact(y)
    const cube = y.pow(3)
    return y.plus(cube.times(c3[0]).div(c3[1])).plus(cube.times(y).times(y).times(c5[0]).div(c5[1]))
  }
}
