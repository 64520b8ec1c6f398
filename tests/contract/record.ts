// What every record must do, whatever it stands on: the suite is run over each adapter (record.test.ts).

import { isDeepStrictEqual } from 'node:util'
import { describe, expect, test } from 'vitest'
import type { Journal } from '../../coordinator/engine/ports.js'
import type { StoredReader } from '../../coordinator/record/index.js'
import { BrokenPromise } from '../../shared/check.js'
import { idOf } from '../../shared/ids.js'
import type { Refusal } from '../../shared/refusals.js'
import { stream } from '../../shared/streams.js'
import {
  arrival,
  contentOf,
  digestOf,
  empty,
  good,
  individual,
  madeUpSearch,
  madeUpState,
  rows,
} from './record-fixture.js'

export interface OpenedRecord {
  readonly journal: Journal
  readonly reader: StoredReader
  close(): void
}
/** One record that can be opened again and again. */
export interface RecordUnderTest {
  open(options?: { readonly force?: boolean }): OpenedRecord
  damageSnapshot(island: number, commit: number): void
  remove(): void
}

export function refusalOf(action: () => unknown): Refusal | undefined {
  try {
    action()
  } catch (error) {
    return error as Refusal
  }
  return undefined
}

const commit = (island: number, number: number, evaluation = number) => ({
  island,
  commit: number,
  evaluation,
  digest: digestOf('commit', island, number),
})
const snapshotAt = (number: number) => ({
  island: 1,
  commit: number,
  digest: digestOf('commit', 1, number),
  state: madeUpState(number),
})

