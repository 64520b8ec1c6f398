// Both sides of the queue over a real Redis: what one puts in, the other gets, once, in order, also over restarts.

import { afterEach, beforeEach, describe, expect, test } from 'vitest'
import type { CoordinatorQueue } from '../../coordinator/dispatch/redis/port.js'
import type { Answers, Job } from '../../shared/cluster/codec.js'
import { type Announcement, type Heartbeat, protocolVersion } from '../../shared/cluster/messages.js'
import { clusterTimes } from '../../shared/cluster/times.js'
import { resultDigest } from '../../shared/digests.js'
import type { WorkItem } from '../../shared/result.js'
import { parseAddress, RedisAgentQueue, RedisCoordinatorQueue } from '../../worker/redis/index.js'
import { RedisServer } from '../tools/redis-server.js'

const times = clusterTimes(0.1)
const prefix = 'skerry'
const search = 'pump'

let server: RedisServer
let coordinator: RedisCoordinatorQueue
let open: { close(): Promise<void> }[] = []

beforeEach(async () => {
  server = await RedisServer.start()
  coordinator = await coordinatorOn(server)
  await coordinator.begin('first')
})
afterEach(async () => {
  await Promise.all(open.map((one) => one.close()))
  open = []
  await server.close()
})

async function coordinatorOn(on: RedisServer): Promise<RedisCoordinatorQueue & CoordinatorQueue> {
  const queue = new RedisCoordinatorQueue({
    address: parseAddress(on.url),
    prefix,
    search,
    times,
    unprotected: false,
  })
  open.push(queue)
  await queue.open()
  return queue
}

async function agentOn(on: RedisServer, agent: string): Promise<RedisAgentQueue> {
  const queue = new RedisAgentQueue({ address: parseAddress(on.url), prefix, agent, times })
  open.push(queue)
  await queue.open()
  return queue
}

function itemOf(evaluation: number): WorkItem {
  return {
    island: 1,
    evaluation,
    individual: evaluation,
    firstReplicate: 0,
    replicates: 1,
    genome: Uint8Array.of(1, 2, evaluation),
    expectedCost: 1,
    attempt: 1,
    purpose: 'evaluate',
    isolation: 'shared',
    avoid: [],
  }
}

function jobOf(dispatch: number, instance = 'first'): Job {
  return {
    header: {
      protocol: protocolVersion,
      search,
      record: 'r',
      instance,
      dispatch,
      purpose: 'evaluate',
      isolation: 'shared',
      avoid: [],
      avoidHosts: [],
    },
    items: [itemOf(dispatch)],
  }
}

function answersOf(dispatch: number): Answers {
  const result = { values: Float64Array.of(dispatch, 0.5), failures: [] }
  return {
    header: {
      protocol: protocolVersion,
      search,
      record: 'r',
      agent: 'a',
      host: 'h',
      processor: 'p',
      pluginDigest: '0'.repeat(64),
      skerry: '0',
    },
    answers: [
      {
        dispatch,
        index: 0,
        item: { island: 1, evaluation: dispatch, attempt: 1, purpose: 'evaluate' },
        result,
        digest: resultDigest(result),
        executor: { kind: 'thread', worker: 'h/1/t1', host: 'h', processor: 'p' },
        cpuSeconds: 1,
        wallSeconds: 2,
      },
    ],
    losses: [],
  }
}

const add = (...dispatches: number[]) =>
  coordinator.add(dispatches.map((dispatch) => ({ job: jobOf(dispatch), urgent: false })))

