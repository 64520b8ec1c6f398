// The cluster's dispatcher when the queue server, the coordinator's own process or strangers do what they should not.
// The numbers in brackets are rows of the fault table (DEVELOPERS.md).

import { describe, expect, test } from 'vitest'
import type { RedisDispatcher } from '../../../coordinator/dispatch/redis/dispatcher.js'
import type { WorkItem } from '../../../shared/result.js'
import {
  agent,
  clock,
  dispatcher,
  evaluationsOf,
  factsWithin,
  lossesOf,
  make,
  numbers,
  queue,
  resultsOf,
  said,
  search,
  started,
  submit,
  times,
  workedOff,
} from './harness.js'
import { answersTo, itemOf, type TestAgent } from './memory-queue.js'

describe('the server', () => {
  async function withWorkInFlight(): Promise<TestAgent> {
    await started()
    const worker = agent('a')
    await clock.pass(2 * times.heartbeatMs)
    submit(...numbers(10))
    await clock.pass(10)
    worker.take(3)
    await clock.pass(times.heartbeatMs)
    return worker
  }

  test.each([16, 20])(
    '(%i) emptied: everything outstanding is sent again within 3 s, nothing is lost or blamed',
    async () => {
      const worker = await withWorkInFlight()
      const old = queue.waiting().map(({ header }) => header.dispatch)
      const [held] = worker.held
      queue.flush()
      const facts = await factsWithin(3000)
      expect(lossesOf(facts)).toEqual([])
      const again = queue.waiting()
      expect(
        again.flatMap(({ items }) => items.map(({ evaluation }) => evaluation)).sort((a, b) => a - b),
      ).toEqual(numbers(10))
      expect(again.some(({ header }) => old.includes(header.dispatch))).toBe(false)
      expect(again.every(({ header }) => header.instance === queue.state.instance)).toBe(true)
      expect(dispatcher.counters).toMatchObject({ resets: 1, resent: 10 })
      expect(said.join(' ')).toContain('10 evaluations were sent again')
      // What was being simulated counts all the same, once.
      worker.answer(held!)
      const rest = await workedOff(worker, 2000)
      expect(new Set(evaluationsOf(resultsOf([...facts, ...rest])))).toEqual(new Set(numbers(10)))
      expect(dispatcher.counters.late).toBe(held!.items.length)
    },
  )

  test('(17) back with old data: every item is answered all the same, what is double is counted', async () => {
    const worker = await withWorkInFlight()
    const old = queue.snapshot()
    const facts = await workedOff(worker, 1000)
    for (const job of [...worker.held]) worker.answer(job)
    submit(...numbers(5, 11))
    await clock.pass(10)
    queue.state = old
    facts.push(...(await workedOff(worker, 20_000)))
    expect(new Set(evaluationsOf(resultsOf(facts)))).toEqual(new Set(numbers(15)))
    expect(dispatcher.counters.late).toBeGreaterThan(0)
    expect(dispatcher.counters.vanished).toBeGreaterThan(0)
    expect(dispatcher.status().outstanding).toBe(0)
  })

  test('(18, 19) cut off for long and back: said once each, nobody is blamed, the search goes on', async () => {
    const worker = await withWorkInFlight()
    queue.cutOff = true
    submit(...numbers(5, 11))
    const facts = await factsWithin(10 * times.silentMs)
    expect(lossesOf(facts)).toEqual([])
    queue.cutOff = false
    facts.push(...(await factsWithin(1000)))
    for (const job of [...worker.held]) worker.answer(job)
    facts.push(...(await workedOff(worker, 5000)))
    expect(lossesOf(facts)).toEqual([])
    expect(new Set(evaluationsOf(resultsOf(facts)))).toEqual(new Set(numbers(15)))
    expect(dispatcher.counters.stalls).toBe(1)
    expect(said.filter((sentence) => sentence.includes('nothing is lost')).length).toBe(1)
    expect(said.filter((sentence) => sentence.includes('answers again')).length).toBe(1)
  })

  test('a job that vanished is found by the sweep and sent again; one that waits long is not', async () => {
    const worker = await withWorkInFlight()
    const [waits] = queue.waiting()
    const gone = queue.waiting()[1]!.header.dispatch
    await queue.remove([{ dispatch: gone }])
    await factsWithin(4 * times.sweepMs)
    expect(dispatcher.counters.vanished).toBe(1)
    expect(queue.waiting().map(({ header }) => header.dispatch)).toContain(waits!.header.dispatch)
    for (const job of [...worker.held]) worker.answer(job)
    expect(new Set(evaluationsOf(resultsOf(await workedOff(worker, 3000))))).toEqual(new Set(numbers(10)))
  })

  test('refuses for good: facts() throws it', async () => {
    await started()
    const { refuse } = await import('../../../shared/refusals.js')
    queue.instance = async () => {
      throw refuse('queue-access', { detail: 'user or password is wrong' })
    }
    const waiting = dispatcher.facts(10_000)
    waiting.catch(() => {})
    await clock.pass(2 * times.heartbeatMs)
    await expect(waiting).rejects.toThrow('user or password')
  })
})

