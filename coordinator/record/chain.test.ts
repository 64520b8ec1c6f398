import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { type AppendedRows, contentsOf, headAfter, keysOf } from './chain.js'
import { chained, chainedTables } from './schema.js'
import type { Column } from './storage.js'

/** Keys are below 2^52: ids of the most islands (limits.ts, and their controls) are below 2^51. */
const count = fc.integer({ min: 0, max: 2 ** 52 - 1 })
/** Rows of every table: keys, then some column of each kind. */
const anyRows = fc
  .tuple(
    ...chainedTables.map((table) =>
      fc.array(fc.array(count, { minLength: chained[table].keys, maxLength: chained[table].keys }), {
        maxLength: 6,
      }),
    ),
  )
  .map(
    (keys) =>
      Object.fromEntries(
        chainedTables.map((table, i) => [table, keys[i]!.map((key): Column[] => [...key, null, 'x', 0.5])]),
      ) as unknown as AppendedRows,
  )

const header = { sequence: 3, epoch: 1, atMs: 5, arrivals: 7, cpuSeconds: 0.5 }
const head = (rows: AppendedRows, previous = new Uint8Array(32)) =>
  Buffer.from(headAfter(previous, { ...header, contents: contentsOf(rows) }, rows)).toString('hex')

describe('the contents of an append', () => {
  test('lead back to the same keys, whatever they are and in whatever order', () => {
    fc.assert(
      fc.property(anyRows, (rows) => {
        const keys = keysOf(contentsOf(rows))
        for (const table of chainedTables) {
          expect(keys[table]).toEqual(rows[table].map((row) => row.slice(0, chained[table].keys)))
        }
      }),
    )
  })

  test('of a hundred results of five islands take at most three bytes each', () => {
    const results = Array.from({ length: 100 }, (_, i): Column[] => [1 + (i % 5), 1_000_000 + 7 * i])
    const rows = { ...none(), results }
    expect(contentsOf(rows).length).toBeLessThanOrEqual(330)
  })

  test('that no append can have written are refused, not misread', () => {
    const whole = contentsOf({ ...none(), results: [[1, 5]], mail: [[2, 3]] })
    for (let length = 0; length < whole.length; length++) {
      expect(() => keysOf(whole.subarray(0, length)), `cut to ${length} bytes`).toThrow()
    }
    expect(() => keysOf(Uint8Array.from([...whole, 0]))).toThrow()
    expect(() => keysOf(new Uint8Array(20).fill(255))).toThrow()
  })
})

describe('the head of an append', () => {
  test('changes with every column, with the kind of a column, with the order of rows and with the head before', () => {
    const base = {
      ...none(),
      events: [
        [1, 'a'],
        [2, '1'],
      ] as Column[][],
    }
    const others: AppendedRows[] = [
      {
        ...none(),
        events: [
          [1, 'b'],
          [2, '1'],
        ],
      },
      {
        ...none(),
        events: [
          [1, 'a'],
          [2, 1],
        ],
      },
      {
        ...none(),
        events: [
          [1, 'a'],
          [2, null],
        ],
      },
      {
        ...none(),
        events: [
          [1, 'a'],
          [2, Uint8Array.of(49)],
        ],
      },
      {
        ...none(),
        events: [
          [2, '1'],
          [1, 'a'],
        ],
      },
      {
        ...none(),
        events: [
          [1, 'a'],
          [2, '1'],
          [3, ''],
        ],
      },
      {
        ...none(),
        events: [
          [1, 'a2'],
          [2, ''],
        ],
      },
    ]
    const heads = [head(base), ...others.map((rows) => head(rows)), head(base, new Uint8Array(32).fill(1))]
    expect(new Set(heads).size).toBe(heads.length)
    expect(head(structuredClone(base))).toBe(heads[0])
  })
})

function none(): AppendedRows {
  return Object.fromEntries(chainedTables.map((table) => [table, []])) as unknown as AppendedRows
}
