// Promise: how soon a cluster of real processes notices what is gone and goes on: silence, leases, an emptied Redis,
// preemption after preemption. Times are scaled down; seconds of a promise grow with the load of the machine (crew.ts).
// How soon a worker is gone after SIGTERM: tests/queue/agent.test.ts.

import { afterEach, beforeAll, expect, test } from 'vitest'
import { type Heartbeat, protocolVersion } from '../../shared/cluster/messages.js'
import { parseAddress, RedisAgentQueue } from '../../worker/redis/index.js'
import { ensureBuilt } from '../tools/built.js'
import { pause } from '../tools/redis-server.js'
import { Crew, endless, patience, search, until } from './crew.js'

beforeAll(() => ensureBuilt(), 120_000)
let crew: Crew | undefined
afterEach(async () => {
  await crew?.close()
  crew = undefined
})

/** Milliseconds of a scaled promise on a machine that others use too. */
const promised = (seconds: number, scale: number) => 1000 * seconds * scale * patience()

test('(29) kill -9: silence is noticed within 6 s, and the work runs elsewhere within the lease and 2 s', async () => {
  const scale = 0.2
  crew = await Crew.open(scale)
  const { dispatcher, facts } = crew
  const lives = new Map(['a', 'b'].map((host) => [host, crew!.worker(host)]))
  await until('two workers', () => dispatcher.status().slots === 2)
  const item = crew.item(endless)
  dispatcher.submit([item])
  await until('somebody holds it', () => crew!.holders().length === 1)
  const [holder] = crew.holders()
  const other = holder === 'a' ? 'b' : 'a'
  const killedMs = performance.now()
  lives.get(holder!)!.kill('SIGKILL')
  const noticedMs = await until('it is lost', () => crew!.lost.length === 1)
  dispatcher.submit([{ ...item, attempt: 2 }])
  const elsewhereMs = await until('it runs elsewhere', () => crew!.holders().includes(other))
  expect(crew.lost).toMatchObject([{ cause: 'agent-lost', executor: { host: holder } }])
  expect(facts.filter(({ kind }) => kind === 'result')).toEqual([])
  // One look of the keeper more than the silence itself.
  expect(noticedMs - killedMs).toBeLessThan(promised(6 + 0.5, scale))
  expect(elsewhereMs - killedMs).toBeLessThan(promised(15 + 2, scale))
})

test('(16, 20) Redis killed and back empty: dispatching within 3 s, nothing lost, wasted at most what was in flight', async () => {
  const scale = 0.3
  crew = await Crew.open(scale)
  const { dispatcher, server } = crew
  for (const host of ['a', 'b']) crew.worker(host)
  await until('two workers', () => dispatcher.status().slots === 2)
  const items = Array.from({ length: 60 }, () => crew!.item(10))
  dispatcher.submit(items)
  await until('some are answered', () => crew!.answered.length >= 10)
  await server.kill()
  await pause(1000)
  const answeredBefore = crew.answered.length
  await server.start()
  const backMs = performance.now()
  const sentMs = await until('all is sent again', () => dispatcher.counters.resets === 1)
  expect(sentMs - backMs).toBeLessThan(promised(3, scale) + 1000)
  await until('work goes on', () => crew!.answered.length > answeredBefore)
  await until('all is answered', () => new Set(crew!.answered).size === 60)
  await pause(4 * crew.times.heartbeatMs)
  const { outstanding } = dispatcher.status()
  const simulated = dispatcher.agents().reduce((sum, { heartbeat }) => sum + heartbeat.simulations, 0)
  expect(outstanding).toBe(0)
  expect(crew.lost).toEqual([])
  // In flight: what workers had taken. Before times are known a job is one item; afterwards jobs of two seconds at most.
  const jobItems = Math.ceil(crew.times.jobMs / 100) + 1
  expect(simulated - 60).toBeLessThanOrEqual(2 * 2 * jobItems)
})

test('(30) one evaluation is taken away 100 times, by kill -9 and by handing back, and is answered in the end', async () => {
  crew = await Crew.open(0.05)
  const { dispatcher, server, times } = crew
  const item = crew.item(1)
  dispatcher.submit([item])
  let attempt = 1
  let handedBack = 0
  for (let preemption = 1; preemption <= 100; preemption++) {
    const agent = `mayfly-${preemption}`
    let held: number[] = []
    const queue = new RedisAgentQueue({ address: parseAddress(server.url), prefix: 'skerry', agent, times })
    await queue.open()
    const beats = setInterval(
      () => void queue.beat(heartbeatOf(agent, preemption, held)).catch(() => {}),
      times.heartbeatMs,
    )
    try {
      await queue.beat(heartbeatOf(agent, 0, held))
      let job = await queue.take(search)
      while (!job) {
        await queue.waitForWork([search], times.heartbeatMs)
        job = await queue.take(search)
      }
      held = [job.job.header.dispatch]
      await queue.beat(heartbeatOf(agent, preemption + 1, held))
      if (preemption % 4 !== 0) {
        await queue.handBack(job)
        await queue.leave(agent)
        handedBack++
        continue
      }
    } finally {
      clearInterval(beats)
      await queue.close()
    }
    // Silent from here on, as after kill -9.
    const before = crew.lost.length
    await until('the loss is told', () => crew!.lost.length > before || dispatcher.counters.vanished > 0)
    if (crew.lost.length > before) dispatcher.submit([{ ...item, attempt: ++attempt }])
  }
  expect(handedBack).toBe(75)
  crew.worker('steady')
  await until('it is answered', () => crew!.answered.length > 0)
  expect(new Set(crew.answered)).toEqual(new Set([item.evaluation]))
  expect(
    crew.lost.every((fact) => fact.kind === 'lost' && ['agent-lost', 'handed-back'].includes(fact.cause)),
  ).toBe(true)
})

function heartbeatOf(agent: string, beat: number, held: readonly number[]): Heartbeat {
  return {
    protocol: protocolVersion,
    agent,
    host: 'mayfly',
    processor: 'test',
    node: process.version,
    skerry: '0.0.0',
    pid: process.pid,
    cores: 1,
    beat,
    state: 'working',
    stateSeconds: 0,
    held: { [search]: [...held] },
    simulations: 0,
    failures: 0,
    lost: 0,
    handedBack: 0,
    rate: 0,
    memoryMB: 1,
    lastWord: '',
  }
}
