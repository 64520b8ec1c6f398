import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { bits, choice, integer, layout, partFault, randomPart, real } from '../../../shared/encodings.js'
import type { Encoding, PartValue } from '../../../shared/genome.js'
import { type Stream, stream } from '../../../shared/streams.js'
import { defaultSettings, SettingFault } from '../settings.js'
import type { SettingRow, Settings, SettingTable } from '../types.js'
import { distanceOf } from './distance.js'
import { everyEncoding } from './rows.js'
import {
  checkOperator,
  crossoverRows,
  defaultOperator,
  mutationRows,
  operatorDefaults,
  rowOf,
} from './tables.js'

/** Encodings of every kind, the smallest and oddest among them. */
const encodings: readonly Encoding[] = [
  real({ low: -1, high: 3, length: 7 }),
  real({ low: 0.7, high: 0.7000000000000001, length: 3 }),
  real({ low: 1e-9, high: 1e6, length: 5, scale: 'log' }),
  // e to the logarithm of 20 rounds below 20, that of 100 above 100.
  real({ low: 20, high: 100, length: 5, scale: 'log' }),
  real({ low: -1e300, high: 1e300, length: 2 }),
  integer({ low: -3, high: 9, length: 6 }),
  integer({ low: -(2 ** 31), high: 2 ** 31 - 1, length: 3 }),
  integer({ low: 4, high: 5 }),
  choice({ options: ['brass', 'steel', 'nylon'], length: 8 }),
  choice({ options: ['open', 'shut'] }),
  bits({ length: 1 }),
  bits({ length: 100 }),
  layout({ size: [3, 4, 2], options: ['empty', 'soft', 'stiff'] }),
  layout({ size: [1], options: ['empty', 'soft'] }),
]

/** Settings of a table at their defaults and at every corner of their ranges. */
function corners(table: SettingTable): Settings[] {
  const values = (row: SettingRow): readonly (number | string)[] =>
    row.kind === 'choice' ? row.options : [row.default, row.low, row.high]
  let all: Settings[] = [{}]
  for (const [name, row] of Object.entries(table)) {
    all = all.flatMap((settings) => values(row).map((value) => ({ ...settings, [name]: value })))
  }
  return all
}

const seeds = fc.integer({ min: 0, max: 2 ** 32 - 1 })
const spare = (seed: number, use: number): Stream => stream(20261201, 'spare', seed, use)

/** Parents as founders, or pushed to the bounds where an operator is most likely to slip. */
function parent(encoding: Encoding, seed: number, use: number): PartValue {
  const value = randomPart(encoding, spare(seed, use))
  if (encoding.kind !== 'real' && encoding.kind !== 'integer') return value
  const coins = spare(seed, use + 100)
  return value.map((gene) => [gene, gene, encoding.low, encoding.high][coins.below(4)]!) as PartValue
}

function combinations<Row extends { readonly encodings: readonly string[]; readonly settings: SettingTable }>(
  rows: readonly Row[],
): { row: Row; encoding: Encoding; settings: Settings }[] {
  return rows.flatMap((row) =>
    encodings
      .filter((encoding) => row.encodings.includes(encoding.kind))
      .flatMap((encoding) => corners(row.settings).map((settings) => ({ row, encoding, settings }))),
  )
}

describe('every crossover, for every encoding it fits and every corner of its settings', () => {
  for (const row of crossoverRows) {
    test(`${row.name}: children stay in bounds, parents stay as they are, the stream alone decides`, () => {
      for (const { encoding, settings } of combinations([row])) {
        const cross = row.build(encoding, settings)
        const property = fc.property(seeds, (seed) => {
          const a = parent(encoding, seed, 1)
          const b = parent(encoding, seed, 2)
          const before = [a.slice(), b.slice()]
          const child = cross(a, b, spare(seed, 3))
          expect(partFault(encoding, child)).toBeUndefined()
          expect([a, b]).toEqual(before)
          expect(cross(a, b, spare(seed, 3))).toEqual(child)
          expect(cross(a, a.slice(), spare(seed, 3))).toEqual(a)
        })
        fc.assert(property, { seed: 51, numRuns: 12 })
      }
    })
  }
})

