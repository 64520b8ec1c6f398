// A Redis, a search that the test itself announces and fills with jobs, and real `skerry work` processes. No
// coordinator: the test sees every answer, every job and every process.

import { type ChildProcess, spawn } from 'node:child_process'
import { createHash } from 'node:crypto'
import { mkdtempSync, readdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import type { Answer, Job } from '../../shared/cluster/codec.js'
import {
  type Announcement,
  type Heartbeat,
  type LossMessage,
  protocolVersion,
} from '../../shared/cluster/messages.js'
import { clusterTimes } from '../../shared/cluster/times.js'
import { genomeBytes } from '../../shared/encodings.js'
import type { WorkItem } from '../../shared/result.js'
import { emittedRoot } from '../../worker/entry.js'
import { bundlePlugin } from '../../worker/plugin/bundle.js'
import { parseAddress, RedisCoordinatorQueue } from '../../worker/redis/index.js'
import { pause, RedisServer } from '../tools/redis-server.js'

const instance = 'instance-1'
const record = 'record-1'
const program = join(emittedRoot, 'coordinator', 'cli', 'skerry.js')
const genome = { x: { kind: 'real', length: 1, low: 0, high: 100, scale: 'linear' } } as const

/** x up to 90: that many square roots, times 100,000; above: never ends; 100: ends its process. */
const problem = `import { defineProblem, real } from 'skerry'
export default defineProblem({
  name: 'probe', version: '1', summary: 'Takes as long as it is told.',
  genome: { x: real({ low: 0, high: 100 }) },
  objectives: { value: { direction: 'maximise', unit: '1' } },
  drawCondition: () => 0,
  simulate: ({ x: [x] }, situations) => situations.map(() => {
    let waste = 0
    for (let i = 0; x > 90 || i < 1e5 * x; i++) waste += Math.sqrt(i)
    return { objectives: { value: x + 0 * waste } }
  }),
})
`
let bundled: Promise<Uint8Array> | undefined
/** The problem as agents get it, bundled once. */
function bundle(): Promise<Uint8Array> {
  bundled ??= (async () => {
    const folder = mkdtempSync(join(tmpdir(), 'skerry-problem-'))
    writeFileSync(join(folder, 'problem.js'), problem)
    const { code } = await bundlePlugin(join(folder, 'problem.js'))
    rmSync(folder, { recursive: true })
    return new TextEncoder().encode(code)
  })()
  return bundled
}

/** An x whose simulation never ends. */
export const endless = 95

export class Worker {
  readonly process: ChildProcess
  readonly startedMs = performance.now()
  out = ''
  err = ''
  /** Exit code, or the name of the signal. */
  readonly gone: Promise<number | string>

  constructor(args: readonly string[], env: NodeJS.ProcessEnv) {
    this.process = spawn(process.execPath, [program, 'work', ...args], {
      env: { ...process.env, ...env },
      stdio: ['ignore', 'pipe', 'pipe'],
    })
    this.process.stdout?.on('data', (bytes: Buffer) => {
      this.out += bytes.toString()
    })
    this.process.stderr?.on('data', (bytes: Buffer) => {
      this.err += bytes.toString()
    })
    this.gone = new Promise((resolve) => {
      this.process.once('exit', (code, signal) => resolve(code ?? signal ?? 'unknown'))
    })
  }

  get pid(): number {
    return this.process.pid ?? 0
  }
  kill(signal: NodeJS.Signals): void {
    this.process.kill(signal)
  }
}

export class Site {
  readonly server: RedisServer
  readonly queue: RedisCoordinatorQueue
  readonly folder = mkdtempSync(join(tmpdir(), 'skerry-site-'))
  readonly answers: (Answer & { readonly agent: string; readonly atMs: number })[] = []
  readonly losses: (LossMessage & { readonly atMs: number })[] = []
  readonly workers: Worker[] = []
  announcement: Announcement
  private readonly scale: number
  private readonly bundle: Uint8Array
  private readonly timer: NodeJS.Timeout
  private reading: Promise<void>
  private closed = false
  private numbers = 0

  private constructor(server: RedisServer, queue: RedisCoordinatorQueue, bundle: Uint8Array, scale: number) {
    this.server = server
    this.queue = queue
    this.bundle = bundle
    this.scale = scale
    this.announcement = announcementOf(bundle)
    this.timer = setInterval(() => void this.announce(), clusterTimes(scale).heartbeatMs)
    this.reading = this.read()
  }

  /** `scale` of all time constants, here and in the workers. */
  static async open(scale: number): Promise<Site> {
    const bytes = await bundle()
    const server = await RedisServer.start()
    const queue = new RedisCoordinatorQueue({
      address: parseAddress(server.url),
      prefix: 'skerry',
      search: 'weir',
      times: clusterTimes(scale),
      unprotected: false,
    })
    await queue.open()
    const site = new Site(server, queue, bytes, scale)
    await site.begin()
    return site
  }

  async begin(): Promise<void> {
    await this.queue.begin(instance)
    await this.queue.putPlugin(this.bundle)
    await this.announce()
  }

  /** A worker under this name of a machine. */
  worker(host: string, more: readonly string[] = [], env: NodeJS.ProcessEnv = {}): Worker {
    const args = [
      '--redis',
      this.server.url,
      '--host',
      host,
      '--cores',
      '2',
      '--cache',
      join(this.folder, host),
      ...more,
    ]
    const worker = new Worker(args, { SKERRY_TEST_TIME_SCALE: String(this.scale), ...env })
    this.workers.push(worker)
    return worker
  }

  /** A job with an item for each x. */
  async add(xs: readonly number[]): Promise<number> {
    const dispatch = ++this.numbers
    const items = xs.map(
      (x, index): WorkItem => ({
        island: 1,
        evaluation: dispatch * 100 + index,
        individual: dispatch * 100 + index,
        firstReplicate: 0,
        replicates: 1,
        genome: genomeBytes(genome, { x: Float64Array.of(x) }),
        expectedCost: 1,
        attempt: 1,
        purpose: 'evaluate',
        isolation: 'shared',
        avoid: [],
      }),
    )
    const header: Job['header'] = {
      protocol: protocolVersion,
      search: 'weir',
      record,
      instance,
      dispatch,
      purpose: 'evaluate',
      isolation: 'shared',
      avoid: [],
      avoidHosts: [],
    }
    await this.queue.add([{ job: { header, items }, urgent: false }])
    return dispatch
  }

  async agents(): Promise<Heartbeat[]> {
    return this.queue.agents()
  }

  async stateOf(dispatch: number): Promise<string> {
    return (await this.queue.states([{ dispatch }]))[0] ?? 'unknown'
  }

  async close(): Promise<void> {
    this.closed = true
    clearInterval(this.timer)
    for (const worker of this.workers) {
      worker.kill('SIGCONT')
      worker.kill('SIGKILL')
    }
    await Promise.all(this.workers.map(({ gone }) => gone))
    await this.reading
    await this.queue.close()
    await this.server.close()
    rmSync(this.folder, { recursive: true, force: true })
  }

  private async announce(): Promise<void> {
    this.announcement = { ...this.announcement, beat: this.announcement.beat + 1 }
    // A test that takes Redis away goes on announcing when it is back.
    await this.queue.announce(this.announcement).catch(() => undefined)
  }

  private async read(): Promise<void> {
    while (!this.closed) {
      try {
        const deliveries = await this.queue.deliveries(100)
        const atMs = performance.now()
        for (const { answers } of deliveries) {
          if (answers === undefined) continue
          this.answers.push(...answers.answers.map((one) => ({ ...one, agent: answers.header.agent, atMs })))
          this.losses.push(...answers.losses.map((one) => ({ ...one, atMs })))
        }
        await this.queue.acknowledge(deliveries.map(({ receipt }) => receipt))
      } catch {
        await pause(50)
      }
    }
  }
}

function announcementOf(bundle: Uint8Array): Announcement {
  return {
    protocol: protocolVersion,
    search: 'weir',
    record,
    holder: 1,
    instance,
    beat: 0,
    pluginDigest: createHash('sha256').update(bundle).digest('hex'),
    pluginBytes: bundle.length,
    seed: 1,
    sharedConditions: true,
    exactness: 'bits',
    needs: { cores: 1, memoryMB: 256, tokens: {} },
    tokens: {},
    share: 1,
    shutOut: [],
    draining: [],
    waiting: false,
    skerry: '0.0.0',
  }
}

/** Resolves when it holds; fails with `what` after so long. */
export async function until(
  what: string,
  holds: () => boolean | Promise<boolean>,
  ms = 30_000,
): Promise<void> {
  const endMs = performance.now() + ms
  while (!(await holds())) {
    if (performance.now() > endMs) throw new Error(`not within ${ms} ms: ${what}`)
    await pause(10)
  }
}

/** Processes whose parents lead to this one. */
export function descendants(pid: number): number[] {
  const parents = new Map<number, number>()
  for (const name of readdirSync('/proc')) {
    if (!/^\d+$/.test(name)) continue
    try {
      // pid (name) state parent: a name may hold anything, also brackets.
      const stat = readFileSync(`/proc/${name}/stat`, 'latin1')
      parents.set(Number(name), Number(stat.slice(stat.lastIndexOf(')') + 4).split(' ')[0]))
    } catch {
      // Gone meanwhile.
    }
  }
  const leads = (one: number): boolean => {
    const parent = parents.get(one)
    return parent === pid || (parent !== undefined && parent > 1 && leads(parent))
  }
  return [...parents.keys()].filter(leads)
}

export function isAlive(pid: number): boolean {
  try {
    return !/^\d+ \(.*\) [ZX]/.test(readFileSync(`/proc/${pid}/stat`, 'latin1'))
  } catch {
    return false
  }
}
