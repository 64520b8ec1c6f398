// Promise: a real worker process leaves in time whatever it is doing, loses nothing that is answered, leaves nobody
// behind, and outlives what happens to Redis. Rows 29, 31, 32 of the fault table.

import { afterEach, beforeAll, describe, expect, test } from 'vitest'
import { ensureBuilt } from '../tools/built.js'
import { pause, RedisServer } from '../tools/redis-server.js'
import { descendants, endless, isAlive, Site, until, Worker } from './agent-site.js'

beforeAll(() => ensureBuilt(), 120_000)
let site: Site | undefined
afterEach(async () => {
  await site?.close()
  site = undefined
})
const quick = 5

test('a worker simulates what waits, says who it is, and leaves with 0 when there is nothing to do', async () => {
  site = await Site.open(0.2)
  for (let i = 0; i < 5; i++) await site.add([quick, quick, quick])
  const worker = site.worker('host-a', ['--idle-exit', '3'])
  await until('15 answers', () => site!.answers.length === 15)
  expect(site.losses).toEqual([])
  expect(new Set(site.answers.map(({ executor }) => executor.host))).toEqual(new Set(['host-a']))
  expect(site.answers[0]!.executor.processor).toMatch(/^(x64|arm64) /)
  const [heartbeat] = await site.agents()
  expect(heartbeat).toMatchObject({ host: 'host-a', cores: 2 })
  expect(await worker.gone).toBe(0)
  expect(await site.agents()).toEqual([])
  expect(worker.out).toContain('Nothing to do for 3 s.')
})

/** As many as the p99 needs; more on request. */
const leavings = Number(process.env.SKERRY_LEAVINGS ?? 20)
const together = 4

describe('told to leave in the middle of simulations that never end (row 31)', () => {
  test(`work is back within 2 s, the process is gone within 5 s, ${leavings} times of ${leavings}`, async () => {
    site = await Site.open(1)
    const backMs: number[] = []
    const goneMs: number[] = []
    for (let left = leavings; left > 0; left -= together)
      await leaveTogether(site, Math.min(left, together), backMs, goneMs)
    expect(goneMs).toHaveLength(leavings)
    expect(Math.max(...backMs)).toBeLessThan(2000)
    expect(Math.max(...goneMs)).toBeLessThan(5000)
  })

  test('of a job that is partly done the answers are written, the rest is a loss nobody is blamed for', async () => {
    site = await Site.open(1)
    const job = await site.add([quick, endless])
    const worker = site.worker('host-a')
    await until('the short one answered', () => site!.answers.length === 1)
    worker.kill('SIGTERM')
    expect(await worker.gone).toBe(75)
    await until('the loss', () => site!.losses.length === 1)
    expect(site.losses).toMatchObject([{ dispatch: job, index: 1, cause: 'handed-back' }])
    expect(await site.stateOf(job)).toBe('gone')
  })

  test('Redis frozen: gone in time all the same', async () => {
    site = await Site.open(1)
    await site.add([endless])
    const worker = site.worker('host-a')
    await until('begun', async () => (await site!.agents()).some(({ held }) => held.weir?.length === 1))
    site.server.signal('SIGSTOP')
    const startMs = performance.now()
    worker.kill('SIGTERM')
    const code = await worker.gone
    const ms = performance.now() - startMs
    site.server.signal('SIGCONT')
    expect(code).toBe(75)
    expect(ms).toBeLessThan(5000)
  })

  test('a second signal ends it at once', async () => {
    site = await Site.open(1)
    await site.add([endless])
    const worker = site.worker('host-a')
    await until('begun', async () => (await site!.agents()).some(({ held }) => held.weir?.length === 1))
    site.server.signal('SIGSTOP')
    worker.kill('SIGTERM')
    await pause(200)
    const startMs = performance.now()
    worker.kill('SIGTERM')
    expect(await worker.gone).toBe(143)
    expect(performance.now() - startMs).toBeLessThan(1000)
    site.server.signal('SIGCONT')
  })
})

/** So many workers, all in the middle of two endless simulations, are told at once; adds how long each took. */
async function leaveTogether(site: Site, count: number, backMs: number[], goneMs: number[]): Promise<void> {
  const signals = ['SIGTERM', 'SIGINT', 'SIGUSR1'] as const
  const jobs = await Promise.all(Array.from({ length: 2 * count }, () => site.add([endless])))
  const workers = Array.from({ length: count }, (_, i) => site.worker(`host-${i}`))
  const states = () => Promise.all(jobs.map((job) => site.stateOf(job)))
  await until('all are at work', async () => (await states()).every((state) => state === 'active'), 60_000)
  const children = workers.flatMap(({ pid }) => descendants(pid))
  const startMs = performance.now()
  for (const [i, worker] of workers.entries()) worker.kill(signals[i % 3]!)
  const gone = workers.map(async (worker) => {
    expect(await worker.gone).toBe(75)
    goneMs.push(performance.now() - startMs)
  })
  await until('all work is back', async () => (await states()).every((state) => state === 'waiting'))
  backMs.push(performance.now() - startMs)
  await Promise.all(gone)
  await until('its processes are gone', () => !children.some(isAlive), 2000)
  await site.queue.remove(jobs.map((dispatch) => ({ dispatch })))
}

