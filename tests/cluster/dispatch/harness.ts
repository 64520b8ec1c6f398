// A dispatcher over a queue server in memory and a virtual clock, and what its tests do with it: let time pass, take
// facts, have agents work. Fresh for every test.

import { beforeEach, expect } from 'vitest'
import { type Orders, RedisDispatcher } from '../../../coordinator/dispatch/redis/dispatcher.js'
import { clusterTimes } from '../../../shared/cluster/times.js'
import type { DispatchFact } from '../../../shared/result.js'
import { itemOf, MemoryQueue, TestAgent, VirtualClock } from './memory-queue.js'

export const times = clusterTimes()
export const search = 'pump'
export const pluginDigest = 'a'.repeat(64)

export let clock: VirtualClock
export let queue: MemoryQueue
export let dispatcher: RedisDispatcher
export let said: string[]
export let orders: Orders

beforeEach(() => {
  clock = new VirtualClock()
  queue = new MemoryQueue(clock, search)
  said = []
  orders = {}
  dispatcher = make()
})

export function make(more: { record?: string; nonce?: string; holder?: number } = {}): RedisDispatcher {
  return new RedisDispatcher({
    queue,
    plugin: Uint8Array.of(1, 2, 3),
    shape: { columns: 1, cases: 1 },
    times,
    clock,
    nonce: more.nonce ?? 'first',
    orders: () => orders,
    tell: (sentence) => said.push(sentence),
    search: {
      search,
      record: more.record ?? 'record-1',
      holder: more.holder ?? 1,
      pluginDigest,
      pluginBytes: 3,
      seed: 7,
      sharedConditions: false,
      exactness: 'bits',
      needs: { cores: 1, memoryMB: 1024, tokens: {} },
      tokens: {},
      share: 1,
      skerry: '0',
    },
  })
}

export const agent = (name: string, more = {}) => new TestAgent(queue, clock, search, name, more)
export const numbers = (count: number, from = 1): number[] =>
  Array.from({ length: count }, (_, i) => from + i)
export const submit = (...evaluations: number[]) => dispatcher.submit(evaluations.map((n) => itemOf(n)))

export async function started(which = dispatcher): Promise<void> {
  const starting = which.start()
  await clock.pass(0)
  await starting
  // Who is there is said at the start.
  expect((await which.facts(0)).map(({ kind }) => kind)).toEqual(['fleet'])
}

/** What facts() gives within that time, several calls together. */
export async function factsWithin(ms: number, which = dispatcher): Promise<DispatchFact[]> {
  const facts: DispatchFact[] = []
  const endMs = clock.nowMs() + ms
  while (clock.nowMs() < endMs) {
    const some = which.facts(50)
    await clock.pass(Math.min(100, endMs - clock.nowMs()))
    facts.push(...(await some))
  }
  return facts
}

type Result = Extract<DispatchFact, { kind: 'result' }>
type Lost = Extract<DispatchFact, { kind: 'lost' }>
export const resultsOf = (facts: readonly DispatchFact[]) =>
  facts.filter((one): one is Result => one.kind === 'result')
export const lossesOf = (facts: readonly DispatchFact[]) =>
  facts.filter((one): one is Lost => one.kind === 'lost')
export const evaluationsOf = (facts: readonly (Result | Lost)[]) =>
  facts.map(({ item }) => item.evaluation).sort((a, b) => a - b)

/** One agent takes and answers all that waits, again and again. */
export async function workedOff(by: TestAgent, ms: number): Promise<DispatchFact[]> {
  const facts: DispatchFact[] = []
  const endMs = clock.nowMs() + ms
  while (clock.nowMs() < endMs) {
    for (const job of by.take(100)) by.answer(job)
    facts.push(...(await factsWithin(100)))
  }
  return facts
}

/** What the search orders about who may work, from now on. */
export function order(more: Orders): void {
  orders = more
}
