// Real processes of the program for tests that kill, stop and starve them.

import { type ChildProcess, spawn } from 'node:child_process'
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { emittedRoot } from '../../worker/entry.js'

export const program = join(emittedRoot, 'coordinator', 'cli', 'skerry.js')

export interface Ending {
  readonly code: number | null
  readonly signal: NodeJS.Signals | null
  readonly out: string
  readonly err: string
}

export class Life {
  readonly process: ChildProcess
  readonly ended: Promise<Ending>
  out = ''
  err = ''

  constructor(command: string, words: readonly string[], cwd: string, env: NodeJS.ProcessEnv) {
    this.process = spawn(command, words, {
      cwd,
      stdio: ['ignore', 'pipe', 'pipe'],
      env: { ...process.env, SKERRY_REDIS: '', ...env },
    })
    this.process.stdout?.on('data', (bytes: Buffer) => {
      this.out += bytes.toString()
    })
    this.process.stderr?.on('data', (bytes: Buffer) => {
      this.err += bytes.toString()
    })
    this.ended = new Promise((resolve) => {
      this.process.once('close', (code, signal) => resolve({ code, signal, out: this.out, err: this.err }))
    })
  }

  get pid(): number {
    return this.process.pid ?? 0
  }
  get isOver(): boolean {
    return this.process.exitCode !== null || this.process.signalCode !== null
  }
  said(): string {
    return this.out + this.err
  }
  kill(signal: NodeJS.Signals): void {
    this.process.kill(signal)
  }
}

/** A folder, and the processes that run in it; close() ends all of them. */
export class Bench {
  readonly folder = mkdtempSync(join(tmpdir(), 'skerry-chaos-'))
  private readonly env: NodeJS.ProcessEnv
  private readonly lives = new Set<Life>()

  constructor(scale: number) {
    this.env = { SKERRY_TEST_TIME_SCALE: String(scale) }
  }

  write(name: string, text: string): void {
    writeFileSync(join(this.folder, name), text)
  }

  /** `skerry WORDS`. */
  start(words: readonly string[], env: NodeJS.ProcessEnv = {}): Life {
    return this.startCommand(process.execPath, [program, ...words], env)
  }

  startCommand(command: string, words: readonly string[], env: NodeJS.ProcessEnv = {}): Life {
    const life = new Life(command, words, this.folder, { ...this.env, ...env })
    this.lives.add(life)
    void life.ended.then(() => this.lives.delete(life))
    return life
  }

  work(url: string, host: string, more: readonly string[] = [], env: NodeJS.ProcessEnv = {}): Life {
    const cache = join(this.folder, `cache-${host}`)
    const words = ['work', '--redis', url, '--host', host, '--cores', '1', '--cache', cache, ...more]
    return this.start(words, env)
  }

  run(record: string, more: readonly string[] = [], env: NodeJS.ProcessEnv = {}): Life {
    return this.start(['run', 'search.yaml', '--json', '--record', record, ...more], env)
  }

  /** Simulations that are committed, as the coordinator of this record last showed. */
  committed(record: string): number {
    try {
      const text = readFileSync(join(this.folder, record, 'progress.json'), 'utf8')
      return Number((JSON.parse(text) as { simulations?: number }).simulations ?? 0)
    } catch {
      return 0
    }
  }

  async close(): Promise<void> {
    const all = [...this.lives]
    for (const life of all) {
      life.kill('SIGCONT')
      life.kill('SIGKILL')
    }
    await Promise.all(all.map(({ ended }) => ended))
    rmSync(this.folder, { recursive: true, force: true })
  }
}

export interface Report {
  readonly digest: string
  readonly committed: number
  readonly simulations: number
  readonly purity: unknown
  readonly best: unknown
}

/** The last word of `skerry run --json`. */
export function reportOf(out: string): Report {
  const { digest, committed, simulations, purity, best } = JSON.parse(out) as Report & {
    readonly best: { readonly confirmedBy?: string }
  }
  // Who confirmed it is a fact of the fleet, not of the search.
  const { confirmedBy: _, ...itself } = best
  return { digest, committed, simulations, purity, best: itself }
}

/** Resolves when the process has said that; throws with all it said when it ends before. */
export async function hears(life: Life, what: RegExp, seconds = 120): Promise<void> {
  const endMs = performance.now() + seconds * 1000
  while (!what.test(life.said())) {
    if (life.isOver) throw new Error(`it ended without saying ${what}:\n${life.said()}`)
    if (performance.now() > endMs) throw new Error(`it did not say ${what} in ${seconds} s:\n${life.said()}`)
    await new Promise((resolve) => setTimeout(resolve, 20))
  }
}

/** Simulations that wait more than they compute, so that many workers share few cores as on machines of their own. */
export const waitingProblem = (msPerSize: number) => `import { defineProblem, integer, real } from 'skerry'
export default defineProblem({
  name: 'waiting-sphere', version: '1', summary: 'A noisy sphere that takes a while.',
  genome: { x: real({ length: 4, low: -1, high: 1 }), size: integer({ length: 1, low: 1, high: 6 }) },
  objectives: { error: { direction: 'minimise', unit: '1' } },
  drawCondition: (stream) => stream.normal(),
  expectedCost: ({ size }) => size[0],
  simulate: ({ x, size }, situations) => situations.map(({ condition }) => {
    Atomics.wait(new Int32Array(new SharedArrayBuffer(4)), 0, 0, ${msPerSize} * size[0])
    const squares = x.reduce((sum, one) => sum + one * one, 0)
    return { objectives: { error: squares + 0.05 * condition } }
  }),
})
`

export const searchOf = (simulations: number, name = 'weir') => `name: ${name}
problem: ./problem.js
seed: 77
budget: { simulations: ${simulations} }
replicates: { first: 2, topUp: 2, most: 6 }
islands:
  - { count: 2, method: steady-state, population: 20, lookahead: 16 }
  - { count: 1, method: nsga-ii, population: 12, lookahead: 12, order: cost }
migration: { every: 20 rounds, emigrants: 2, topology: two-way-ring, lag: 1 }
`