test('kill -9 leaves no process behind (row 29)', async () => {
  site = await Site.open(0.2)
  await site.add([endless])
  await site.add([endless])
  const worker = site.worker('host-a')
  await until('begun', async () => (await site!.agents()).some(({ held }) => held.weir?.length === 2))
  const children = descendants(worker.pid)
  expect(children.length).toBeGreaterThan(0)
  worker.kill('SIGKILL')
  await worker.gone
  await until('its processes are gone', () => !children.some(isAlive), 5000)
})

test('stopped past its lease and continued: what it had is answered late, once, and it goes on (row 32)', async () => {
  site = await Site.open(0.3)
  const worker = site.worker('host-a')
  await site.add([quick])
  await until('at work', () => site!.answers.length === 1)
  const late = await site.add([80, 80])
  await until('begun', async () => (await site!.stateOf(late)) === 'active')
  worker.kill('SIGSTOP')
  // A lease is 4.5 s here.
  await pause(6000)
  worker.kill('SIGCONT')
  const next = await site.add([quick])
  await until('both answered', () => site!.answers.length === 4)
  expect(site.answers.filter(({ dispatch }) => dispatch === late)).toHaveLength(2)
  expect(site.answers.filter(({ dispatch }) => dispatch === next)).toHaveLength(1)
  expect(site.losses).toEqual([])
})

test('Redis killed and back empty: answers that were under way arrive, and new work is taken', async () => {
  site = await Site.open(0.2)
  site.worker('host-a')
  await site.add([quick])
  await until('at work', () => site!.answers.length === 1)
  const begun = await site.add([70])
  await until('begun', async () => (await site!.stateOf(begun)) === 'active')
  await site.server.kill()
  await pause(1500)
  await site.server.start()
  await until('Redis answers', async () => {
    try {
      await site!.begin()
      return true
    } catch {
      return false
    }
  })
  const next = await site.add([quick])
  await until('both answered', () => site!.answers.length === 3)
  expect(site.answers.map(({ dispatch }) => dispatch).sort()).toEqual([1, begun, next])
})

describe('what is wrong is said, with its exit code', () => {
  test('a coordinator of another version: both are named, and with no other search it ends with 76', async () => {
    const server = await RedisServer.start()
    let beat = 0
    const announce = setInterval(() => {
      const foreign = { protocol: 99, search: 'weir', skerry: '9.9.9', beat: ++beat, novelty: true }
      server.ask('HSET', 'skerry:searches', 'weir', JSON.stringify(foreign))
    }, 300)
    const worker = new Worker(['--redis', server.url], { SKERRY_TEST_TIME_SCALE: '0.2' })
    expect(await worker.gone).toBe(76)
    expect(worker.out).toContain('version 99 of the protocol (Skerry 9.9.9), this worker version 1')
    clearInterval(announce)
    await server.close()
  })

  test('--json: one object a line', async () => {
    site = await Site.open(0.2)
    const worker = site.worker('host-a', ['--json', '--idle-exit', '1'])
    expect(await worker.gone).toBe(0)
    const lines = worker.out
      .trim()
      .split('\n')
      .map((line) => JSON.parse(line) as { readonly state: string })
    expect(lines.length).toBeGreaterThanOrEqual(3)
    expect(lines.at(-1)).toMatchObject({ state: 'gone', exitCode: 0 })
  })

  test.each([
    [[], 64, 'no Redis was named'],
    [['--redis', 'redis://no-such-host.invalid'], 69, 'there is no host of this name'],
    [['--redis', 'http://here'], 64, 'it begins with http://'],
    [['--redis', 'redis://127.0.0.1:1', '--cores', '9999'], 64, '--cores 9999; expected at most'],
    [['--redis', 'redis://127.0.0.1:1', '--until', 'soon'], 64, '--until soon is no time'],
    [['--redis', 'redis://127.0.0.1:1', '--key', '/no/such/key'], 78, 'no such key file'],
  ])('%j', async (args, code, words) => {
    const worker = new Worker(args, { SKERRY_TEST_TIME_SCALE: '0.1', SKERRY_REDIS: '' })
    expect(await worker.gone).toBe(code)
    expect(worker.err).toContain(words)
  })
})