describe('jobs', () => {
  test('come out as they went in, each once, in order; urgent ones first', async () => {
    await add(1, 2, 3)
    await coordinator.add([4, 5].map((dispatch) => ({ job: jobOf(dispatch), urgent: true })))
    const [one, two] = [await agentOn(server, 'one'), await agentOn(server, 'two')]
    const seen: number[] = []
    for (let turn = 0; turn < 3; turn++) {
      for (const agent of [one, two]) {
        const taken = await agent.take(search)
        if (taken) seen.push(taken.job.header.dispatch)
        if (turn === 0 && agent === one) expect(taken?.job).toEqual(jobOf(4))
      }
    }
    expect(seen).toEqual([4, 5, 1, 2, 3])
  })

  test('for one agent are seen by no other', async () => {
    await coordinator.add([{ job: jobOf(1), agent: 'two', urgent: false }])
    const [one, two] = [await agentOn(server, 'one'), await agentOn(server, 'two')]
    expect(await one.take(search)).toBeUndefined()
    expect((await two.take(search))?.job.header.dispatch).toBe(1)
  })

  test('handed back are the next for others; finished ones are gone; removed ones never start', async () => {
    await add(1, 2, 3)
    const [one, two] = [await agentOn(server, 'one'), await agentOn(server, 'two')]
    const taken = await one.take(search)
    await one.handBack(taken!)
    const again = await two.take(search)
    expect(again?.job.header.dispatch).toBe(1)
    const places = [1, 2, 3, 9].map((dispatch) => ({ dispatch }))
    expect(await coordinator.states(places)).toEqual(['active', 'waiting', 'waiting', 'gone'])
    await two.finish(again!)
    await coordinator.remove([{ dispatch: 2 }])
    expect(await coordinator.states(places)).toEqual(['gone', 'gone', 'waiting', 'gone'])
    expect((await two.take(search))?.job.header.dispatch).toBe(3)
    expect(await two.take(search)).toBeUndefined()
  })

  test('a lease ends unless it is renewed, and a lost one is told and harms nothing', async () => {
    await add(1, 2)
    const agent = await agentOn(server, 'one')
    const [kept, left] = [await agent.take(search), await agent.take(search)]
    const untilMs = performance.now() + 1.3 * times.leaseMs
    while (performance.now() < untilMs) {
      expect(await agent.renew([kept!])).toEqual([])
      await new Promise((resolve) => setTimeout(resolve, times.leaseMs / 4))
    }
    expect(await agent.renew([kept!, left!])).toEqual([left])
    await agent.finish(left!)
    await agent.handBack(left!)
    // Without its lock the coordinator may take it out, with it not.
    await coordinator.remove([{ dispatch: 1 }, { dispatch: 2 }])
    expect(await coordinator.states([{ dispatch: 1 }, { dispatch: 2 }])).toEqual(['active', 'gone'])
  })

  test('waiting for work ends when there is some, and after its time when there is none', async () => {
    const agent = await agentOn(server, 'one')
    const startMs = performance.now()
    await agent.waitForWork([search], 200)
    expect(performance.now() - startMs).toBeGreaterThan(180)
    let waited = false
    const waiting = agent.waitForWork(['other', search], 60_000).then(() => {
      waited = true
    })
    await new Promise((resolve) => setTimeout(resolve, 2 * times.commandMs))
    expect(waited).toBe(false)
    await add(1)
    await waiting
    expect((await agent.take(search))?.job.header.dispatch).toBe(1)
  })
})

describe('answers', () => {
  test('are delivered until they are acknowledged, to whoever reads for the coordinator', async () => {
    const agent = await agentOn(server, 'one')
    await agent.answer(search, answersOf(1))
    await agent.answer(search, answersOf(2))
    const first = await coordinator.deliveries(100)
    expect(first.map(({ answers }) => answers)).toEqual([answersOf(1), answersOf(2)])
    await coordinator.acknowledge([first[0]!.receipt])
    expect(await coordinator.deliveries(50)).toEqual([])
    const later = await coordinatorOn(server)
    expect((await later.deliveries(50)).map(({ answers }) => answers)).toEqual([answersOf(2)])
    expect(await later.deliveries(50)).toEqual([])
    await agent.answer(search, answersOf(3))
    expect((await later.deliveries(50)).map(({ answers }) => answers)).toEqual([answersOf(3)])
    await later.acknowledge((await coordinator.deliveries(50)).map(({ receipt }) => receipt))
    expect(Number(server.ask('XLEN', 'skerry:s:pump:results'))).toBeLessThanOrEqual(2)
  })

  test('survive a new beginning; jobs and queues of agents do not', async () => {
    await add(1)
    await coordinator.add([{ job: jobOf(2), agent: 'one', urgent: false }])
    const agent = await agentOn(server, 'one')
    await agent.answer(search, answersOf(7))
    await coordinator.begin('second')
    expect(await coordinator.instance()).toBe('second')
    expect(await agent.take(search)).toBeUndefined()
    expect((await coordinator.deliveries(100)).map(({ answers }) => answers)).toEqual([answersOf(7)])
  })

  test('on their way are kept when the search stands still; nothing else is', async () => {
    await add(1)
    await coordinator.putPlugin(Uint8Array.of(1))
    const agent = await agentOn(server, 'one')
    await agent.answer(search, answersOf(7))
    await coordinator.withdraw()
    expect(server.ask('KEYS', 'skerry:s:*:work:*')).toBe('')
    const later = await coordinatorOn(server)
    await later.begin('second')
    const [left] = await later.deliveries(100)
    expect(left?.answers).toEqual(answersOf(7))
    expect(server.ask('TTL', 'skerry:s:pump:results')).toBe('-1')
    await later.acknowledge([left!.receipt])
    await later.withdraw()
    expect(server.ask('KEYS', 'skerry:s:*')).toBe('')
  })

  test('that nobody of ours wrote come with a complaint', async () => {
    server.ask('XADD', 'skerry:s:pump:results', '*', 'b', 'rubbish')
    server.ask('XADD', 'skerry:s:pump:results', '*', 'c', 'rubbish')
    const found = await coordinator.deliveries(100)
    expect(found.map(({ answers }) => answers)).toEqual([undefined, undefined])
    expect(found.every(({ complaint }) => (complaint ?? '').length > 0)).toBe(true)
  })
})

