// Operators on bits, options, integers and layouts against their exact distributions. The distributions follow
// from the definitions (Bernoulli trials, uniform choice), so no other source is needed. Statistical checks have
// seeds chosen beforehand; bands are 4 standard errors or the 0.001 and 0.9999 quantiles of chi-square.

import { Decimal } from 'decimal.js'
import { describe, expect, test } from 'vitest'
import { gapsOf } from '../../coordinator/evolution/operators/gaps.js'
import { crossoverRows, mutationRows, rowOf } from '../../coordinator/evolution/operators/tables.js'
import type { Settings } from '../../coordinator/evolution/types.js'
import { bits, choice, integer, layout } from '../../shared/encodings.js'
import type { Encoding, PartValue } from '../../shared/genome.js'
import { type Stream, stream } from '../../shared/streams.js'

/** Quantiles 0.001 and 0.9999 of chi-square by degrees of freedom (recomputed with 25 digits). */
const chiSquareBand = { 9: [1.15195, 33.7199], 99: [61.1365, 160.0557] } as const

function expectUniform(counts: ArrayLike<number>, freedom: 9 | 99): void {
  expect(counts.length).toBe(freedom + 1)
  const all = Array.from(counts)
  const expected = all.reduce((sum, count) => sum + count, 0) / all.length
  expect(expected).toBeGreaterThanOrEqual(50)
  expectBand(
    all.reduce((sum, count) => sum + (count - expected) ** 2 / expected, 0),
    freedom,
  )
}

/** Each of `freedom` independent counts is binomial with this chance. */
function expectBinomials(counts: ArrayLike<number>, trials: number, chance: number, freedom: 9 | 99): void {
  expect(counts.length).toBe(freedom)
  const variance = trials * chance * (1 - chance)
  expectBand(
    Array.from(counts).reduce((sum, count) => sum + (count - trials * chance) ** 2 / variance, 0),
    freedom,
  )
}

function expectBand(statistic: number, freedom: 9 | 99): void {
  expect(statistic).toBeGreaterThan(chiSquareBand[freedom][0])
  expect(statistic).toBeLessThan(chiSquareBand[freedom][1])
}

/** A frequency within 4 standard errors of its chance. */
function expectChance(count: number, trials: number, chance: number): void {
  expect(Math.abs(count - trials * chance)).toBeLessThanOrEqual(4 * Math.sqrt(trials * chance * (1 - chance)))
}

const draws = (use: number): Stream => stream(20261201, 'spare', 1, use)
const mutation = (name: string, encoding: Encoding, settings: Settings) =>
  rowOf(mutationRows, name).build(encoding, settings)
const crossover = (name: string, encoding: Encoding, settings: Settings) =>
  rowOf(crossoverRows, name).build(encoding, settings)

describe('independent changes of genes', () => {
  test('every probability of a gap is exact to far better than 2^-32', () => {
    const fixed = (u: number): Stream => ({ uniform: () => u }) as Stream
    for (const rate of [0.5, 0.2, 1 / 7, 0.01, 1 / 1000, 1e-6]) {
      const gap = gapsOf(rate)
      for (const k of [1, 2, 3, 10, 50, 99, 1000]) {
        // The uniform numbers below the threshold give gaps below k: P(gap >= k) is 1 - threshold.
        let low = 0
        let high = 1
        for (let step = 0; step < 60; step++) {
          const middle = (low + high) / 2
          if (gap(fixed(middle)) >= k) high = middle
          else low = middle
        }
        const exact = new Decimal(1).minus(rate).pow(k).toNumber()
        expect(Math.abs(1 - high - exact)).toBeLessThan(2 ** -50)
      }
    }
  })
  test('chances of 0 and 1 are exact', () => {
    expect(gapsOf(0)(draws(0))).toBe(Infinity)
    expect(gapsOf(1)(draws(0))).toBe(0)
  })
})

describe('bit-flip: standard bit mutation', () => {
  for (const [flips, use] of [
    [1, 1],
    [4.95, 2],
    [49.5, 3],
  ] as const) {
    test(`99 bits with ${flips} flips expected: every bit flips with the same chance, independently`, () => {
      const length = 99
      const trials = 40_000
      const rate = flips / length
      const mutate = mutation('bit-flip', bits({ length }), { flips })
      const random = draws(use)
      const zeros = new Uint8Array(length)
      const counts = new Float64Array(length)
      const ofSize = new Float64Array(length + 1)
      let neighbours = 0
      for (let trial = 0; trial < trials; trial++) {
        const mutant = mutate(zeros, random)
        let size = 0
        for (let i = 0; i < length; i++) {
          counts[i]! += mutant[i]!
          size += mutant[i]!
          if (i > 0) neighbours += mutant[i]! & mutant[i - 1]!
        }
        ofSize[size]!++
      }
      expectBinomials(counts, trials, rate, 99)
      // How many flip: binomial, none included.
      let chance = (1 - rate) ** length
      for (let size = 0; size <= length; size++) {
        if (trials * chance >= 50) expectChance(ofSize[size]!, trials, chance)
        chance *= ((length - size) / (size + 1)) * (rate / (1 - rate))
      }
      // Neighbours both flip with chance rate^2. Pairs that share a bit are not independent: their covariance is
      // rate^3 - rate^4, and a run of `length` bits has length - 2 such couples.
      const pairs = length - 1
      const square = rate * rate
      const variance = pairs * (square - square * square) + 2 * (pairs - 1) * (rate ** 3 - square * square)
      expect(Math.abs(neighbours - trials * pairs * square)).toBeLessThan(4 * Math.sqrt(trials * variance))
    })
  }
})