describe('the coordinator', () => {
  test('(11, 13) stopped for two minutes: no agent is taken for dead, nothing is sent again, it is said', async () => {
    await started()
    const worker = agent('a')
    await clock.pass(2 * times.heartbeatMs)
    submit(...numbers(4))
    await clock.pass(10)
    worker.take(4)
    await clock.pass(times.heartbeatMs)
    clock.skip(120_000)
    const facts = await factsWithin(times.silentMs)
    expect(lossesOf(facts)).toEqual([])
    expect(dispatcher.counters).toMatchObject({ resent: 0, agentsLost: 0, pauses: 1 })
    expect(said.some((sentence) => /stopped for 1[12]\d s/.test(sentence))).toBe(true)
    worker.die()
    expect(lossesOf(await factsWithin(2 * times.silentMs)).length).toBe(4)
  })

  describe('(1, 53) a later one of the same record', () => {
    /** Two jobs are being simulated when the first coordinator dies; the second knows nothing of them. */
    async function successor(): Promise<{ worker: TestAgent; later: RedisDispatcher }> {
      await started()
      const worker = agent('a')
      await clock.pass(2 * times.heartbeatMs)
      submit(1, 2)
      await clock.pass(10)
      worker.take(2)
      await dispatcher.close()
      // Whoever still waits there is let go.
      await clock.pass(10)
      queue.closed = false
      return { worker, later: make({ nonce: 'second', holder: 2 }) }
    }

    test('uses answers that came before it handed the work over, and sends that work nowhere', async () => {
      const { worker, later } = await successor()
      for (const job of [...worker.held]) worker.answer(job)
      await started(later)
      expect(resultsOf(await factsWithin(200, later))).toEqual([])
      later.submit([itemOf(1), itemOf(2, { attempt: 3 }), itemOf(3)])
      const results = resultsOf(await factsWithin(200, later))
      expect(results.map(({ item }) => [item.evaluation, item.attempt])).toEqual([
        [1, 1],
        [2, 3],
      ])
      expect(queue.waiting().flatMap(({ items }) => items.map(({ evaluation }) => evaluation))).toEqual([3])
      await factsWithin(200, later)
      expect(queue.state.results).toEqual([])
      expect(later.counters.inherited).toBe(2)
    })

    test('uses answers that come after it sent the work again', async () => {
      const { worker, later } = await successor()
      await started(later)
      later.submit([itemOf(1), itemOf(2)])
      await clock.pass(10)
      for (const job of [...worker.held]) worker.answer(job)
      expect(evaluationsOf(resultsOf(await factsWithin(500, later)))).toEqual([1, 2])
      expect(later.status().outstanding).toBe(0)
    })

    test('uses none for work of the same number and other contents', async () => {
      const { worker, later } = await successor()
      for (const job of [...worker.held]) worker.answer(job)
      await started(later)
      await factsWithin(200, later)
      later.submit([itemOf(1, { genome: Uint8Array.of(99) }), itemOf(2, { replicates: 2 })])
      expect(resultsOf(await factsWithin(500, later))).toEqual([])
      expect(later.status().outstanding).toBe(2)
      await factsWithin(times.leaseMs + 1000, later)
      expect(later.counters.foreign).toBe(2)
      expect(queue.state.results).toEqual([])
    })
  })

  test('two searches of one name: the second is refused while the first lives, and not when it is dead', async () => {
    await started()
    const second = make({ record: 'record-2', nonce: 'second' })
    const starting = second.start()
    starting.catch(() => {})
    await clock.pass(3 * times.heartbeatMs)
    await expect(starting).rejects.toMatchObject({ code: 'search-name-taken' })
    await dispatcher.close()
    queue.closed = false
    queue.state.announcements.set(search, {
      ...queue.state.announcements.get(search)!,
      record: 'record-1',
      search,
    })
    const third = make({ record: 'record-2', nonce: 'third' })
    const later = third.start()
    await clock.pass(3 * times.heartbeatMs)
    await later
  })

  test('closes within its time although the server is frozen', async () => {
    await started()
    queue.withdraw = () => new Promise(() => {})
    let closed = false
    const closing = dispatcher.close().then(() => {
      closed = true
    })
    await clock.pass(times.handBackMs + 10)
    expect(closed).toBe(true)
    await closing
  })

  test('who waits for facts is let go by close()', async () => {
    await started()
    const waiting = dispatcher.facts(60_000)
    await dispatcher.close()
    expect(await waiting).toEqual([])
  })
})