test('announcements, the pinned problem and heartbeats are read as they were written; forged ones are left out', async () => {
  const agent = await agentOn(server, 'one')
  const announcement: Announcement = {
    protocol: protocolVersion,
    search,
    record: 'r',
    holder: 1,
    instance: 'first',
    beat: 1,
    pluginDigest: '0'.repeat(64),
    pluginBytes: 3,
    seed: 7,
    sharedConditions: true,
    exactness: 'bits',
    needs: { cores: 1, memoryMB: 1024, tokens: {} },
    tokens: {},
    share: 1,
    shutOut: [],
    draining: [],
    waiting: false,
    skerry: '0.1.0',
  }
  await coordinator.announce(announcement)
  server.ask('HSET', 'skerry:searches', 'forged', '{"protocol":1}')
  server.ask('HSET', 'skerry:searches', 'broken', '{')
  expect(await agent.searches()).toEqual([announcement])
  expect(await coordinator.announced(search)).toEqual(announcement)
  expect(await coordinator.announced('broken')).toBeUndefined()
  const bytes = Uint8Array.from({ length: 100_000 }, (_, i) => i % 256)
  expect(await agent.plugin(search)).toBeUndefined()
  await coordinator.putPlugin(bytes)
  expect(Buffer.compare((await agent.plugin(search))!, bytes)).toBe(0)
  const heartbeat: Heartbeat = {
    protocol: protocolVersion,
    agent: 'one',
    host: 'h',
    processor: 'p',
    node: process.version,
    skerry: '0.1.0',
    pid: 1,
    cores: 2,
    beat: 4,
    state: 'idle',
    stateSeconds: 1,
    held: { [search]: [1, 2] },
    simulations: 0,
    failures: 0,
    lost: 0,
    handedBack: 0,
    rate: 0,
    memoryMB: 1,
    lastWord: '',
  }
  await agent.beat(heartbeat)
  server.ask('HSET', 'skerry:agents', 'two', '{"beat":-1}')
  expect(await coordinator.agents()).toEqual([heartbeat])
  await agent.leave('one')
  expect(await coordinator.agents()).toEqual([])
  await coordinator.withdraw()
  expect(server.ask('KEYS', 'skerry:s:*')).toBe('')
  expect(await agent.searches()).toEqual([])
})

test('licences are never given twice, are all or nothing, and come back when their holder is silent', async () => {
  const agents = await Promise.all([1, 2, 3].map((n) => agentOn(server, `agent-${n}`)))
  const limits = { mesher: 2, solver: 5 }
  const taken = await Promise.all(agents.map((agent) => agent.takeTokens({ mesher: 1, solver: 2 }, limits)))
  expect(taken.filter((receipt) => receipt !== undefined).length).toBe(2)
  const holder = taken.findIndex((receipt) => receipt !== undefined)
  expect(await agents[holder]!.takeTokens({ solver: 2 }, limits)).toBeUndefined()
  expect(await agents[holder]!.takeTokens({ solver: 1 }, limits)).toBeDefined()
  expect(await agents[holder]!.takeTokens({ unknown: 1 }, limits)).toBeUndefined()
  await agents[holder]!.returnTokens(taken[holder]!)
  expect(await agents[holder]!.renewTokens(taken[holder]!)).toBe(false)
  expect(await agents[holder]!.takeTokens({ mesher: 1 }, limits)).toBeDefined()
  expect(await agents[0]!.takeTokens({ mesher: 1 }, limits)).toBeUndefined()
  await new Promise((resolve) => setTimeout(resolve, times.leaseMs * 1.1))
  expect(await agents[0]!.takeTokens({ mesher: 2, solver: 5 }, limits)).toBeDefined()
})

test('an agent has two connections and a coordinator two, whatever the number of searches', async () => {
  const agent = await agentOn(server, 'one')
  for (const name of ['a', 'b', 'c', 'd']) await agent.take(name)
  const ours = server
    .ask('CLIENT', 'LIST')
    .split('\n')
    .filter((line) => line.includes('name=skerry:'))
  expect(ours.length).toBe(4)
})
