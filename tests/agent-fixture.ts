// An agent among doubles: a queue in memory, a pool that simulates by waiting, and time that the test moves
// (vi.useFakeTimers). A test sets only what it is about.

import { createHash } from 'node:crypto'
import { mkdtempSync, rmSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { vi } from 'vitest'
import type { Answer, Answers, Job } from '../shared/cluster/codec.js'
import {
  type Announcement,
  type Heartbeat,
  type LossMessage,
  protocolVersion,
} from '../shared/cluster/messages.js'
import { clusterTimes } from '../shared/cluster/times.js'
import { resultDigest } from '../shared/digests.js'
import { refuse } from '../shared/refusals.js'
import type { DispatchFact, WorkItem } from '../shared/result.js'
import { Agent, type AgentOptions } from '../worker/cluster/agent.js'
import { PluginCache } from '../worker/cluster/plugins.js'
import type { AgentQueue, TakenJob } from '../worker/cluster/port.js'
import { fixedLocation } from '../worker/cluster/server.js'
import type { Pool, PoolEvents, PoolOptions } from '../worker/pool.js'

const code = new TextEncoder().encode('export default 0')
const pluginDigest = createHash('sha256').update(code).digest('hex')

/** Redis, as far as an agent can tell; a test may take it down, freeze it, or let it lie. */
export class MemoryQueue implements AgentQueue {
  readonly announcements = new Map<string, Announcement>()
  readonly waiting = new Map<string, Job[]>()
  readonly active = new Map<string, TakenJob>()
  readonly answers: Answer[] = []
  readonly losses: LossMessage[] = []
  readonly finished: number[] = []
  readonly handedBack: number[] = []
  readonly beats: Heartbeat[] = []
  readonly left: string[] = []
  readonly calls: string[] = []
  /** Tokens of the site in use. */
  readonly tokens = new Map<
    string,
    { readonly tokens: Readonly<Record<string, number>>; expired?: boolean }
  >()
  plugins: Uint8Array = code
  /** 'down' refuses at once, 'frozen' never answers, 'deaf' answers but finds no work. */
  mood: 'well' | 'down' | 'frozen' | 'deaf' = 'well'
  closed = false
  private numbers = 0
  private readonly waits = new Set<() => void>()

  announce(search: string, more: Partial<Announcement> = {}): Announcement {
    const before = this.announcements.get(search)
    const announcement: Announcement = {
      protocol: protocolVersion,
      search,
      record: 'record-1',
      holder: 1,
      instance: 'instance-1',
      beat: (before?.beat ?? 0) + 1,
      pluginDigest,
      pluginBytes: code.length,
      seed: 1,
      sharedConditions: true,
      exactness: 'bits',
      needs: { cores: 1, memoryMB: 100, tokens: {} },
      tokens: {},
      share: 1,
      shutOut: [],
      draining: [],
      waiting: (this.waiting.get(search)?.length ?? 0) > 0,
      skerry: '0.0.0',
      ...before,
      ...more,
    }
    this.announcements.set(search, { ...announcement, beat: (before?.beat ?? 0) + 1 })
    return announcement
  }

  /** Adds a job; an item's expected cost is what the double's pool takes in milliseconds. */
  add(search: string, costsMs: readonly number[], header: Partial<Job['header']> = {}): number {
    const dispatch = header.dispatch ?? ++this.numbers
    const { record, instance } = this.announcements.get(search) ?? this.announce(search)
    const items = costsMs.map((cost, index): WorkItem => itemOf(dispatch * 1000 + index, cost, header))
    const job: Job = {
      header: {
        protocol: protocolVersion,
        search,
        record,
        instance,
        dispatch,
        purpose: 'evaluate',
        isolation: 'shared',
        avoid: [],
        avoidHosts: [],
        ...header,
      },
      items,
    }
    this.waiting.set(search, [...(this.waiting.get(search) ?? []), job])
    for (const wake of this.waits) wake()
    return dispatch
  }

  get connected(): boolean {
    return this.mood !== 'down'
  }
  async open(): Promise<void> {
    await this.call('open')
  }
  async searches(): Promise<Announcement[]> {
    await this.call('searches')
    return [...this.announcements.values()]
  }
  async plugin(): Promise<Uint8Array | undefined> {
    await this.call('plugin')
    return this.plugins
  }
  async take(search: string): Promise<TakenJob | undefined> {
    await this.call(`take ${search}`)
    const job = this.mood === 'deaf' ? undefined : this.waiting.get(search)?.shift()
    if (job === undefined) return undefined
    const taken = { job, id: `d${job.header.dispatch}`, token: String(Math.random()), queue: 'work' }
    this.active.set(taken.id, taken)
    return taken
  }
  waitForWork(_: readonly string[], waitMs: number): Promise<boolean> {
    return new Promise((resolve) => {
      const done = (isSign: boolean) => {
        clearTimeout(timer)
        this.waits.delete(wake)
        resolve(isSign)
      }
      const wake = () => done(true)
      const timer = setTimeout(() => done(false), waitMs)
      this.waits.add(wake)
    })
  }
  async renew(jobs: readonly TakenJob[]): Promise<readonly TakenJob[]> {
    await this.call('renew')
    return jobs.filter(({ id }) => !this.active.has(id))
  }
  async answer(_: string, { answers, losses }: Answers): Promise<void> {
    await this.call('answer')
    this.answers.push(...answers)
    this.losses.push(...losses)
  }
  async finish({ id, job }: TakenJob): Promise<void> {
    await this.call('finish')
    this.active.delete(id)
    this.finished.push(job.header.dispatch)
  }
  async handBack({ id, job }: TakenJob): Promise<void> {
    await this.call('handBack')
    this.active.delete(id)
    this.handedBack.push(job.header.dispatch)
    this.waiting.get(job.header.search)?.unshift(job)
    for (const wake of this.waits) wake()
  }
  async beat(heartbeat: Heartbeat): Promise<void> {
    await this.call('beat')
    this.beats.push(heartbeat)
  }
  async takeTokens(
    tokens: Readonly<Record<string, number>>,
    limits: Readonly<Record<string, number>>,
  ): Promise<string | undefined> {
    await this.call('takeTokens')
    for (const [name, count] of Object.entries(tokens)) {
      const used = [...this.tokens.values()].reduce((sum, one) => sum + (one.tokens[name] ?? 0), 0)
      if (used + count > (limits[name] ?? 0)) return undefined
    }
    const receipt = `r${++this.numbers}`
    this.tokens.set(receipt, { tokens })
    return receipt
  }
  async renewTokens(receipt: string): Promise<boolean> {
    await this.call('renewTokens')
    return this.tokens.has(receipt)
  }
  async returnTokens(receipt: string): Promise<void> {
    await this.call('returnTokens')
    this.tokens.delete(receipt)
  }
  async leave(agent: string): Promise<void> {
    await this.call('leave')
    this.left.push(agent)
  }
  async close(): Promise<void> {
    this.closed = true
  }

  private async call(name: string): Promise<void> {
    this.calls.push(name)
    if (this.mood === 'down') throw refuse('queue-unreachable', { detail: 'nothing listens there' })
    if (this.mood === 'frozen') await new Promise(() => undefined)
  }
}

export function itemOf(
  number: number,
  costMs: number,
  more: Partial<Pick<WorkItem, 'purpose' | 'isolation'>>,
): WorkItem {
  return {
    island: 1,
    evaluation: number,
    individual: number,
    firstReplicate: 0,
    replicates: 1,
    genome: new Uint8Array(4),
    expectedCost: costMs,
    attempt: 1,
    purpose: more.purpose ?? 'evaluate',
    isolation: more.isolation ?? 'shared',
    avoid: [],
  }
}

/** Simulates by waiting: an item of expected cost 250 takes 250 ms on one of its threads. */
export class WaitingPool implements Pool {
  static made: WaitingPool[] = []
  readonly options: PoolOptions
  readonly seen: WorkItem[] = []
  running = 0
  closed = false
  private readonly queue: WorkItem[] = []
  private readonly events: PoolEvents
  private readonly startFault: Error | undefined

  constructor(options: PoolOptions, events: PoolEvents, startFault?: Error) {
    this.options = options
    this.events = events
    this.startFault = startFault
    WaitingPool.made.push(this)
  }
  async start(): Promise<void> {
    await pause(100)
    if (this.startFault !== undefined) throw this.startFault
  }
  submit(items: readonly WorkItem[]): void {
    this.queue.push(...items)
    this.seen.push(...items)
    this.next()
  }
  status() {
    const outstanding = this.queue.length + this.running
    return { slots: this.options.threads, outstanding, wanted: 0, queued: outstanding, secondsEach: 0 }
  }
  async close(): Promise<void> {
    this.closed = true
    this.queue.length = 0
  }
  lose(item: WorkItem, cause: 'died' | 'time-limit'): void {
    const { island, evaluation, attempt, purpose, isolation } = item
    const executor = { kind: 'thread', worker: 'w', host: 'h' } as const
    this.events.fact({
      kind: 'lost',
      item: { island, evaluation, attempt, purpose, isolation },
      cause,
      detail: 'x',
      executor,
    })
  }
  fail(error: Error): void {
    this.events.failed(error)
  }

  private next(): void {
    while (this.running < this.options.threads) {
      const item = this.queue.shift()
      if (item === undefined) return
      this.running++
      setTimeout(() => {
        this.running--
        if (this.closed) return
        this.events.fact(factOf(item))
        this.next()
      }, item.expectedCost)
    }
  }
}

function factOf(item: WorkItem): DispatchFact {
  const { island, evaluation, attempt, purpose } = item
  const result = { values: Float64Array.of(evaluation), failures: [] }
  const wallSeconds = item.expectedCost / 1000
  return {
    kind: 'result',
    item: { island, evaluation, attempt, purpose },
    result,
    digest: resultDigest(result),
    executor: { kind: 'thread', worker: 'host-a/1/t1', host: 'host-a' },
    cpuSeconds: wallSeconds,
    wallSeconds,
  }
}

const pause = (ms: number) =>
  new Promise((resolve) => {
    setTimeout(resolve, ms)
  })

export interface Scene {
  readonly queue: MemoryQueue
  readonly agent: Agent
  readonly said: string[]
  readonly states: string[]
  /** Set when the agent has ended. */
  end: { readonly exitCode: number; readonly sentence: string } | { readonly fault: unknown } | undefined
  readonly stop: () => void
  /** Moves time on, announcing all searches anew as coordinators do. */
  readonly pass: (ms: number) => Promise<void>
  readonly isSilent: { coordinator: boolean }
}

const root = mkdtempSync(join(tmpdir(), 'skerry-agent-'))
process.on('exit', () => rmSync(root, { recursive: true, force: true }))

/** An agent at work on two cores; time stands still unless passed. */
export function scene(more: Partial<AgentOptions> = {}, queue = new MemoryQueue()): Scene {
  const stopping = new AbortController()
  const said: string[] = []
  const states: string[] = []
  const times = clusterTimes()
  const agent = new Agent({
    location: fixedLocation('redis://queue'),
    createQueue: () => queue,
    createPool: (options, events) => new WaitingPool(options, events),
    cache: new PluginCache({ folder: root }),
    agent: 'host-a-1-abcd',
    host: 'host-a',
    processor: 'x64 test 1/1',
    cores: 2,
    memoryMB: 10_000,
    times,
    skerry: '0.0.0',
    patienceMs: times.leaseMs,
    nowMs: () => performance.now(),
    say: (sentence) => said.push(sentence),
    stateChanged: (state) => states.push(state),
    signal: stopping.signal,
    ...more,
  })
  const isSilent = { coordinator: false }
  const made: Scene = {
    queue,
    agent,
    said,
    states,
    end: undefined,
    stop: () => stopping.abort(),
    isSilent,
    pass: async (ms) => {
      for (let left = ms; left > 0; left -= 500) {
        if (!isSilent.coordinator)
          for (const search of queue.announcements.keys())
            queue.announce(search, { waiting: (queue.waiting.get(search)?.length ?? 0) > 0 })
        await vi.advanceTimersByTimeAsync(Math.min(left, 500))
      }
    },
  }
  agent.run().then(
    (end) => {
      made.end = end
    },
    (fault: unknown) => {
      made.end = { fault }
    },
  )
  return made
}
