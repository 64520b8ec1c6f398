// Promise: kill -9 of the real process at any moment, also while it recovers, loses nothing and counts nothing twice:
// the digest is that of a run nobody disturbed. Sizes: SKERRY_CHAOS_KILLS (default 50; 1000 on request).

import { type ChildProcess, spawn } from 'node:child_process'
import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { dirname, join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { stream } from '../../shared/streams.js'

const kills = Number(process.env.SKERRY_CHAOS_KILLS ?? 50)
const skerry = join(dirname(fileURLToPath(import.meta.url)), '../../dist/coordinator/cli/skerry.js')

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
const search = (simulations: number) => `name: chaos
problem: ./problem.js
seed: 77
budget: { simulations: ${simulations} }
replicates: { first: 2, topUp: 2, most: 6 }
islands:
  - { count: 2, method: steady-state, population: 20, lookahead: 10 }
  - { count: 1, method: generational, population: 16, lookahead: 16 }
  - { count: 1, method: nsga-ii, population: 12, lookahead: 12, order: cost }
migration: { every: 40 rounds, emigrants: 2, topology: two-way-ring, lag: 1 }
control: { kind: drift }
`

/** Grows with the kills, so that most of them hit a search at work. */
const budget = 1_500 + 60 * kills

let folder = ''
beforeAll(() => {
  folder = mkdtempSync(join(tmpdir(), 'skerry-chaos-'))
  mkdirSync(folder, { recursive: true })
  writeFileSync(join(folder, 'problem.js'), problem)
  writeFileSync(join(folder, 'search.yaml'), search(budget))
})
afterAll(() => rmSync(folder, { recursive: true, force: true }))

interface Life {
  readonly code: number | null
  readonly out: string
  readonly err: string
}

/** Seed of the weather of the next starts; undefined for fair weather. */
let weather: string | undefined

function start(...words: string[]): { readonly process: ChildProcess; readonly life: Promise<Life> } {
  const child = spawn(process.execPath, [skerry, ...words], {
    cwd: folder,
    stdio: ['ignore', 'pipe', 'pipe'],
    env: { ...process.env, ...(weather === undefined ? {} : { SKERRY_TEST_WEATHER: weather }) },
  })
  let out = ''
  let err = ''
  child.stdout.on('data', (text) => {
    out += text
  })
  child.stderr.on('data', (text) => {
    err += text
  })
  const life = new Promise<Life>((resolve) => child.on('close', (code) => resolve({ code, out, err })))
  return { process: child, life }
}
const run = (record: string, ...words: string[]) =>
  start('run', 'search.yaml', '--record', record, '--cores', '2', ...words)

interface Report {
  readonly digest: string
  readonly committed: number
  readonly simulations: number
  readonly state: string
}
async function progress(record: string): Promise<Report> {
  const { out, err } = await start('progress', record, '--json').life
  expect(err).toBe('')
  return JSON.parse(out) as Report
}

describe('kill -9 of a running search', () => {
  it(`gives the same digest after ${kills} kills, half of them during recovery`, async () => {
    const calm = await run('calm').life
    expect(calm.code, calm.err).toBe(0)
    const reference = await progress('calm')
    expect(reference.state).toBe('finished')

    const draw = stream(20261201, 'weather')
    let atWork = 0
    let startMs = 600
    for (let kill = 0; kill < kills; kill++) {
      const startedMs = performance.now()
      const { process: child, life } = run('killed')
      // Standard error speaks when the record is open and the journal is being read.
      const working = new Promise<boolean>((resolve) => {
        child.stdout!.once('data', () => resolve(true))
        child.once('close', () => resolve(false))
      })
      const inRecovery = kill % 2 === 1
      if (inRecovery) {
        await sleep(startMs * (0.4 + 0.8 * draw.uniform()))
      } else {
        if (await working) startMs = 0.7 * startMs + 0.3 * (performance.now() - startedMs)
        await sleep(400 * draw.uniform())
      }
      child.kill('SIGKILL')
      const { code, err } = await life
      expect([null, 0], err).toContain(code)
      if (code === null) atWork++
    }
    const last = await run('killed').life
    expect(last.code, last.err).toBe(0)
    const ending = await progress('killed')
    expect(ending).toMatchObject({
      digest: reference.digest,
      committed: reference.committed,
      simulations: reference.simulations,
      state: 'finished',
    })
    expect(atWork).toBeGreaterThan(kills / 2)

    const again = await start('rederive', 'killed', '--resimulate', '20', '--json').life
    expect(again.code, again.err).toBe(0)
    expect(JSON.parse(again.out)).toMatchObject({ digest: reference.digest, resimulated: 20 })
  }, 3_600_000)

  it('gives the same digest on 1, 2 and 7 threads, and stopped at n, 2n, 3n', async () => {
    const small = join(folder, 'small.yaml')
    writeFileSync(small, search(900))
    const digests: string[] = []
    for (const cores of ['1', '2', '7']) {
      const record = `threads-${cores}`
      const { code, err } = await start('run', 'small.yaml', '--record', record, '--cores', cores).life
      expect(code, err).toBe(0)
      digests.push((await progress(record)).digest)
    }
    for (const stop of ['300', '600', '900']) {
      const { code, err } = await start('run', 'small.yaml', '--record', 'steps', '--stop-after', stop).life
      expect(code, err).toBe(0)
    }
    // Results held back by up to a thousand times what the quickest takes, in another order every time.
    for (const seed of ['1', '2', '3']) {
      weather = seed
      const { code, err } = await start('run', 'small.yaml', '--record', `weather-${seed}`).life
      weather = undefined
      expect(code, err).toBe(0)
      digests.push((await progress(`weather-${seed}`)).digest)
    }
    const atOnce = await start('run', 'small.yaml', '--record', 'once', '--stop-after', '600').life
    expect(atOnce.code, atOnce.err).toBe(0)
    digests.push((await progress('steps')).digest)
    expect(new Set(digests).size).toBe(1)
  }, 600_000)

  it('hands back on SIGTERM, leaves within seconds with exit code 75, and goes on', async () => {
    const { process: child, life } = start('run', 'small.yaml', '--record', 'term')
    await new Promise<void>((resolve) => {
      child.stdout!.on('data', (text) => {
        if (/[1-9]\d* of/.test(String(text))) resolve()
      })
      child.once('close', () => resolve())
    })
    const askedMs = performance.now()
    child.kill('SIGTERM')
    const { code, err } = await life
    expect(code, err).toBe(75)
    expect(performance.now() - askedMs).toBeLessThan(15_000)
    expect((await progress('term')).state).toBe('stopped')
    expect((await start('run', 'small.yaml', '--record', 'term').life).code).toBe(0)
    expect((await progress('term')).digest).toBe((await progress('threads-2')).digest)
  }, 600_000)
})

function sleep(ms: number): Promise<void> {
  return new Promise((resolve) => setTimeout(resolve, ms))
}
