// The simulating threads and processes of this machine: takes items, answers each with a result or a loss.
//
//   shared items   batches to threads, a message about 75 ms long, at most two messages a thread ahead
//   alone          one child process, fresh for each item
//   confirm        one child process, fresh after 500 items: never whoever computed the first result
//
// A thread that dies or hangs is replaced; the item it was running is answered `lost`, the others of its batches run
// elsewhere. When a thread's memory outside the JavaScript heap (typed arrays, wasm) grows beyond all limits, nobody
// can tell from outside whose it is: the running items of all threads then move to processes, where it can be told.
//
// A native crash takes the whole process along, threads and pool; that is what `alone` is for.

import { hostname, totalmem } from 'node:os'
import { BrokenPromise, check } from '../shared/check.js'
import { limits } from '../shared/limits.js'
import { refuse } from '../shared/refusals.js'
import type { DispatchFact, Executor, WorkItem } from '../shared/result.js'
import { ProcessLane } from './lane-process.js'
import { type Loss, ThreadLane } from './lane-thread.js'
import { defaultTimeLimit, Pace, type TimeLimit } from './pace.js'
import type { Simulated, SimulatorSettings } from './wire.js'

export interface PoolOptions extends SimulatorSettings {
  readonly threads: number
  /** What one simulation may hold; 1024 unless said. */
  readonly megabytes?: number
  /** Wall-time backstop. */
  readonly timeLimit?: Partial<TimeLimit>
  /** Wall seconds of one replicate at expected cost 1, where known. */
  readonly secondsPerCost?: number
  /** Items a confirming process may simulate before a fresh one takes over; 500 unless said. */
  readonly confirmationsPerProcess?: number
  /** This machine's name unless said. */
  readonly host?: string
}

export interface PoolStatus {
  readonly slots: number
  readonly outstanding: number
  readonly wanted: number
}

export interface PoolEvents {
  /** Something was answered; called often, must be quick. */
  fact(fact: DispatchFact): void
  /** The pool can do nothing more: a Refusal ('no-workers') or a broken promise. */
  failed(error: Error): void
}

export interface Pool {
  /** Refuses with 'no-workers' when no thread can load the bundle. */
  start(): Promise<void>
  submit(items: readonly WorkItem[]): void
  status(): PoolStatus
  /** Ends all threads and processes, hung ones as well, within about three seconds. */
  close(): Promise<void>
}

const tickSeconds = 0.1
const closeSeconds = 3
/** Threads in a row that could not load the bundle. */
const failedStartsMost = 3

export function createPool(options: PoolOptions, events: PoolEvents): Pool {
  return new MachinePool(options, events)
}

class MachinePool implements Pool {
  private readonly options: PoolOptions
  private readonly events: PoolEvents
  private readonly settings: SimulatorSettings
  private readonly host: string
  private readonly megabytes: number
  private readonly pace: Pace
  private readonly lanes = new Set<ThreadLane>()
  private readonly alone: ProcessLane
  private readonly confirming: ProcessLane
  private readonly memoryGuard: MemoryGuard
  private readonly suspects = new Set<WorkItem>()
  private queue = new WorkQueue()
  private sharedOutstanding = 0
  private threadsMade = 0
  private failedStarts = 0
  private lastTick = 0
  private timer: NodeJS.Timeout | undefined
  private closed = false
  private hasFailed = false
  private started: { resolve(): void; reject(error: Error): void } | undefined

  constructor(options: PoolOptions, events: PoolEvents) {
    check(
      options.threads >= 1 && options.threads <= limits.threadsMost,
      'a pool has a sensible number of threads',
    )
    this.options = options
    this.events = events
    const { pluginFile, seed, sharedConditions } = options
    this.settings = { pluginFile, seed, sharedConditions }
    this.host = options.host ?? hostname()
    this.megabytes = options.megabytes ?? 1024
    this.pace = new Pace({ ...defaultTimeLimit, ...options.timeLimit }, options.secondsPerCost)
    this.memoryGuard = new MemoryGuard(options.threads * this.megabytes * 2 ** 20)
    this.alone = this.processLane(1)
    this.confirming = this.processLane(options.confirmationsPerProcess ?? 500)
  }

