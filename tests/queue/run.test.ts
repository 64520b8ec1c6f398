// Whole processes: `skerry run --redis` with `skerry work` beside it gives the digest that one machine gives, and goes
// on giving it when worker, Redis and coordinator are killed in the middle. The numbers in brackets are rows of the
// fault table (DEVELOPERS.md).

import { type ChildProcess, spawn } from 'node:child_process'
import { existsSync, mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterAll, afterEach, beforeAll, expect, test } from 'vitest'
import { emittedRoot } from '../../worker/entry.js'
import { freePort, pause, RedisServer } from '../tools/redis-server.js'

const program = join(emittedRoot, 'coordinator', 'cli', 'skerry.js')

const problem = `import { defineProblem, integer, real } from 'skerry'
export default defineProblem({
  name: 'busy-sphere', version: '1', summary: 'A noisy sphere that takes a millisecond or so.',
  genome: { x: real({ length: 4, low: -1, high: 1 }), size: integer({ length: 1, low: 1, high: 6 }) },
  objectives: { error: { direction: 'minimise', unit: '1' } },
  drawCondition: (stream) => stream.normal(),
  expectedCost: ({ size }) => size[0],
  simulate: ({ x, size }, situations) => situations.map(({ condition }) => {
    let waste = 0
    for (let i = 0; i < size[0] * 60000; i++) waste += Math.sqrt(i)
    const squares = x.reduce((sum, one) => sum + one * one, 0)
    return { objectives: { error: squares + 0.05 * condition + 0 * waste } }
  }),
})
`
const searchOf = (simulations: number, name = 'pump') => `name: ${name}
problem: ./problem.js
seed: 77
budget: { simulations: ${simulations} }
replicates: { first: 2, topUp: 2, most: 6 }
islands:
  - { count: 2, method: steady-state, population: 20, lookahead: 10 }
  - { count: 1, method: nsga-ii, population: 12, lookahead: 12, order: cost }
migration: { every: 40 rounds, emigrants: 2, topology: two-way-ring, lag: 1 }
control: { kind: drift }
`

const folder = mkdtempSync(join(tmpdir(), 'skerry-run-'))
const running: ChildProcess[] = []
let server: RedisServer | undefined
let alone: { readonly digest: string; readonly best: string }

interface Life {
  readonly process: ChildProcess
  /** What was said so far, both ways. */
  readonly said: () => string
  readonly ended: Promise<{ readonly code: number | null; readonly out: string; readonly err: string }>
}

function start(words: readonly string[], env: NodeJS.ProcessEnv = {}): Life {
  const child = spawn(process.execPath, [program, ...words], {
    cwd: folder,
    stdio: ['ignore', 'pipe', 'pipe'],
    env: { ...process.env, SKERRY_REDIS: '', SKERRY_TEST_TIME_SCALE: '0.2', ...env },
  })
  running.push(child)
  let [out, err] = ['', '']
  child.stdout.on('data', (bytes: Buffer) => {
    out += bytes.toString()
  })
  child.stderr.on('data', (bytes: Buffer) => {
    err += bytes.toString()
  })
  const ended = new Promise<{ code: number | null; out: string; err: string }>((resolve) => {
    child.once('close', (code) => resolve({ code, out, err }))
  })
  return { process: child, said: () => out + err, ended }
}

const work = (url: string, host: string) =>
  start(['work', '--redis', url, '--cores', '1', '--host', host, '--cache', join(folder, `cache-${host}`)])
const run = (record: string, ...words: string[]) =>
  start(['run', 'search.yaml', '--record', record, ...words])

/** The digest, and what is said of the best and its comparison with chance. */
async function reportOf(life: Life): Promise<{ readonly digest: string; readonly best: string }> {
  const { code, out, err } = await life.ended
  expect(code, err).toBe(0)
  const digest = /Search digest: ([0-9a-f]{64})/.exec(out)?.[1] ?? 'none'
  return { digest, best: out.slice(out.indexOf('Best machine'), out.indexOf('Search digest')) }
}

/** Resolves when the process has said that. */
async function hears(life: Life, what: RegExp): Promise<void> {
  await expect.poll(() => life.said(), { timeout: 60_000, interval: 50 }).toMatch(what)
}

/** Commits that the coordinator last told of, every second. */
function committedIn(record: string): number {
  const path = join(folder, record, 'progress.json')
  if (!existsSync(path)) return 0
  try {
    return (JSON.parse(readFileSync(path, 'utf8')) as { readonly committed: number }).committed
  } catch {
    return 0
  }
}

beforeAll(async () => {
  writeFileSync(join(folder, 'problem.js'), problem)
  writeFileSync(join(folder, 'search.yaml'), searchOf(6000))
  alone = await reportOf(run('records/alone', '--cores', '1'))
})
afterEach(async () => {
  for (const child of running.splice(0)) {
    if (child.exitCode !== null || child.signalCode !== null) continue
    const gone = new Promise((resolve) => child.once('exit', resolve))
    child.kill('SIGKILL')
    await gone
  }
  await server?.close()
  server = undefined
})
afterAll(() => rmSync(folder, { recursive: true, force: true }))