describe('one-bit: randomised local search', () => {
  for (const length of [10, 100] as const) {
    test(`exactly one of ${length} bits flips, each as often`, () => {
      const mutate = mutation('one-bit', bits({ length }), {})
      const random = draws(10 + length)
      const counts = new Float64Array(length)
      const value = Uint8Array.from({ length }, (_, i) => i % 2)
      for (let trial = 0; trial < 200 * length; trial++) {
        const changed = changes(value, mutate(value, random))
        expect(changed.length).toBe(1)
        counts[changed[0]!]!++
      }
      expectUniform(counts, (length - 1) as 9 | 99)
    })
  }
})

/** The places where two values differ. */
function changes(a: PartValue, b: PartValue): number[] {
  return Array.from(a.keys()).filter((i) => a[i] !== b[i])
}

describe('reset', () => {
  const options = Array.from({ length: 11 }, (_, i) => `option ${i}`)
  const kinds: [string, Encoding, number][] = [
    ['choice', choice({ options, length: 9 }), 0],
    ['integer', integer({ low: -5, high: 5, length: 9 }), -5],
    ['layout', layout({ size: [3, 3], options }), 0],
  ]
  for (const [kind, encoding, low] of kinds) {
    test(`${kind}: each gene changes with chance changes / length, to each other value as often`, () => {
      const mutate = mutation('reset', encoding, { changes: 3 })
      const random = draws(31)
      const old = low + 4
      const value = new Int32Array(9).fill(old)
      const trials = 10_000
      const places = new Float64Array(9)
      const values = new Float64Array(11)
      for (let trial = 0; trial < trials; trial++) {
        const mutant = mutate(value, random)
        for (const i of changes(value, mutant)) {
          places[i]!++
          values[mutant[i]! - low]!++
        }
      }
      expectBinomials(places, trials, 1 / 3, 9)
      expect(values[4]).toBe(0)
      expectUniform(
        values.filter((_, index) => index !== 4),
        9,
      )
    })
  }
})

describe('creep', () => {
  test('a step of one: up or down as often; off the end the gene stays', () => {
    const mutate = mutation('creep', integer({ low: 3, high: 12 }), { changes: 1, step: 0 })
    const trials = 20_000
    for (const [from, chances] of [
      [3, { 3: 0.5, 4: 0.5 }],
      [7, { 6: 0.5, 8: 0.5 }],
      [12, { 11: 0.5, 12: 0.5 }],
    ] as const) {
      const random = draws(40 + from)
      const counts: Record<number, number> = {}
      for (let trial = 0; trial < trials; trial++) {
        const to = mutate(Int32Array.of(from), random)[0]!
        counts[to] = (counts[to] ?? 0) + 1
      }
      expect(Object.keys(counts)).toEqual(Object.keys(chances))
      for (const [to, chance] of Object.entries(chances)) expectChance(counts[Number(to)]!, trials, chance)
    }
  })
  test('without selection all values stay equally likely', () => {
    const mutate = mutation('creep', integer({ low: 0, high: 9 }), { changes: 1, step: 0.5 })
    const random = draws(45)
    const counts = new Float64Array(10)
    for (let walk = 0; walk < 5_000; walk++) {
      let value: PartValue = Int32Array.of(random.below(10))
      for (let step = 0; step < 10; step++) value = mutate(value, random)
      counts[value[0]!]!++
    }
    expectUniform(counts, 9)
  })
})

/** Which genes of a child of all zeros and all ones come from the second parent. */
function fromSecond(
  name: string,
  length: number,
  settings: Settings,
  trials: number,
  use: number,
): Uint8Array[] {
  const cross = crossover(name, bits({ length }), settings)
  const random = draws(use)
  const zeros = new Uint8Array(length)
  const ones = new Uint8Array(length).fill(1)
  return Array.from({ length: trials }, () => cross(zeros, ones, random) as Uint8Array)
}

const sum = (values: ArrayLike<number>): number =>
  Array.from(values).reduce((total, value) => total + value, 0)

