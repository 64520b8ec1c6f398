import { expect, test } from 'vitest'
import { BrokenPromise } from '../../shared/check.js'
import { refuse } from '../../shared/refusals.js'
import type { DispatchFact, WorkItem } from '../../shared/result.js'
import { type LocalPoolEvents, localDispatcher } from './local.js'

/** A pool that does nothing; `hand` says what its threads have in hand. */
function quietPool(hand = { queued: 0, secondsEach: 0 }) {
  let report: LocalPoolEvents | undefined
  const reportAt: number[] = []
  const dispatcher = localDispatcher((events) => {
    report = events
    return {
      start: async () => undefined,
      submit: (_, at) => {
        reportAt.push(at)
      },
      status: () => ({ slots: 1, outstanding: hand.queued, wanted: 2, ...hand }),
      close: async () => undefined,
    }
  })
  return { dispatcher, events: report!, reportAt }
}
const fact = { kind: 'lost' } as DispatchFact

test('a fact wakes the one who waits, and is handed over once', async () => {
  const { dispatcher, events } = quietPool()
  setTimeout(() => events.fact(fact), 10)
  expect(await dispatcher.facts(60_000)).toEqual([fact])
  expect(await dispatcher.facts(1)).toEqual([])
})

test('facts of the same moment come together', async () => {
  const { dispatcher, events } = quietPool()
  events.fact(fact)
  setImmediate(() => events.fact(fact))
  expect((await dispatcher.facts(0)).length).toBe(2)
})

test('what made the pool fail is thrown to the one who waits, and to all who ask later', async () => {
  const { dispatcher, events } = quietPool()
  const refusal = refuse('no-workers', { detail: 'none' })
  setTimeout(() => events.failed(refusal), 10)
  await expect(dispatcher.facts(60_000)).rejects.toBe(refusal)
  await expect(dispatcher.facts(0)).rejects.toBe(refusal)
})

test('two who wait at once are a mistake of ours', async () => {
  const { dispatcher } = quietPool()
  const first = dispatcher.facts(50)
  await expect(dispatcher.facts(50)).rejects.toThrow(BrokenPromise)
  await first
})

test('facts are held back while there is work in hand, and handed over together at the mark', async () => {
  const hand = { queued: 100, secondsEach: 0.001 }
  const { dispatcher, events, reportAt } = quietPool(hand)
  dispatcher.submit([{} as WorkItem])
  const mark = reportAt[0]!
  expect(mark).toBeGreaterThanOrEqual(2)
  expect(mark).toBeLessThanOrEqual(50)
  const facts = dispatcher.facts(60_000)
  while (hand.queued > mark) {
    hand.queued--
    events.fact(fact)
    if (hand.queued % 10 === 0) await new Promise((resolve) => setImmediate(resolve))
  }
  expect((await facts).length).toBe(100 - mark)
})

test('the first fact is held back for a moment only, however much work there is', async () => {
  const { dispatcher, events } = quietPool({ queued: 1e6, secondsEach: 10 })
  events.fact(fact)
  const startMs = performance.now()
  expect(await dispatcher.facts(0)).toEqual([fact])
  expect(performance.now() - startMs).toBeGreaterThan(50)
})