describe('what anybody could have written', () => {
  const forged: readonly [string, (item: WorkItem) => void][] = [
    ['bytes that are no answers', () => queue.deliver(undefined)],
  ]

  async function oneOut(): Promise<TestAgent> {
    await started()
    const worker = agent('a')
    submit(1)
    await clock.pass(10)
    return worker
  }

  test.each(forged)('%s: counted, acknowledged, ignored', async (_, forge) => {
    await oneOut()
    forge(itemOf(1))
    expect(resultsOf(await factsWithin(500))).toEqual([])
    expect(dispatcher.counters.malformed).toBe(1)
    expect(queue.state.results).toEqual([])
    expect(dispatcher.status().outstanding).toBe(1)
  })

  test.each([
    ['another record', { record: 'record-9' }],
    ['another problem', { pluginDigest: 'b'.repeat(64) }],
    ['another protocol', { protocol: 99 }],
    ['another search', { search: 'other' }],
  ])('(35) answers of %s: counted as foreign, acknowledged, ignored', async (_, more) => {
    const worker = await oneOut()
    const [job] = worker.take(1)
    worker.answer(job!, [0], more)
    expect(resultsOf(await factsWithin(500))).toEqual([])
    expect(dispatcher.counters.foreign).toBe(1)
    expect(queue.state.results).toEqual([])
    expect(dispatcher.status().outstanding).toBe(1)
  })

  test('(35) a number that no job of ours has had, and other contents: foreign', async () => {
    const worker = await oneOut()
    const [job] = worker.take(1)
    const { header } = job!
    const items = [itemOf(1, { individual: 77 })]
    for (const dispatch of [1, header.dispatch + 1000, 2 ** 52])
      queue.deliver(answersTo({ header: { ...header, dispatch }, items }, [0], worker))
    expect(resultsOf(await factsWithin(500))).toEqual([])
    expect(dispatcher.counters.foreign).toBe(3)
  })

  test('(36) wrong number of rows, failures of rows that do not exist: malformed', async () => {
    const worker = await oneOut()
    const [job] = worker.take(1)
    const { header, items } = job!
    queue.deliver(answersTo({ header, items: [{ ...items[0]!, replicates: 3 }] }, [0], worker))
    const answers = answersTo(job!, [0], worker)
    const [answer] = answers.answers
    const result = { values: answer!.result.values, failures: [{ simulation: 1, reason: 'x' }] }
    queue.deliver({ ...answers, answers: [{ ...answer!, result }] })
    expect(resultsOf(await factsWithin(500))).toEqual([])
    expect(dispatcher.counters.malformed).toBe(2)
    expect(dispatcher.status().outstanding).toBe(1)
  })

  test('(33) an answer three times: each is told, one is counted, outstanding is right', async () => {
    const worker = await oneOut()
    const [job] = worker.take(1)
    for (let i = 0; i < 3; i++) worker.answer(job!)
    expect(resultsOf(await factsWithin(500)).length).toBe(3)
    expect(dispatcher.counters).toMatchObject({ answers: 1, late: 2 })
    expect(dispatcher.status().outstanding).toBe(0)
  })

  test('(33) work that was settled by another answer and is taken up anew while a try of it is out: that try answers', async () => {
    const worker = await oneOut()
    submit(1)
    await clock.pass(10)
    expect(dispatcher.status().outstanding).toBe(1)
    const [job] = worker.take(1)
    worker.answer(job!)
    expect(resultsOf(await factsWithin(500)).length).toBe(1)
    expect(dispatcher.status().outstanding).toBe(0)
  })
})