describe('crossover by exchange', () => {
  for (const [exchange, use] of [
    [0.5, 50],
    [0.2, 51],
  ] as const) {
    test(`uniform: each gene comes from the second parent with chance ${exchange}, independently`, () => {
      const trials = 10_000
      const children = fromSecond('uniform', 99, { exchange }, trials, use)
      const counts = Float64Array.from({ length: 99 }, (_, i) => sum(children.map((child) => child[i]!)))
      expectBinomials(counts, trials, exchange, 99)
      for (const distance of [1, 31, 32, 33]) {
        const together = sum(children.map((child) => child[20]! & child[20 + distance]!))
        expectChance(together, trials, exchange * exchange)
      }
    })
  }
  test('one-point: every cut is as likely, and each parent gives a gene', () => {
    const counts = new Float64Array(10)
    for (const child of fromSecond('one-point', 11, {}, 10_000, 52)) {
      const cut = child.indexOf(1)
      expect(cut).toBeGreaterThan(0)
      expect([...child]).toEqual(Array.from({ length: 11 }, (_, i) => (i < cut ? 0 : 1)))
      counts[cut - 1]!++
    }
    expectUniform(counts, 9)
  })
  test('two-point: every stretch of the ring is as likely, and no place is favoured', () => {
    const trials = 20_000
    const starts = new Float64Array(10)
    const children = fromSecond('two-point', 10, {}, trials, 53)
    for (const child of children) {
      const begins = Array.from(child.keys()).filter((i) => child[i] === 1 && child[(i + 9) % 10] === 0)
      expect(begins.length).toBe(1)
      starts[begins[0]!]!++
    }
    expectUniform(starts, 9)
    for (let i = 0; i < 10; i++) expectChance(sum(children.map((child) => child[i]!)), trials, 0.5)
    const lengths = new Float64Array(10)
    for (const child of fromSecond('two-point', 11, {}, 10_000, 54)) lengths[sum(child) - 1]!++
    expect(sum(lengths)).toBe(10_000)
    expectUniform(lengths, 9)
  })
  test('a single gene comes from either parent', () => {
    for (const name of ['one-point', 'two-point']) {
      expectChance(sum(fromSecond(name, 1, {}, 10_000, 55).map((child) => child[0]!)), 10_000, 0.5)
    }
  })
})

describe('boxes of layouts', () => {
  /** Chances of all boxes (start and edge on both axes) of a lattice, by their definition. */
  function boxChances(
    size: readonly [number, number],
    longest: readonly [number, number],
  ): Map<string, number> {
    const chances = new Map<string, number>()
    for (let h = 1; h <= longest[0]; h++) {
      for (let w = 1; w <= longest[1]; w++) {
        for (let r = 0; r <= size[0] - h; r++) {
          for (let c = 0; c <= size[1] - w; c++) {
            const inside = (i: number, k: number): boolean => i >= r && i < r + h && k >= c && k < c + w
            const slots = Array.from({ length: size[0] * size[1] }, (_, slot) =>
              inside(Math.floor(slot / size[1]), slot % size[1]) ? 1 : 0,
            )
            const chance = 1 / (longest[0] * longest[1] * (size[0] - h + 1) * (size[1] - w + 1))
            chances.set(slots.join(''), (chances.get(slots.join('')) ?? 0) + chance)
          }
        }
      }
    }
    return chances
  }
  function expectBoxes(drawn: readonly string[], chances: ReadonlyMap<string, number>): void {
    const counts = new Map<string, number>()
    for (const box of drawn) counts.set(box, (counts.get(box) ?? 0) + 1)
    for (const box of counts.keys()) expect(chances.has(box)).toBe(true)
    for (const [box, chance] of chances) expectChance(counts.get(box) ?? 0, drawn.length, chance)
  }
  const two = layout({ size: [3, 4], options: ['empty', 'soft'] })

  test('patch: a box with edges up to half the lattice comes from the second parent', () => {
    const cross = crossover('patch', two, { edge: 0.5 })
    const random = draws(60)
    const drawn = Array.from({ length: 20_000 }, () =>
      cross(new Int32Array(12), new Int32Array(12).fill(1), random).join(''),
    )
    expectBoxes(drawn, boxChances([3, 4], [1, 2]))
  })
  for (const fill of ['one', 'each']) {
    test(`patch-reset, ${fill}: the box of a uniform lattice of two options gets the other one`, () => {
      const mutate = mutation('patch-reset', two, { edge: 1, fill })
      const random = draws(61)
      const drawn = Array.from({ length: 20_000 }, () => mutate(new Int32Array(12), random).join(''))
      expectBoxes(drawn, boxChances([3, 4], [3, 4]))
    })
  }
  test('patch-reset, one: the whole box gets one option, each other one as often', () => {
    const options = Array.from({ length: 11 }, (_, i) => `option ${i}`)
    const mutate = mutation('patch-reset', layout({ size: [2, 2, 2], options }), { edge: 1, fill: 'one' })
    const random = draws(62)
    const counts = new Float64Array(11)
    for (let trial = 0; trial < 10_000; trial++) {
      const mutant = mutate(new Int32Array(8), random)
      const drawn = new Set(mutant)
      drawn.delete(0)
      expect(drawn.size).toBe(1)
      counts[[...drawn][0]!]!++
    }
    expectUniform(counts.subarray(1), 9)
  })
})
