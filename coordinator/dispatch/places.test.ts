import fc from 'fast-check'
import { expect, test } from 'vitest'
import type { DispatchFact, WorkItem } from '../../shared/result.js'
import { inPlaces } from './places.js'

const itemOf = (evaluation: number, purpose: WorkItem['purpose']): WorkItem => ({
  island: 1,
  evaluation,
  individual: evaluation,
  firstReplicate: 0,
  replicates: 1,
  genome: new Uint8Array(1),
  expectedCost: 1,
  attempt: 1,
  purpose,
  isolation: 'shared',
  avoid: [],
})

/** A pool that has unlimited threads and answers what the test says. */
function scene(places: number) {
  const running: WorkItem[] = []
  const answered: DispatchFact[] = []
  let most = 0
  let report: ((fact: DispatchFact) => void) | undefined
  const make = inPlaces(places, ({ fact }) => {
    report = fact
    return {
      start: async () => undefined,
      submit: (items) => {
        running.push(...items)
        most = Math.max(most, running.length)
      },
      status: () => ({ slots: 99, outstanding: running.length, wanted: 99, queued: 0, secondsEach: 2 }),
      close: async () => undefined,
    }
  })
  const pool = make({ fact: (fact) => answered.push(fact), failed: () => undefined })
  const answer = (at: number, kind: 'result' | 'lost') => {
    const [item] = running.splice(at % running.length, 1)
    if (item !== undefined) report!({ kind, item } as unknown as DispatchFact)
  }
  return { pool, running, answered, answer, most: () => most }
}

test('never more at once than places, confirmations and losses included; everything is answered once', () => {
  const step = fc.record({ submit: fc.nat(5), answers: fc.array(fc.nat(20)), lost: fc.boolean() })
  fc.assert(
    fc.property(fc.integer({ min: 1, max: 4 }), fc.array(step, { maxLength: 12 }), (places, steps) => {
      const { pool, running, answered, answer, most } = scene(places)
      let next = 0
      for (const { submit, answers, lost } of steps) {
        const items = Array.from({ length: submit }, () =>
          itemOf(++next, next % 3 === 0 ? 'confirm' : 'evaluate'),
        )
        pool.submit(items, 0)
        expect(running).toHaveLength(Math.min(places, next - answered.length))
        for (const at of answers) if (running.length > 0) answer(at, lost ? 'lost' : 'result')
        expect(pool.status().outstanding).toBe(next - answered.length)
      }
      while (running.length > 0) answer(0, 'result')
      expect(most()).toBeLessThanOrEqual(places)
      expect(new Set(answered.map((fact) => fact.kind !== 'fleet' && fact.item.evaluation)).size).toBe(next)
      expect(answered).toHaveLength(next)
    }),
    { seed: 7, numRuns: 100 },
  )
})

test('it asks for work for every place and some ahead, no more', () => {
  const { pool } = scene(2)
  expect(pool.status()).toMatchObject({ slots: 2, wanted: 6, outstanding: 0 })
  pool.submit(
    [1, 2, 3, 4].map((evaluation) => itemOf(evaluation, 'evaluate')),
    0,
  )
  expect(pool.status()).toMatchObject({ wanted: 2, outstanding: 4, queued: 4 })
})
