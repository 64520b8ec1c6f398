// The cluster's dispatcher over a queue server in memory and a virtual clock: every fault that the server, the agents
// and the coordinator's own process can have, one by one. The numbers in brackets are rows of the fault table
// (DEVELOPERS.md).

import { beforeEach, describe, expect, test } from 'vitest'
import { type Orders, RedisDispatcher } from '../../../coordinator/dispatch/redis/dispatcher.js'
import { clusterTimes } from '../../../shared/cluster/times.js'
import type { DispatchFact, WorkItem } from '../../../shared/result.js'
import { answersTo, itemOf, MemoryQueue, TestAgent, VirtualClock } from './memory-queue.js'

const times = clusterTimes()
const search = 'pump'
const pluginDigest = 'a'.repeat(64)

let clock: VirtualClock
let queue: MemoryQueue
let dispatcher: RedisDispatcher
let said: string[]
let orders: Orders

beforeEach(() => {
  clock = new VirtualClock()
  queue = new MemoryQueue(clock, search)
  said = []
  orders = {}
  dispatcher = make()
})

function make(more: { record?: string; nonce?: string; holder?: number } = {}): RedisDispatcher {
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

const agent = (name: string, more = {}) => new TestAgent(queue, clock, search, name, more)
const numbers = (count: number, from = 1): number[] => Array.from({ length: count }, (_, i) => from + i)
const submit = (...evaluations: number[]) => dispatcher.submit(evaluations.map((n) => itemOf(n)))

async function started(which = dispatcher): Promise<void> {
  const starting = which.start()
  await clock.pass(0)
  await starting
  // Who is there is said at the start.
  expect((await which.facts(0)).map(({ kind }) => kind)).toEqual(['fleet'])
}

/** What facts() gives within that time, several calls together. */
async function factsWithin(ms: number, which = dispatcher): Promise<DispatchFact[]> {
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
const resultsOf = (facts: readonly DispatchFact[]) =>
  facts.filter((one): one is Result => one.kind === 'result')
const lossesOf = (facts: readonly DispatchFact[]) => facts.filter((one): one is Lost => one.kind === 'lost')
const evaluationsOf = (facts: readonly (Result | Lost)[]) =>
  facts.map(({ item }) => item.evaluation).sort((a, b) => a - b)

/** One agent takes and answers all that waits, again and again. */
async function workedOff(by: TestAgent, ms: number): Promise<DispatchFact[]> {
  const facts: DispatchFact[] = []
  const endMs = clock.nowMs() + ms
  while (clock.nowMs() < endMs) {
    for (const job of by.take(100)) by.answer(job)
    facts.push(...(await factsWithin(100)))
  }
  return facts
}

describe('the usual way', () => {
  test('every item is answered once, with what the agent found', async () => {
    await started()
    const worker = agent('a')
    submit(...numbers(50))
    const facts = await workedOff(worker, 2000)
    expect(evaluationsOf(resultsOf(facts))).toEqual(numbers(50))
    expect(resultsOf(facts).every(({ item, result }) => result.values[0] === item.evaluation)).toBe(true)
    expect(dispatcher.status().outstanding).toBe(0)
  })

  test('the search is announced with a beat that moves, and its problem lies ready', async () => {
    await started()
    const first = queue.state.announcements.get(search)!
    await clock.pass(times.heartbeatMs + 10)
    const second = queue.state.announcements.get(search)!
    expect(second.beat).toBeGreaterThan(first.beat)
    expect(second.instance).toBe(queue.state.instance)
    expect(queue.state.plugin).toEqual(Uint8Array.of(1, 2, 3))
  })

  test('a delivery is acknowledged when facts() is called after the call that gave it, never before, not at close', async () => {
    await started()
    const worker = agent('a')
    submit(1, 2)
    await clock.pass(10)
    const [one, two] = worker.take(2)
    const receipt = worker.answer(one!)
    const facts = dispatcher.facts(1000)
    await clock.pass(100)
    expect(resultsOf(await facts).length).toBe(1)
    await clock.pass(5000)
    expect(queue.acknowledged).toEqual([])
    const later = worker.answer(two!)
    const more = dispatcher.facts(1000)
    await clock.pass(100)
    await more
    expect(queue.acknowledged).toEqual([receipt])
    await dispatcher.close()
    expect(queue.state.results.map((one) => one.receipt)).toEqual([later])
  })

  test('jobs last about jobMs when times are known, and leave two for every thread', async () => {
    await started()
    const worker = agent('a', { cores: 2 })
    await clock.pass(times.heartbeatMs * 2)
    submit(...numbers(20))
    // One second each in these tests: two an items of two seconds.
    await workedOff(worker, 1000)
    submit(...numbers(100, 101))
    await clock.pass(10)
    expect(Math.max(...queue.waiting().map(({ items }) => items.length))).toBe(2)
    expect(dispatcher.status().slots).toBe(2)
  })

  test('items that run alone travel alone; confirmations are taken first', async () => {
    await started()
    const worker = agent('a')
    await workedOff(worker, 3000)
    submit(...numbers(4))
    await clock.pass(10)
    dispatcher.submit([5, 6].map((n) => itemOf(n, { isolation: 'alone' })))
    dispatcher.submit([7].map((n) => itemOf(n, { purpose: 'confirm' })))
    await clock.pass(10)
    const jobs = queue.waiting()
    expect(jobs[0]!.header.purpose).toBe('confirm')
    const alone = jobs.filter(({ header }) => header.isolation === 'alone')
    expect(alone.map(({ items }) => items.length)).toEqual([1, 1])
  })
})

describe('agents', () => {
  test('(29) killed: what it held is lost as agent-lost when it has been silent so long, not before, and nobody else', async () => {
    await started()
    const [dead, living] = [agent('dead'), agent('living')]
    submit(1, 2, 3, 4)
    await clock.pass(10)
    const jobs = dead.take(2)
    living.take(1)
    await clock.pass(times.heartbeatMs)
    dead.die()
    // Two missed beats are no silence yet.
    const before = await factsWithin(2 * times.heartbeatMs)
    expect(lossesOf(before)).toEqual([])
    const losses = lossesOf(await factsWithin(times.silentMs - 2 * times.heartbeatMs))
    expect(evaluationsOf(losses)).toEqual(jobs.flatMap(({ items }) => items.map((item) => item.evaluation)))
    expect(losses.every(({ cause }) => cause === 'agent-lost')).toBe(true)
    expect(dispatcher.status().outstanding).toBe(4 - losses.length)
  })

  test('(29) killed before it could say what it took: the work runs elsewhere within the lease', async () => {
    await started()
    const [dead, living] = [agent('dead'), agent('living')]
    submit(1)
    await clock.pass(10)
    dead.die()
    dead.take(1)
    let takenMs = 0
    const startMs = clock.nowMs()
    while (takenMs === 0 && clock.nowMs() - startMs < 60_000) {
      await factsWithin(100)
      if (living.take(1).length > 0) takenMs = clock.nowMs()
    }
    expect(takenMs - startMs).toBeLessThan(times.leaseMs + 2000)
  })

  test('(32) stopped past its lease and going on: its answers count, nothing is lost twice', async () => {
    await started()
    const [slow, other] = [agent('slow'), agent('other')]
    submit(1)
    await clock.pass(10)
    const [job] = slow.take(1)
    await clock.pass(times.heartbeatMs)
    slow.die()
    const losses = lossesOf(await factsWithin(2 * times.silentMs))
    expect(evaluationsOf(losses)).toEqual([1])
    dispatcher.submit([itemOf(1, { attempt: 2 })])
    await clock.pass(10)
    slow.answer(job!)
    const zombie = resultsOf(await factsWithin(500))
    expect(zombie.map(({ item }) => item.attempt)).toEqual([1])
    expect(dispatcher.counters.late).toBe(1)
    const [again] = other.take(1)
    other.answer(again!)
    expect(resultsOf(await factsWithin(500)).map(({ item }) => item.attempt)).toEqual([2])
  })

  test('that says good-bye: what it handed back waits for others, what was addressed to it comes back', async () => {
    await started()
    const [going] = [agent('going', { host: 'h1' }), agent('staying', { host: 'h2' })]
    await clock.pass(2 * times.heartbeatMs)
    submit(1)
    dispatcher.submit([itemOf(2, { avoidHosts: ['h2'] })])
    await clock.pass(10)
    const taken = going.take(2)
    expect(taken.map(({ items }) => items[0]!.evaluation).sort()).toEqual([1, 2])
    queue.handBack(taken.find(({ items }) => items[0]!.evaluation === 1)!)
    going.leave()
    const losses = lossesOf(await factsWithin(2 * times.heartbeatMs))
    expect(losses.map(({ item, cause }) => [item.evaluation, cause])).toEqual([[2, 'handed-back']])
    expect(queue.waiting().map(({ items }) => items[0]!.evaluation)).toEqual([1])
  })

  test('found at the start with a beat that does not move is not there', async () => {
    const old = agent('old')
    old.die()
    await started()
    const facts = await factsWithin(3 * times.heartbeatMs)
    expect(facts.filter(({ kind }) => kind === 'fleet')).toEqual([])
    expect(dispatcher.status().slots).toBe(0)
    await factsWithin(5 * times.leaseMs)
    expect(queue.state.agents.size).toBe(0)
  })

  test('(48) that come and go are told as hosts, once a change', async () => {
    await started()
    const one = agent('one', { host: 'h1', cores: 2 })
    agent('two', { host: 'h1', cores: 3 })
    agent('three', { host: 'h2', cores: 4, processor: 'arm' })
    const came = (await factsWithin(3 * times.heartbeatMs)).filter((fact) => fact.kind === 'fleet')
    expect(came).toEqual([
      {
        kind: 'fleet',
        hosts: [
          { host: 'h1', processor: 'x64', cores: 5 },
          { host: 'h2', processor: 'arm', cores: 4 },
        ],
      },
    ])
    one.die()
    const went = (await factsWithin(2 * times.silentMs)).filter((fact) => fact.kind === 'fleet')
    expect(went.length).toBe(1)
    expect(dispatcher.status().slots).toBe(7)
  })

  test('work goes only where it may: hosts, processors, agents that are shut out', async () => {
    await started()
    const agents = [
      agent('a', { host: 'h1', processor: 'x64' }),
      agent('b', { host: 'h2', processor: 'arm' }),
      agent('c', { host: 'h3', processor: 'x64' }),
    ]
    await clock.pass(2 * times.heartbeatMs)
    dispatcher.submit([
      itemOf(1, { avoidHosts: ['h1', 'h3'], purpose: 'confirm' }),
      itemOf(2, { onProcessor: 'arm' }),
      itemOf(3, { avoid: ['h1', 'b'] }),
      itemOf(4, { avoid: ['h1/1/t1'] }),
      itemOf(5, { avoidHosts: ['h1', 'h2', 'h3'], purpose: 'confirm' }),
      itemOf(6, { onProcessor: 'riscv' }),
    ])
    await clock.pass(10)
    const addressed = (name: string) =>
      queue.waiting(`to-${name}`).flatMap(({ items }) => items.map(({ evaluation }) => evaluation))
    expect(addressed('b').sort()).toEqual([1, 2])
    expect(addressed('c')).toEqual([3])
    expect(addressed('a')).toEqual([])
    expect(queue.waiting().map(({ items }) => items[0]!.evaluation)).toEqual([4])
    expect(queue.waiting('to-b')[0]!.header.avoidHosts).toEqual(['h1', 'h3'])
    const losses = lossesOf(await factsWithin(100))
    expect(losses.map(({ item, cause }) => [item.evaluation, cause])).toEqual([
      [5, 'handed-back'],
      [6, 'handed-back'],
    ])
    expect(agents.length).toBe(3)
  })

  test('an agent that is shut out is given nothing, and is no reason to address work', async () => {
    orders = { shutOut: ['h1'] }
    await started()
    agent('a', { host: 'h1' })
    agent('b', { host: 'h2' })
    await clock.pass(2 * times.heartbeatMs)
    dispatcher.submit([itemOf(1, { avoid: ['h1'] })])
    await clock.pass(10)
    expect(queue.waiting().length).toBe(1)
    expect(queue.state.announcements.get(search)?.shutOut).toEqual(['h1'])
  })

  test('addressed work is spread by cores', async () => {
    await started()
    agent('a', { host: 'h1', cores: 1 })
    agent('b', { host: 'h2', cores: 3 })
    agent('c', { host: 'h3', cores: 3 })
    await clock.pass(2 * times.heartbeatMs)
    dispatcher.submit(numbers(40).map((n) => itemOf(n, { avoidHosts: ['h3'] })))
    await clock.pass(10)
    const of = (name: string) => queue.waiting(`to-${name}`).reduce((sum, { items }) => sum + items.length, 0)
    expect([of('a'), of('b'), of('c')]).toEqual([10, 30, 0])
  })

  test('losses that an agent reports are told once, with who had it', async () => {
    await started()
    const worker = agent('a')
    submit(1)
    await clock.pass(10)
    const [job] = worker.take(1)
    const executor = { kind: 'thread', worker: 'h/2/t1', host: 'h' } as const
    const loss = {
      dispatch: job!.header.dispatch,
      index: 0,
      cause: 'died',
      detail: 'bang',
      executor,
    } as const
    const { header } = answersTo(job!, [], worker)
    queue.deliver({ header, answers: [], losses: [loss] })
    queue.deliver({ header, answers: [], losses: [loss, { ...loss, index: 9 }, { ...loss, dispatch: 1 }] })
    const losses = lossesOf(await factsWithin(500))
    expect(losses).toMatchObject([{ item: { evaluation: 1 }, cause: 'died', detail: 'bang', executor }])
    expect(dispatcher.status().outstanding).toBe(0)
  })
})

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
})