export function recordContract(name: string, make: () => RecordUnderTest): void {
  const withRecord = (action: (record: RecordUnderTest, opened: OpenedRecord) => void) => () => {
    const record = make()
    try {
      action(record, record.open())
    } finally {
      record.remove()
    }
  }

  describe(`${name}: rows`, () => {
    test(
      'what was appended is read back equal, at once and after opening again',
      withRecord((record, { journal, reader, close }) => {
        for (const append of madeUpSearch(11)) journal.append(append)
        const content = contentOf(reader, 3, 80)
        close()
        expect(isDeepStrictEqual(contentOf(record.open().reader, 3, 80), content)).toBe(true)
      }),
    )

    test(
      'every row of a made-up search comes back as it was given',
      withRecord((_, { journal, reader }) => {
        const appended = [...madeUpSearch(12)]
        for (const append of appended) journal.append(append)
        for (const { arrivals, births, mail, commits } of appended) {
          for (const row of arrivals) {
            const read = reader.arrival(row.island, row.evaluation)!
            expect({ ...read, digest: read.digest }).toEqual(row)
          }
          for (const row of births) expect(reader.birth(row.id)).toEqual(row)
          for (const row of mail) expect(reader.mail(row.island, row.epoch)).toEqual(row)
          const first = commits[0]!
          const read = [...reader.commits(first.island, first.commit - 1)][0]!
          expect(read).toMatchObject({ commit: first.commit, evaluation: first.evaluation })
        }
        const events = appended.flatMap((append) => append.events)
        expect([...reader.events()]).toEqual(events.map((row, i) => ({ ...row, sequence: i + 1 })))
      }),
    )

    test(
      'numbers keep every bit; -0, NaN and infinity never enter',
      withRecord((_, { journal, reader }) => {
        const values = [Number.MIN_VALUE, -Number.MAX_VALUE, 0.1, 2 ** 53 - 1, -1e-310, 0]
        journal.append(rows({ arrivals: [arrival(1, 1, good(...values), { cpuSeconds: 0.1 + 0.2 })] }))
        const read = reader.arrival(1, 1)!
        expect([...read.result.values]).toEqual(values)
        expect(read.cpuSeconds).toBe(0.1 + 0.2)
        for (const bad of [-0, Number.NaN, Number.POSITIVE_INFINITY, Number.NEGATIVE_INFINITY]) {
          const row = { ...arrival(1, 2, good(1)), result: good(1, bad) }
          expect(() => journal.append(rows({ arrivals: [row] })), String(bad)).toThrow(BrokenPromise)
        }
        expect(reader.arrival(1, 2)).toBeUndefined()
      }),
    )

    test(
      'a result without numbers and one of many come back',
      withRecord((_, { journal, reader }) => {
        const many = good(...Array.from({ length: 5_000 }, (_, i) => i / 7))
        journal.append(rows({ arrivals: [arrival(1, 1, good()), arrival(2, 1, many)] }))
        expect(reader.arrival(1, 1)?.result).toEqual(good())
        expect(reader.arrival(2, 1)?.result).toEqual(many)
      }),
    )

    test(
      'an append is a copy: what is changed afterwards does not reach it',
      withRecord((_, { journal, reader }) => {
        const emigrant = individual(1, 4, stream(1, 'spare', 1, 2, 3))
        const before = structuredClone(emigrant)
        const row = arrival(1, 1, good(1, 2))
        journal.append(
          rows({
            arrivals: [row],
            mail: [{ island: 1, epoch: 1, atCommit: 0, ended: true, emigrants: [emigrant] }],
          }),
        )
        emigrant.score[0] = 7
        emigrant.values[0] = 7
        row.result.values[0] = 7
        expect(reader.mail(1, 1)?.emigrants).toEqual([before])
        expect(reader.arrival(1, 1)?.result).toEqual(good(1, 2))
      }),
    )

    test(
      'a later result of an evaluation takes the place of the first',
      withRecord((record, { journal, reader, close }) => {
        journal.append(rows({ arrivals: [1, 2, 3].map((n) => arrival(1, n, good(n))) }))
        // Read one after the other, so that an adapter which reads ahead has read ahead.
        expect([1, 2].map((n) => reader.arrival(1, n)?.result.values[0])).toEqual([1, 2])
        journal.append(
          rows({ arrivals: [arrival(1, 3, good(30), { worker: 'host-b/1/t1', host: 'host-b' })] }),
        )
        expect(reader.arrival(1, 3)).toMatchObject({ worker: 'host-b/1/t1', result: good(30) })
        const twice = [arrival(1, 4, good(4)), arrival(1, 4, good(40)), arrival(1, 3, good(300))]
        journal.append(rows({ arrivals: twice }))
        close()
        const again = record.open().reader
        expect([...again.arrivals(1)].map((row) => row.result.values[0])).toEqual([1, 2, 300, 40])
        expect(again.totals().arrivals).toBe(7)
      }),
    )

    test(
      'totals sum over everything that arrived',
      withRecord((record, { journal, reader, close }) => {
        expect(reader.totals()).toMatchObject({ arrivals: 0, cpuSeconds: 0 })
        journal.append(
          rows({ arrivals: [1, 2, 3].map((n) => arrival(1, n, good(n), { cpuSeconds: n / 4 })) }),
        )
        expect(reader.totals()).toMatchObject({ arrivals: 3, cpuSeconds: 1.5 })
        close()
        expect(record.open().reader.totals()).toMatchObject({ arrivals: 3, cpuSeconds: 1.5 })
      }),
    )

    test(
      'confirmations: only one that agrees confirms',
      withRecord((_, { journal, reader }) => {
        const row = { island: 1, worker: 'w', host: 'h', by: 'process', digest: digestOf('x') } as const
        journal.append(rows({ confirmations: [{ ...row, evaluation: 1, agrees: false }] }))
        expect(reader.isConfirmed(1, 1)).toBe(false)
        const both = [
          { ...row, evaluation: 1, agrees: false },
          { ...row, evaluation: 1, by: 'host' as const, agrees: true },
        ]
        journal.append(rows({ confirmations: both }))
        expect(reader.isConfirmed(1, 1)).toBe(true)
        expect(reader.isConfirmed(1, 2)).toBe(false)
        expect(reader.confirmations(1, 1).map(({ by, agrees }) => [by, agrees])).toEqual([
          ['process', false],
          ['process', false],
          ['host', true],
        ])
      }),
    )

    test(
      'a worker is found by everything it did, in order',
      withRecord((_, { journal, reader }) => {
        const by = (worker: string, island: number, n: number) => arrival(island, n, good(n), { worker })
        journal.append(rows({ arrivals: [by('a', 2, 5), by('b', 1, 1), by('a', 1, 9), by('a', 1, 2)] }))
        expect([...reader.arrivalsOf('a')]).toEqual([
          { island: 1, evaluation: 2 },
          { island: 1, evaluation: 9 },
          { island: 2, evaluation: 5 },
        ])
        expect([...reader.arrivalsOf('nobody')]).toEqual([])
      }),
    )

    test(
      'a birth told twice is kept once, as it was told first',
      withRecord((_, { journal, reader }) => {
        const birth = {
          id: idOf(1, 1),
          parents: [],
          origin: 'founder',
          atCommit: 0,
          genome: Uint8Array.of(1),
        }
        journal.append(rows({ births: [birth, birth] }))
        journal.append(rows({ births: [birth] }))
        expect(reader.birth(birth.id)).toEqual(birth)
        expect(reader.birth(idOf(1, 2))).toBeUndefined()
      }),
    )

    test(
      'events keep their order, their data and what they mean',
      withRecord((_, { journal, reader }) => {
        const event = { kind: 'note', island: 0, atCommit: 0, epoch: 3, changesSearch: true, sentence: 's' }
        const data = [undefined, null, { a: [1, 0.1, 'x'] }, 'text', 3]
        for (const one of data) journal.append(rows({ events: [{ ...event, data: one }] }))
        expect([...reader.events()]).toEqual(data.map((one, i) => ({ ...event, data: one, sequence: i + 1 })))
        const bad = { ...event, data: { value: Number.NaN } }
        expect(() => journal.append(rows({ events: [bad] }))).toThrow(BrokenPromise)
      }),
    )

    test(
      'mail is found by epoch, and the last word of an island',
      withRecord((_, { journal, reader }) => {
        const mail = { island: 3, atCommit: 1, ended: false, emigrants: [] }
        journal.append(rows({ mail: [1, 2].map((epoch) => ({ ...mail, epoch })) }))
        journal.append(rows({ mail: [{ ...mail, epoch: 3, ended: true }] }))
        expect(reader.mail(3, 2)).toEqual({ ...mail, epoch: 2 })
        expect(reader.lastMail(3)).toEqual({ ...mail, epoch: 3, ended: true })
        expect(reader.mail(3, 4)).toBeUndefined()
        expect(reader.lastMail(4)).toBeUndefined()
        expect(() => journal.append(rows({ mail: [{ ...mail, epoch: 3 }] }))).toThrow(BrokenPromise)
      }),
    )
  })

  describe(`${name}: commits and snapshots`, () => {
    test(
      'commits come in their order, from any place, the digest with the last of each append',
      withRecord((_, { journal, reader }) => {
        journal.append(rows({ commits: [commit(1, 1, 2), commit(2, 1), commit(1, 2, 1), commit(1, 3, 900)] }))
        journal.append(rows({ commits: [commit(1, 4)] }))
        const all = [
          { commit: 1, evaluation: 2 },
          { commit: 2, evaluation: 1 },
          { commit: 3, evaluation: 900, digest: digestOf('commit', 1, 3) },
          { commit: 4, evaluation: 4, digest: digestOf('commit', 1, 4) },
        ]
        for (let after = 0; after <= 5; after++) {
          expect([...reader.commits(1, after)]).toEqual(all.slice(after))
        }
        expect([...reader.commits(9, 0)]).toEqual([])
        expect(reader.lastCommit(1)).toEqual({ commit: 4, digest: digestOf('commit', 1, 4) })
        expect(reader.lastCommit(9)).toBeUndefined()
        expect(reader.islands()).toEqual([1, 2])
      }),
    )

    test(
      'a gap in the commits of an island is our own mistake, and nothing of that append is kept',
      withRecord((record, { journal, reader, close }) => {
        journal.append(rows({ commits: [commit(1, 1)] }))
        for (const number of [1, 3]) {
          const bad = rows({ arrivals: [arrival(1, 1, good(1))], commits: [commit(1, number)] })
          expect(() => journal.append(bad)).toThrow(BrokenPromise)
        }
        expect(reader.arrival(1, 1)).toBeUndefined()
        journal.append(rows({ commits: [commit(1, 2)] }))
        close()
        expect(record.open().reader.lastCommit(1)?.commit).toBe(2)
      }),
    )

    test(
      'the newest snapshot at or before a commit is read, with its state as it was',
      withRecord((_, { journal, reader }) => {
        expect(reader.snapshot(1)).toBeUndefined()
        journal.append(rows({ commits: [1, 2, 3, 4].map((n) => commit(1, n)), snapshots: [snapshotAt(2)] }))
        journal.append(rows({ snapshots: [snapshotAt(4)] }))
        expect(reader.snapshot(1)).toEqual(snapshotAt(4))
        expect(reader.snapshot(1, 3)).toEqual(snapshotAt(2))
        expect(reader.snapshot(1, 1)).toBeUndefined()
        expect(reader.snapshot(2)).toBeUndefined()
        const state = reader.snapshot(1)?.state as { numbers: Float64Array; map: Map<number, string> }
        expect(Object.is(state.numbers[0], -0)).toBe(true)
        expect(state.map.get(4)).toBe('x')
      }),
    )

    test(
      'a damaged snapshot is passed over for an older one (a checkpoint written half)',
      withRecord((record, { journal, close }) => {
        for (let n = 1; n <= 3; n++)
          journal.append(rows({ commits: [commit(1, n)], snapshots: [snapshotAt(n)] }))
        close()
        record.damageSnapshot(1, 3)
        const second = record.open()
        expect(second.reader.snapshot(1)).toEqual(snapshotAt(2))
        second.close()
        record.damageSnapshot(1, 2)
        record.damageSnapshot(1, 1)
        const third = record.open()
        expect(third.reader.snapshot(1)).toBeUndefined()
        third.close()
      }),
    )
  })

  describe(`${name}: one writer`, () => {
    test(
      'a second opening is refused, and may follow once the first has closed',
      withRecord((record, first) => {
        expect(refusalOf(() => record.open())?.code).toBe('record-in-use')
        first.close()
        record.open().close()
      }),
    )

    test(
      'after a takeover the former writer can never append again',
      withRecord((record, first) => {
        first.journal.append(rows({ commits: [commit(1, 1)] }))
        const second = record.open({ force: true })
        const late = rows({ commits: [commit(1, 2)] })
        expect(refusalOf(() => first.journal.append(late))?.code).toBe('record-fenced')
        second.journal.append(rows({ commits: [commit(1, 2)] }))
        expect(refusalOf(() => first.journal.append(late))?.code).toBe('record-fenced')
        expect([...second.reader.commits(1, 0)].length).toBe(2)
        // Closing the former one does not free what it no longer holds.
        first.close()
        expect(refusalOf(() => record.open())?.code).toBe('record-in-use')
        second.close()
      }),
    )

    test(
      'rows may be appended while somebody iterates',
      withRecord((_, { journal, reader }) => {
        for (let n = 1; n <= 5; n++)
          journal.append(rows({ commits: [commit(1, n)], arrivals: [arrival(1, n, good(n))] }))
        let seen = 0
        for (const row of reader.commits(1, 0)) {
          seen += 1
          if (row.commit <= 5) journal.append(rows({ arrivals: [arrival(2, row.commit, good(1))] }))
          expect(reader.arrival(1, row.commit)?.evaluation).toBe(row.evaluation)
        }
        expect(seen).toBe(5)
        expect([...reader.arrivals(2)].length).toBe(5)
      }),
    )

    test(
      'an append of nothing is nothing',
      withRecord((_, { journal, reader }) => {
        journal.append(empty)
        expect(reader.totals().appends).toBe(0)
      }),
    )
  })
}
