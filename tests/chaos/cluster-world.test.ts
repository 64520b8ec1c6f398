// Promise: what the world around a cluster may do beside killing: wall clocks that jump, names that stop resolving, a
// backup put back while workers still answer what came after it. It costs time; the digest is that of a calm day.

import { cpSync, rmSync, writeFileSync } from 'node:fs'
import { join } from 'node:path'
import { afterEach, beforeAll, beforeEach, expect, test } from 'vitest'
import { ensureBuilt } from '../tools/built.js'
import { pause, RedisServer } from '../tools/redis-server.js'
import { Bench, hears, type Life, reportOf, searchOf, waitingProblem } from './programs.js'

const scale = 0.2
const record = 'records/world'

let bench: Bench
let server: RedisServer
let calm: Life
beforeAll(() => ensureBuilt(), 120_000)
beforeEach(async () => {
  bench = new Bench(scale)
  bench.write('problem.js', waitingProblem(4))
  bench.write('search.yaml', searchOf(500))
  server = await RedisServer.start()
  calm = bench.run('records/calm', ['--cores', '1'])
})
afterEach(async () => {
  await bench.close()
  await server.close()
})

/** The environment of a process that loads this script before anything else. */
function loading(name: string, script: string): NodeJS.ProcessEnv {
  bench.write(name, script)
  return { NODE_OPTIONS: `--import=${new URL(`file://${join(bench.folder, name)}`).href}` }
}

async function committed(least: number, coordinator: Life): Promise<void> {
  while (bench.committed(record) < least && !coordinator.isOver) await pause(50)
  expect(coordinator.isOver, coordinator.said()).toBe(false)
}

async function endsAsOnACalmDay(coordinator: Life): Promise<void> {
  const { code, out, err } = await coordinator.ended
  expect(code, err).toBe(0)
  const reference = await calm.ended
  expect(reference.code, reference.err).toBe(0)
  expect(reportOf(out)).toEqual(reportOf(reference.out))
}

const jumpingClock = `
const real = Date.now
const jumps = [3600e3, -3600e3, -real(), 10 * 365 * 86400e3, 0]
const started = performance.now()
Date.now = () => real() + jumps[Math.floor((performance.now() - started) / 700) % jumps.length]
`

test('(12) wall clocks that jump by hours, back to 1970 and years ahead: nobody expires, nothing is said of silence', async () => {
  const env = loading('clock.mjs', jumpingClock)
  for (const host of ['h1', 'h2']) bench.work(server.url, host, [], env)
  const coordinator = bench.run(record, ['--redis', server.url], env)
  await endsAsOnACalmDay(coordinator)
  expect(coordinator.err).not.toContain('was stopped for 3')
  expect(coordinator.said()).not.toMatch(/-\d+(\.\d+)? (s|min|h)\b/)
})

const failingNames = (flag: string) => `
import dns from 'node:dns'
import { existsSync } from 'node:fs'
const real = dns.lookup
dns.lookup = (host, options, done) => {
  if (!existsSync(${JSON.stringify(flag)})) return real(host, options, done)
  const error = Object.assign(new Error('getaddrinfo EAI_AGAIN ' + host), { code: 'EAI_AGAIN', syscall: 'getaddrinfo', hostname: host })
  process.nextTick(() => (typeof options === 'function' ? options : done)(error))
}
`

test('(28) names stop resolving in the middle of a search, then work again: all come back by themselves', async () => {
  const flag = join(bench.folder, 'no-names')
  const env = loading('names.mjs', failingNames(flag))
  const url = server.url.replace('127.0.0.1', 'localhost')
  const workers = ['h1', 'h2'].map((host) => bench.work(url, host, [], env))
  const coordinator = bench.run(record, ['--redis', url], env)
  await committed(60, coordinator)
  writeFileSync(flag, '')
  server.ask('CLIENT', 'KILL', 'TYPE', 'normal')
  await hears(coordinator, /The search waits for it/)
  await pause(2000)
  rmSync(flag)
  await hears(coordinator, /Redis answers again/)
  await endsAsOnACalmDay(coordinator)
  for (const worker of workers) expect(worker.isOver, worker.said()).toBe(false)
})

test('(53) an older backup is put back while workers live: what came after it is simulated again, nothing is mixed', async () => {
  for (const host of ['h1', 'h2']) bench.work(server.url, host)
  const [folder, backup] = [join(bench.folder, record), join(bench.folder, 'backup')]
  for (const least of [60, 200]) {
    const coordinator = bench.run(record, ['--redis', server.url])
    await committed(least, coordinator)
    coordinator.kill('SIGKILL')
    await coordinator.ended
    if (least === 60) cpSync(folder, backup, { recursive: true })
  }
  rmSync(folder, { recursive: true })
  cpSync(backup, folder, { recursive: true })
  const restored = bench.run(record, ['--redis', server.url])
  await hears(restored, /Continued: /)
  await endsAsOnACalmDay(restored)
})
