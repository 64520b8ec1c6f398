import { expect, test } from 'vitest'
import { BrokenPromise } from '../../shared/check.js'
import { refuse } from '../../shared/refusals.js'
import type { DispatchFact } from '../../shared/result.js'
import { type LocalPoolEvents, localDispatcher } from './local.js'

function quietPool() {
  let report: LocalPoolEvents | undefined
  const dispatcher = localDispatcher((events) => {
    report = events
    return {
      start: async () => undefined,
      submit: () => undefined,
      status: () => ({ slots: 1, outstanding: 0, wanted: 2 }),
      close: async () => undefined,
    }
  })
  return { dispatcher, events: report! }
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