  start(): Promise<void> {
    check(this.timer === undefined && !this.closed, 'a pool is started once')
    this.lastTick = performance.now()
    this.timer = setInterval(() => this.tick(), tickSeconds * 1000)
    return new Promise((resolve, reject) => {
      this.started = { resolve, reject }
      for (let i = 0; i < this.options.threads; i++) this.addThread()
    })
  }

  submit(items: readonly WorkItem[]): void {
    check(!this.closed, 'a closed pool takes no work')
    for (const item of items) {
      if (item.isolation === 'alone') this.alone.add(item)
      else if (item.purpose === 'confirm') this.confirming.add(item)
      else {
        this.sharedOutstanding++
        this.queue.push(item)
      }
    }
    this.feed()
  }

  status(): PoolStatus {
    const slots = this.options.threads
    const outstanding = this.sharedOutstanding + this.alone.load + this.confirming.load
    const depth = 2 * slots * this.pace.usualBatchLength()
    return { slots, outstanding, wanted: Math.max(0, depth - this.sharedOutstanding) }
  }

  async close(): Promise<void> {
    this.closed = true
    clearInterval(this.timer)
    this.queue = new WorkQueue()
    const ends = [...[...this.lanes].map((lane) => lane.stop()), this.alone.stop(), this.confirming.stop()]
    let bound: NodeJS.Timeout | undefined
    const waited = new Promise<void>((resolve) => {
      bound = setTimeout(resolve, closeSeconds * 1000)
    })
    await Promise.race([Promise.all(ends), waited])
    clearTimeout(bound)
  }

  // ------------------------------------------------------------------------------------- threads

  private addThread(): void {
    const worker = `${this.host}/${process.pid}/t${++this.threadsMade}`
    const executor: Executor = { kind: 'thread', worker, host: this.host }
    this.lanes.add(
      new ThreadLane(executor, this.settings, this.megabytes, {
        ready: () => this.threadReady(),
        answered: (lane, item, simulated) => this.threadAnswered(lane, item, simulated),
        ended: (lane, loss, back) => this.threadEnded(lane, loss, back),
        broken: (promise) => this.broken(promise),
      }),
    )
  }

  private threadReady(): void {
    this.failedStarts = 0
    this.started?.resolve()
    this.started = undefined
    this.feed()
  }

  private threadAnswered(lane: ThreadLane, item: WorkItem, simulated: Simulated): void {
    if (this.closed) return
    this.sharedOutstanding--
    this.pace.note(item, simulated.wallSeconds)
    this.events.fact(resultFact(item, simulated, lane.executor))
    if (lane.load < 2) this.feed()
  }

  private threadEnded(lane: ThreadLane, loss: Loss | undefined, back: readonly WorkItem[]): void {
    this.lanes.delete(lane)
    if (this.closed) return
    if (loss !== undefined) {
      this.sharedOutstanding--
      this.events.fact(lostFact(loss, lane.executor))
    }
    const told = back.filter((item) => this.suspects.delete(item))
    this.sharedOutstanding -= told.length
    for (const item of told) this.alone.add(item)
    this.queue.putBack(back.filter((item) => !told.includes(item)))
    if (lane.startFailure !== undefined) this.failedStarts++
    if (this.failedStarts < failedStartsMost) this.addThread()
    else this.fail(lane.startFailure ?? 'no reason was given')
    this.feed()
  }

  /** Gives batches to threads that have room, the least loaded first. */
  private feed(): void {
    for (const depth of [1, 2]) {
      if (depth === 2 && this.pace.isSlow()) return
      for (const lane of this.lanes) {
        if (this.queue.length === 0) return
        if (lane.state !== 'working' || lane.load >= depth) continue
        // A short queue is shared out, so that nobody idles while another has a long batch.
        const share = Math.ceil(this.queue.length / this.options.threads)
        lane.send(this.queue.take(this.pace.batchLength(this.queue, share)))
      }
    }
  }

  // ------------------------------------------------------------------------------------ processes

