// One search as this agent serves it: its jobs, the pool that simulates them, the answers on their way. It knows
// nothing of other searches and of whose turn it is (feeder.ts), nor how jobs come (server.ts).
//
//   closed ──open()──▶ opening ──▶ ready ──(idle for a minute)──▶ closed
//                         └──▶ failed (cannot be loaded here; the reason is kept)

import { check } from '../../shared/check.js'
import { type Answer, contentWord } from '../../shared/cluster/codec.js'
import type { Announcement, LossMessage } from '../../shared/cluster/messages.js'
import { limits } from '../../shared/limits.js'
import type { DispatchFact, Executor, WorkItem } from '../../shared/result.js'
import { defaultTimeLimit, Pace } from '../pace.js'
import type { Pool, PoolEvents, PoolOptions } from '../pool.js'
import { Durations } from './durations.js'
import { type HeldJob, type Kind, keyOf, type Pending } from './held.js'
import type { Letter } from './outbox.js'
import type { Demand } from './room.js'

/** A handful of items that begins together and takes room until all have ended. */
export interface Grain {
  readonly lane: SearchLane
  readonly kind: Kind
  readonly demand: Demand
  /** What it was charged with when it began, seconds of one core. */
  readonly chargedSeconds: number
  /** Receipt of the licences it holds. */
  readonly receipt: string | undefined
  readonly begunMs: number
  simulatedSeconds: number
  left: number
}

export interface LaneEvents {
  /** An answer or a loss has to go; false when there is no room to keep it. */
  letter(letter: Letter, isUrgent: boolean): boolean
  ended(grain: Grain): void
  /** The pool can do nothing more. */
  failed(error: Error): void
}

export interface LaneOptions {
  readonly announcement: Announcement
  readonly pluginFile: string
  readonly host: string
  readonly processor: string
  /** Simulations of this search that this machine can run side by side. */
  readonly width: number
  readonly createPool: (options: PoolOptions, events: PoolEvents) => Pool
  readonly nowMs: () => number
}

export type LaneState = 'closed' | 'opening' | 'ready' | 'failed'

/** Simulations shorter than this travel to their threads by the handful. */
const fastSeconds = 0.1
/** How long a handful lasts. */
const grainSeconds = 0.2
const companySeconds = 0.02
/** A process that dies of a signal to our whole group dies before we hear of ours: such a loss waits this long. */
const deathWaitsMs = 300
const kinds: readonly Kind[] = ['confirm', 'alone', 'shared']

export interface LaneCounts {
  simulations: number
  failures: number
  lost: number
}

export class SearchLane {
  readonly options: LaneOptions
  readonly durations = new Durations()
  readonly jobs = new Set<HeldJob>()
  state: LaneState = 'closed'
  /** Of each licence, how many the site has, as announced last. */
  tokens: Announcement['tokens']
  private counts: LaneCounts = { simulations: 0, failures: 0, lost: 0 }
  private readonly events: LaneEvents
  private readonly pace: Pace
  private readonly stash: { readonly [kind in Kind]: Pending[] } = { shared: [], confirm: [], alone: [] }
  /** Items in the pool, with everybody who waits for the same simulation. */
  private readonly running = new Map<string, { readonly grain: Grain; readonly waiting: Pending[] }>()
  private readonly grains = new Set<Grain>()
  private readonly deaths = new Set<NodeJS.Timeout>()
  private pool: Pool | undefined
  private usedMs: number
  /** Expected costs of all that is stashed: adding them up anew for each job would cost more than some simulations. */
  private stashCost = 0
  private lastExecutor: { readonly from: Executor; readonly executor: Executor } | undefined

  constructor(options: LaneOptions, events: LaneEvents) {
    this.options = options
    this.events = events
    this.tokens = options.announcement.tokens
    this.pace = new Pace(defaultTimeLimit, options.announcement.secondsPerCost)
    this.usedMs = options.nowMs()
  }

  get search(): string {
    return this.options.announcement.search
  }
  get isBusy(): boolean {
    return this.running.size > 0
  }
  get stashed(): number {
    return kinds.reduce((sum, kind) => sum + this.stash[kind].length, 0)
  }
  /** Milliseconds since it last had something to do. */
  get idleMs(): number {
    return this.jobs.size > 0 ? 0 : this.options.nowMs() - this.usedMs
  }

