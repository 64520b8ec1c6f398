// The cluster's dispatcher: the usual way of work, and everything that agents do to it. The numbers in brackets are
// rows of the fault table (DEVELOPERS.md).

import { describe, expect, test } from 'vitest'
import {
  agent,
  clock,
  dispatcher,
  evaluationsOf,
  factsWithin,
  lossesOf,
  numbers,
  order,
  queue,
  resultsOf,
  search,
  started,
  submit,
  times,
  workedOff,
} from './harness.js'
import { answersTo, itemOf } from './memory-queue.js'

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
    order({ shutOut: ['h1'] })
    await started()
    agent('a', { host: 'h1' })
    agent('b', { host: 'h2' })
    await clock.pass(2 * times.heartbeatMs)
    dispatcher.submit([itemOf(1, { avoid: ['h1'] })])
    await clock.pass(10)
    expect(queue.waiting().length).toBe(1)
    expect(queue.state.announcements.get(search)?.shutOut).toEqual(['h1'])
  })

  test('(47) a second try of slow work goes to another agent than the first, at once, or comes back', async () => {
    await started()
    const slow = agent('slow')
    await clock.pass(2 * times.heartbeatMs)
    submit(1, 2)
    await clock.pass(10)
    slow.take(1)
    await clock.pass(2 * times.heartbeatMs)
    dispatcher.submit([itemOf(1, { attempt: 2, hedge: true })])
    expect(lossesOf(await factsWithin(100)).map(({ cause }) => cause)).toEqual(['handed-back'])
    const quick = agent('quick')
    await clock.pass(2 * times.heartbeatMs)
    dispatcher.submit([itemOf(1, { attempt: 3, hedge: true })])
    await clock.pass(10)
    expect(queue.waiting('to-quick').map(({ items }) => items[0]!.attempt)).toEqual([3])
    expect(quick.take(1)[0]!.items[0]!.attempt).toBe(3)
  })

  test('what was lost goes out again before all that waits, in its own order', async () => {
    await started()
    agent('a')
    await clock.pass(2 * times.heartbeatMs)
    submit(3, 4, 5)
    await clock.pass(10)
    dispatcher.submit([itemOf(1, { attempt: 2 }), itemOf(2, { attempt: 2 }), itemOf(6)])
    await clock.pass(10)
    const waiting = queue.waiting().flatMap(({ items }) => items.map(({ evaluation }) => evaluation))
    expect(waiting).toEqual([1, 2, 3, 4, 5, 6])
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