  private processLane(itemsMost: number): ProcessLane {
    const { host, megabytes } = this
    return new ProcessLane(
      { settings: this.settings, host, megabytes, itemsMost },
      {
        answered: (item, simulated, executor) => this.events.fact(resultFact(item, simulated, executor)),
        lost: (loss, executor) => this.events.fact(lostFact(loss, executor)),
        unusable: (reason) => this.fail(reason),
        broken: (promise) => this.broken(promise),
      },
    )
  }

  // ----------------------------------------------------------------------------------------- time

  private tick(): void {
    const now = performance.now()
    // A pause of this process (stopped, swapped, busy) is no time that a simulation used.
    const seconds = Math.min((now - this.lastTick) / 1000, 2 * tickSeconds)
    this.lastTick = now
    const limit = (item: WorkItem) => this.pace.limitSeconds(item)
    for (const lane of this.lanes) lane.tick(seconds, limit)
    this.alone.tick(seconds, limit)
    this.confirming.tick(seconds, limit)
    if (this.memoryGuard.isOver(seconds)) this.suspectAll()
  }

  private suspectAll(): void {
    for (const lane of this.lanes) {
      const item = lane.running()
      if (item === undefined) continue
      this.suspects.add(item)
      void lane.stop()
    }
  }

  // --------------------------------------------------------------------------------------- failing

  private fail(reason: string): void {
    const error = refuse('no-workers', { detail: `the pinned problem cannot be loaded: ${reason}` })
    if (this.hasFailed) return
    this.hasFailed = true
    this.failedStarts = failedStartsMost
    if (this.started !== undefined) this.started.reject(error)
    else this.events.failed(error)
    this.started = undefined
  }

  private broken(promise: string): void {
    if (!this.hasFailed) this.events.failed(new BrokenPromise(promise))
    this.hasFailed = true
  }
}

/** Watches the memory of the whole process against what the threads may hold together. */
class MemoryGuard {
  private readonly allowance: number
  private most: number
  private restSeconds = 0

  constructor(allowance: number) {
    this.allowance = allowance
    this.most = this.bound()
  }

  /** After it was over it looks away for a while, then takes what is held then as normal: memory returns late. */
  isOver(seconds: number): boolean {
    if (this.restSeconds > 0) {
      this.restSeconds -= seconds
      if (this.restSeconds <= 0) this.most = Math.max(this.most, this.bound())
      return false
    }
    if (process.memoryUsage.rss() <= this.most) return false
    this.restSeconds = 5
    return true
  }

  private bound(): number {
    const held = process.memoryUsage.rss()
    return Math.max(held + 2 ** 28, Math.min(held + this.allowance, 0.85 * totalmem()))
  }
}

/** First in, first out; items that come back go to the front. Taking is cheap however long it is. */
class WorkQueue {
  private items: WorkItem[] = []
  private first = 0

  get length(): number {
    return this.items.length - this.first
  }
  push(item: WorkItem): void {
    this.items.push(item)
  }
  putBack(items: readonly WorkItem[]): void {
    if (items.length === 0) return
    this.items = [...items, ...this.items.slice(this.first)]
    this.first = 0
  }
  take(count: number): WorkItem[] {
    const taken = this.items.slice(this.first, this.first + count)
    this.first += taken.length
    if (this.first > 1024 && this.first * 2 > this.items.length) {
      this.items = this.items.slice(this.first)
      this.first = 0
    }
    return taken
  }
  *[Symbol.iterator](): Iterator<WorkItem> {
    for (let i = this.first; i < this.items.length; i++) yield this.items[i]!
  }
}

function resultFact(item: WorkItem, simulated: Simulated, executor: Executor): DispatchFact {
  const { island, evaluation, attempt, purpose } = item
  const { result, digest, cpuSeconds, wallSeconds } = simulated
  return {
    kind: 'result',
    item: { island, evaluation, attempt, purpose },
    result,
    digest,
    executor,
    cpuSeconds,
    wallSeconds,
  }
}

function lostFact({ item, cause, detail }: Loss, executor: Executor): DispatchFact {
  const { island, evaluation, attempt, purpose, isolation } = item
  return { kind: 'lost', item: { island, evaluation, attempt, purpose, isolation }, cause, detail, executor }
}