  /** Starts the pool. Resolves to false, and `failed` has been called, when the problem cannot be loaded here. */
  async open(): Promise<boolean> {
    check(this.state === 'closed', 'a lane is opened when it is closed')
    const { announcement, pluginFile, width, host, createPool } = this.options
    const { seed, sharedConditions, needs, secondsPerCost } = announcement
    this.state = 'opening'
    this.usedMs = this.options.nowMs()
    const pool = createPool(
      {
        pluginFile,
        seed,
        sharedConditions,
        host,
        threads: Math.min(width, limits.threadsMost),
        megabytes: needs.memoryMB,
        ...(secondsPerCost === undefined ? {} : { secondsPerCost }),
      },
      {
        fact: (fact) => this.hear(fact),
        failed: (error) => this.fail(error, pool),
      },
    )
    this.pool = pool
    try {
      await pool.start()
    } catch (error) {
      this.fail(error instanceof Error ? error : new Error(String(error)), pool)
      return false
    }
    // It may have been closed meanwhile.
    if (this.pool === pool && this.state === 'opening') this.state = 'ready'
    return this.state === 'ready'
  }

  accept(job: HeldJob): void {
    this.jobs.add(job)
    this.usedMs = this.options.nowMs()
    const pending = job.pending()
    this.stash[job.kind].push(...pending)
    this.stashCost += costOf(pending)
  }

  /** Seconds of one core that the stash should last; undefined as long as nobody knows. */
  stashSeconds(): number | undefined {
    const [any] = kinds.flatMap((kind) => this.stash[kind].slice(0, 1))
    if (any === undefined) return 0
    return this.pace.expectedSeconds({ ...any.item, expectedCost: this.stashCost, replicates: 1 })
  }

  /** True when its simulations are so short that it should always have some ahead. */
  get isFast(): boolean {
    return this.pace.usualBatchLength() > 1 && this.grainable
  }

  /** What the next grain needs; undefined when nothing can begin. */
  next(): { readonly kind: Kind; readonly demand: Demand; readonly items: number } | undefined {
    for (const kind of kinds) {
      const [first] = this.stash[kind]
      if (first === undefined || this.isFull(kind) || this.waitsForCompany(kind)) continue
      const items = this.grainLength(kind)
      const { cores, memoryMB } = this.options.announcement.needs
      // Two short grains share a place, so that the next waits where its thread is when one ends.
      const part = this.isShort(first.item) && this.grainable ? 0.5 : 1
      return { kind, items, demand: { cores: part * cores, memoryMB: part * memoryMB } }
    }
    return undefined
  }

  /** Seconds that the longest of the next grain may take; undefined when nobody knows. */
  nextSeconds(): number | undefined {
    const next = this.next()
    const first = next && this.stash[next.kind][0]
    if (first === undefined) return undefined
    const expected = this.pace.expectedSeconds(first.item)
    const p95 = this.durations.p95Seconds()
    if (expected === undefined) return p95
    return Math.max(expected, Math.min(p95 ?? 0, 4 * expected))
  }

  /** Begins the next grain; `receipt` of the licences it holds, if any. */
  begin(receipt: string | undefined): Grain {
    const next = this.next()
    check(next !== undefined && this.pool !== undefined && this.state === 'ready', 'a grain can begin')
    const pending = this.stash[next.kind].splice(0, next.items)
    this.stashCost -= costOf(pending)
    const { cores } = this.options.announcement.needs
    const expected = pending.reduce((sum, { item }) => sum + (this.pace.expectedSeconds(item) ?? 1), 0)
    const grain: Grain = {
      lane: this,
      kind: next.kind,
      demand: next.demand,
      chargedSeconds: expected * cores,
      receipt,
      begunMs: this.options.nowMs(),
      simulatedSeconds: 0,
      left: 0,
    }
    const items: WorkItem[] = []
    for (const one of pending) {
      const key = keyOf(one.item)
      const same = this.running.get(key)
      if (same !== undefined) {
        same.waiting.push(one)
        continue
      }
      this.running.set(key, { grain, waiting: [one] })
      items.push(one.item)
    }
    grain.left = items.length
    this.grains.add(grain)
    if (items.length === 0) queueMicrotask(() => this.endIfOver(grain))
    else this.pool.submit(items)
    return grain
  }