describe('every mutation, for every encoding it fits and every corner of its settings', () => {
  for (const row of mutationRows) {
    test(`${row.name}: mutants stay in bounds, parents stay as they are, the stream alone decides`, () => {
      for (const { encoding, settings } of combinations([row])) {
        const mutate = row.build(encoding, settings)
        const property = fc.property(seeds, (seed) => {
          const value = parent(encoding, seed, 1)
          const before = value.slice()
          const mutant = mutate(value, spare(seed, 3))
          expect(partFault(encoding, mutant)).toBeUndefined()
          expect(value).toEqual(before)
          expect(mutate(value, spare(seed, 3))).toEqual(mutant)
        })
        fc.assert(property, { seed: 52, numRuns: 12 })
      }
    })
  }
  test('a mutation that must change something always does', () => {
    const always: [string, Encoding, Settings][] = [
      ['one-bit', bits({ length: 5 }), {}],
      ['patch-reset', layout({ size: [3, 3], options: ['a', 'b', 'c'] }), { edge: 1, fill: 'one' }],
      ['patch-reset', layout({ size: [3, 3], options: ['a', 'b'] }), { edge: 1, fill: 'each' }],
      ['reset', choice({ options: ['a', 'b'], length: 4 }), { changes: 4 }],
      ['bit-flip', bits({ length: 5 }), { flips: 5 }],
    ]
    for (const [name, encoding, settings] of always) {
      const mutate = rowOf(mutationRows, name).build(encoding, settings)
      for (let seed = 0; seed < 200; seed++) {
        const value = parent(encoding, seed, 1)
        expect(mutate(value, spare(seed, 2))).not.toEqual(value)
      }
    }
  })
  test('with no changes expected nothing changes', () => {
    for (const row of mutationRows) {
      const name = ['changes', 'flips'].find((one) => one in row.settings)
      if (name === undefined) continue
      const encoding = encodings.find((one) => row.encodings.includes(one.kind))!
      const mutate = row.build(encoding, { ...defaultSettings(row.settings), [name]: 0 })
      const value = parent(encoding, 1, 1)
      for (let seed = 0; seed < 100; seed++) expect(mutate(value, spare(seed, 2))).toEqual(value)
    }
  })
})

describe('the tables', () => {
  for (const [title, rows] of [
    ['crossover', crossoverRows],
    ['mutation', mutationRows],
  ] as const) {
    test(`${title}: names differ, every row has a source and something it fits`, () => {
      expect(new Set(rows.map((row) => row.name)).size).toBe(rows.length)
      for (const row of rows) {
        expect(row.source).not.toBe('')
        expect(row.encodings.length).toBeGreaterThan(0)
      }
    })
  }
  test('every encoding has defaults that fit it', () => {
    expect(Object.keys(operatorDefaults).sort()).toEqual([...everyEncoding].sort())
    for (const encoding of encodings) {
      const { crossover, mutation } = defaultOperator(encoding)
      expect(checkOperator(crossoverRows, encoding, crossover.operator, crossover.settings)).toEqual(
        crossover,
      )
      expect(checkOperator(mutationRows, encoding, mutation.operator, mutation.settings)).toEqual(mutation)
    }
  })
  test('an operator of another encoding or an unknown one is answered with those that fit', () => {
    expect(checkOperator(mutationRows, bits({ length: 3 }), 'polynomial', {})).toEqual(
      new SettingFault('operator', "'polynomial'", 'for bits one of bit-flip, one-bit, none'),
    )
    expect(checkOperator(mutationRows, bits({ length: 3 }), 'bit-flip', { flips: -1 })).toEqual(
      new SettingFault('flips', '-1', 'a number from 0 to 1000000'),
    )
  })
})

describe('distance', () => {
  test('it is 0 for equal values, 1 for opposite ones, symmetric, and obeys the triangle inequality', () => {
    for (const encoding of encodings) {
      const distance = distanceOf(encoding)
      for (let seed = 0; seed < 50; seed++) {
        const [a, b, c] = [1, 2, 3].map((use) => parent(encoding, seed, use)) as [
          PartValue,
          PartValue,
          PartValue,
        ]
        expect(distance(a, a.slice())).toBe(0)
        expect(distance(a, b)).toBe(distance(b, a))
        expect(distance(a, b)).toBeLessThanOrEqual(1 + 1e-12)
        expect(distance(a, c)).toBeLessThanOrEqual(distance(a, b) + distance(b, c) + 1e-12)
      }
    }
  })
  test('examples', () => {
    const f = (...x: number[]) => Float64Array.of(...x)
    expect(distanceOf(real({ low: -1, high: 3, length: 2 }))(f(-1, 0), f(3, 1))).toBe(0.625)
    expect(distanceOf(real({ low: 1, high: 10000, scale: 'log' }))(f(10), f(1000))).toBeCloseTo(0.5, 14)
    expect(distanceOf(integer({ low: 0, high: 8 }))(Int32Array.of(1), Int32Array.of(7))).toBe(0.75)
    expect(distanceOf(bits({ length: 4 }))(Uint8Array.of(0, 1, 1, 0), Uint8Array.of(0, 1, 0, 1))).toBe(0.5)
    const slots = layout({ size: [2, 2], options: ['a', 'b', 'c'] })
    expect(distanceOf(slots)(Int32Array.of(0, 1, 2, 2), Int32Array.of(0, 1, 2, 0))).toBe(0.25)
  })
})