test('two workers over Redis give the digest and the best of one machine, and nothing is left in Redis', async () => {
  server = await RedisServer.start()
  work(server.url, 'h1')
  work(server.url, 'h2')
  const { digest, best } = await reportOf(run('records/two', '--redis', server.url))
  expect(digest).toBe(alone.digest)
  expect(best).toBe(alone.best)
  expect(server.ask('KEYS', 'skerry:s:*:work:*')).toBe('')
  expect(server.ask('HLEN', 'skerry:searches')).toBe('0')
})

test('(1, 16, 20, 29) the same when worker, Redis and coordinator are killed in the middle', async () => {
  server = await RedisServer.start()
  const [first] = [work(server.url, 'h1'), work(server.url, 'h2')]
  const before = run('records/killed', '--redis', server.url)
  // The log says how it stands every ten seconds only; by then a fast machine has finished.
  await expect.poll(() => committedIn('records/killed'), { timeout: 60_000, interval: 20 }).toBeGreaterThan(0)
  first.process.kill('SIGKILL')
  await pause(500)
  server.ask('FLUSHALL')
  await hears(before, /sent again/)
  before.process.kill('SIGKILL')
  await before.ended
  work(server.url, 'h3')
  const after = run('records/killed', '--redis', server.url)
  await hears(after, /Workers are here/)
  await server.kill()
  await pause(1000)
  await server.start()
  const { digest, best } = await reportOf(after)
  expect(digest).toBe(alone.digest)
  expect(best).toBe(alone.best)
})

test('the address may come from the environment, and its password is shown nowhere', async () => {
  server = await RedisServer.start(['--requirepass', 'canary-of-the-pump-house'])
  const url = server.url.replace('//', '//:canary-of-the-pump-house@')
  const worker = start(['work', '--cores', '1', '--cache', join(folder, 'cache-env')], { SKERRY_REDIS: url })
  const coordinator = start(['run', 'search.yaml', '--record', 'records/env', '--stop-after', '300'], {
    SKERRY_REDIS: url,
  })
  const { code, out, err } = await coordinator.ended
  expect(code, err).toBe(0)
  expect(out + err + worker.said()).not.toContain('canary')
})

test('a Redis that is not there, or does not let us in: a clear line, and the exit code for it', async () => {
  server = await RedisServer.start(['--requirepass', 'right'])
  const cases = [
    [`redis://127.0.0.1:${await freePort()}`, 69, 'queue-unreachable'],
    ['redis://no-such-host.invalid', 69, 'queue-unreachable'],
    [server.url.replace('//', '//:wrong@'), 77, 'queue-access'],
    [server.url, 77, 'queue-access'],
    ['http://x', 64, 'usage'],
  ] as const
  const lives = cases.map(([url], i) => run(`records/refused-${i}`, '--json', '--redis', url))
  for (const [i, life] of lives.entries()) {
    const { code, out } = await life.ended
    expect([code, JSON.parse(out).refused.code]).toEqual([cases[i]![1], cases[i]![2]])
  }
})

test('a second search of the same name is refused while the first runs', async () => {
  server = await RedisServer.start()
  const first = run('records/first', '--redis', server.url)
  await hears(first, /No worker is here/)
  const { code, out } = await run('records/second', '--json', '--redis', server.url).ended
  expect(code).toBe(78)
  expect(JSON.parse(out).refused.code).toBe('search-name-taken')
  first.process.kill('SIGTERM')
  expect((await first.ended).code).toBe(75)
  expect(server.ask('HLEN', 'skerry:searches')).toBe('0')
})

test('simulations that hold licences: never more at once on two workers than the site has, and the same digest', async () => {
  const licensed = problem.replace(
    "version: '1',",
    "version: '1', needs: { memoryMB: 200, tokens: { flow: 1 } },",
  )
  writeFileSync(join(folder, 'licensed.js'), licensed)
  const search = searchOf(300).replace('./problem.js', './licensed.js')
  writeFileSync(join(folder, 'licensed.yaml'), `${search}tokens: { flow: 3 }\n`)
  const licensedRun = (record: string, ...words: string[]) =>
    start(['run', 'licensed.yaml', '--record', record, ...words])
  const here = await reportOf(licensedRun('records/licensed-here', '--cores', '2'))
  server = await RedisServer.start()
  const { url } = server
  for (const host of ['h1', 'h2'])
    start(['work', '--redis', url, '--cores', '2', '--host', host, '--cache', join(folder, `cache-${host}`)])
  const life = licensedRun('records/licensed', '--redis', url)
  let [most, isOver] = [0, false]
  void life.ended.then(() => {
    isOver = true
  })
  while (!isOver) {
    // '1 <until>' for each simulation that holds one.
    const held = server
      .ask('HVALS', 'skerry:tokens:flow')
      .split('\n')
      .filter((line) => line !== '')
    most = Math.max(
      most,
      held.reduce((sum, line) => sum + Number.parseInt(line, 10), 0),
    )
    await pause(100)
  }
  expect((await reportOf(life)).digest).toBe(here.digest)
  expect(most).toBe(3)
})