  /**
   * Gives up everything that is not answered and ends the pool. What comes back: jobs that nobody has touched, and
   * losses of those that are partly answered.
   */
  abandon(): { readonly untouched: HeldJob[]; readonly losses: { job: HeldJob; loss: LossMessage }[] } {
    for (const timer of this.deaths) clearTimeout(timer)
    this.deaths.clear()
    const grains = [...this.grains]
    this.running.clear()
    for (const grain of grains) {
      grain.left = 0
      this.endIfOver(grain)
    }
    void this.close()
    return this.dropped([...this.jobs])
  }

  /** Takes what has not begun out of hand: jobs to be handed back, and losses where part of the job has begun or ended. */
  unstash(): { readonly untouched: HeldJob[]; readonly losses: { job: HeldJob; loss: LossMessage }[] } {
    const begun = new Set([...this.running.values()].flatMap(({ waiting }) => waiting.map(({ job }) => job)))
    const stashed = kinds.flatMap((kind) => this.stash[kind].splice(0))
    this.stashCost = 0
    const untouched = new Set<HeldJob>()
    const losses: { job: HeldJob; loss: LossMessage }[] = []
    for (const { job, index } of stashed) {
      if (job.isUntouched && !begun.has(job)) untouched.add(job)
      else losses.push({ job, loss: this.handedBack(job, index) })
    }
    for (const { job, loss } of losses) job.settle(loss.index)
    for (const job of untouched) this.drop(job)
    return { untouched: [...untouched], losses }
  }

  /** None of its items begins any more; the job stays in hand until its losses are written. */
  forget(job: HeldJob): void {
    const rest = this.stash[job.kind].filter((pending) => pending.job !== job)
    this.stash[job.kind].splice(0, Number.POSITIVE_INFINITY, ...rest)
    this.stashCost = costOf(kinds.flatMap((kind) => this.stash[kind]))
  }

  /** What was counted since the last call. */
  takeCounts(): LaneCounts {
    const { counts } = this
    this.counts = { simulations: 0, failures: 0, lost: 0 }
    return counts
  }

  /** The job is over for us. */
  drop(job: HeldJob): void {
    job.abandoned = true
    this.jobs.delete(job)
    this.usedMs = this.options.nowMs()
  }

  async close(): Promise<void> {
    const { pool } = this
    this.pool = undefined
    if (this.state !== 'failed') this.state = 'closed'
    await pool?.close()
  }

  handedBack(job: HeldJob, index: number): LossMessage {
    const { host, processor } = this.options
    const executor: Executor = { kind: 'thread', worker: `${host}/${process.pid}`, host, processor }
    return { dispatch: job.dispatch, index, cause: 'handed-back', detail: '', executor }
  }

  private dropped(jobs: readonly HeldJob[]) {
    for (const kind of kinds) this.stash[kind].length = 0
    this.stashCost = 0
    const open = jobs.filter(({ left }) => left > 0)
    const untouched = open.filter((job) => job.isUntouched)
    const losses = open
      .filter((job) => !job.isUntouched)
      .flatMap((job) => job.unsettled().map((index) => ({ job, loss: this.handedBack(job, index) })))
    for (const { job, loss } of losses) job.settle(loss.index)
    for (const job of untouched) this.drop(job)
    return { untouched, losses }
  }

  /** Licences are counted a simulation: then nothing travels by the handful. */
  private get grainable(): boolean {
    return Object.keys(this.options.announcement.needs.tokens).length === 0
  }

  private isShort(item: WorkItem): boolean {
    return (this.pace.expectedSeconds(item) ?? Number.POSITIVE_INFINITY) < fastSeconds
  }

  /**
   * Every thread has something and what is here is next to nothing: a message of its own would cost more than it is
   * worth. It goes with what comes, or when a thread runs dry.
   */
  private waitsForCompany(kind: Kind): boolean {
    if (kind !== 'shared' || this.grains.size < this.options.width || !this.isFast) return false
    return (this.stashSeconds() ?? companySeconds) < companySeconds
  }

  /** Confirming and lonely items have one process each. */
  private isFull(kind: Kind): boolean {
    if (kind === 'shared') return false
    const most = kind === 'confirm' ? 2 : 1
    let count = 0
    for (const grain of this.grains) if (grain.kind === kind) count++
    return count >= most
  }

  private grainLength(kind: Kind): number {
    if (kind === 'alone' || !this.grainable) return 1
    let seconds = 0
    let count = 0
    for (const { item } of this.stash[kind]) {
      if (count >= limits.dispatchBatch) break
      const expected = this.pace.expectedSeconds(item)
      if (expected === undefined || expected >= fastSeconds) break
      seconds += expected
      if (count > 0 && seconds > grainSeconds) break
      count++
    }
    return Math.max(1, count)
  }

  private hear(fact: DispatchFact): void {
    if (fact.kind === 'fleet') return
    if (fact.kind === 'lost' && fact.cause !== 'time-limit') this.afterAWhile(() => this.settle(fact))
    else this.settle(fact)
  }

  private settle(fact: Exclude<DispatchFact, { kind: 'fleet' }>): void {
    const key = keyOf(fact.item)
    const entry = this.running.get(key)
    // Of an earlier pool, or of jobs that were given up.
    if (entry === undefined) return
    this.running.delete(key)
    const { grain, waiting } = entry
    const { cores } = this.options.announcement.needs
    if (fact.kind === 'result') {
      const [first] = waiting
      if (first !== undefined) this.pace.note(first.item, fact.wallSeconds)
      this.durations.note(fact.wallSeconds)
      grain.simulatedSeconds += fact.wallSeconds * cores
      const simulations = first?.item.replicates ?? 1
      this.counts.simulations += simulations
      this.counts.failures += fact.result.failures.length
    } else {
      this.counts.lost++
      grain.simulatedSeconds += ((this.options.nowMs() - grain.begunMs) / 1000) * cores
    }
    const executor = this.executorOf(fact.executor)
    for (const one of waiting) this.write(one, fact, executor)
    grain.left--
    this.endIfOver(grain)
  }

  private write(
    { job, index, item }: Pending,
    fact: Exclude<DispatchFact, { kind: 'fleet' }>,
    executor: Executor,
  ): void {
    if (job.abandoned) return
    job.settle(index)
    const isUrgent = job.left === 0
    const { dispatch } = job
    if (fact.kind === 'lost') {
      const { cause, detail } = fact
      this.events.letter({ job, loss: { dispatch, index, cause, detail, executor } }, isUrgent)
      return
    }
    const { result, digest, cpuSeconds, wallSeconds } = fact
    const { island, evaluation, attempt, purpose } = item
    const answer: Answer = {
      dispatch,
      index,
      item: { island, evaluation, attempt, purpose },
      content: contentWord(item),
      result,
      digest,
      executor,
      cpuSeconds,
      wallSeconds,
    }
    if (!this.events.letter({ job, answer }, isUrgent))
      this.events.letter({ job, loss: this.handedBack(job, index) }, isUrgent)
  }

  /** The pool's executor with this machine's class of processor. One object a message of a thread, not one an answer. */
  private executorOf(from: Executor): Executor {
    if (this.lastExecutor?.from !== from) {
      this.lastExecutor = { from, executor: { ...from, processor: this.options.processor } }
    }
    return this.lastExecutor.executor
  }

  private endIfOver(grain: Grain): void {
    if (grain.left > 0 || !this.grains.delete(grain)) return
    this.usedMs = this.options.nowMs()
    this.events.ended(grain)
  }

  private afterAWhile(call: () => void): void {
    const timer = setTimeout(() => {
      this.deaths.delete(timer)
      call()
    }, deathWaitsMs)
    this.deaths.add(timer)
  }

  private fail(error: Error, pool: Pool): void {
    if (this.pool !== pool) return
    this.state = 'failed'
    this.events.failed(error)
  }
}

function costOf(pending: readonly Pending[]): number {
  return pending.reduce((sum, { item }) => sum + item.expectedCost * item.replicates, 0)
}
