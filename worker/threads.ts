// The simulating threads of one process: a queue shared out in batches, at most two batches a thread ahead.
//
// A thread that dies or hangs is replaced; the item it was running is lost, the others of its batches run again. When
// memory outside the JavaScript heap (typed arrays, wasm) grows beyond what all threads may hold together, nobody can
// tell from outside whose it is: the items that are running become doubtful and are handed back, unblamed.

import { totalmem } from 'node:os'
import { check } from '../shared/check.js'
import { limits } from '../shared/limits.js'
import type { Executor, WorkItem } from '../shared/result.js'
import { type Loss, ThreadLane } from './lane-thread.js'
import { defaultTimeLimit, Pace, type TimeLimit } from './pace.js'
import { WorkQueue } from './queue.js'
import type { Simulated, SimulatorSettings } from './wire.js'

export interface ThreadsOptions {
  readonly settings: SimulatorSettings
  readonly threads: number
  /** What one simulation may hold. */
  readonly megabytes: number
  readonly timeLimit: Partial<TimeLimit>
  /** Wall seconds of one replicate at expected cost 1, where known. */
  readonly secondsPerCost?: number
  readonly host: string
}

export interface ThreadsEvents {
  /** The first thread can work. */
  ready(): void
  answered(item: WorkItem, simulated: Simulated, executor: Executor): void
  lost(loss: Loss, executor: Executor): void
  /** Must run where it can be told what it does. */
  doubtful(item: WorkItem): void
  /** Thread after thread died before it was ready. */
  unusable(reason: string): void
  broken(promise: string): void
}

export const tickSeconds = 0.2
/** Threads in a row that may die before they are ready. */
const failedStartsMost = 3

export class Threads {
  private readonly options: ThreadsOptions
  private readonly events: ThreadsEvents
  private readonly pace: Pace
  private readonly lanes = new Set<ThreadLane>()
  private readonly memoryGuard: MemoryGuard
  private readonly suspects = new Set<WorkItem>()
  private readonly queue = new WorkQueue()
  private readonly timer: NodeJS.Timeout
  private threadsMade = 0
  private failedStarts = 0
  private isReady = false

  constructor(options: ThreadsOptions, events: ThreadsEvents) {
    check(
      options.threads >= 1 && options.threads <= limits.threadsMost,
      'there is a sensible number of threads',
    )
    this.options = options
    this.events = events
    this.pace = new Pace({ ...defaultTimeLimit, ...options.timeLimit }, options.secondsPerCost)
    this.memoryGuard = new MemoryGuard(options.threads * options.megabytes * 2 ** 20)
    for (let i = 0; i < options.threads; i++) this.addThread()
    this.timer = everyTick((seconds) => this.tick(seconds))
  }

  submit(items: readonly WorkItem[]): void {
    for (const item of items) this.queue.push(item)
    this.feed()
  }

  private addThread(): void {
    const { host, settings, megabytes } = this.options
    const worker = `${host}/${process.pid}/t${++this.threadsMade}`
    this.lanes.add(
      new ThreadLane({ kind: 'thread', worker, host }, settings, megabytes, {
        ready: () => this.threadReady(),
        answered: (lane, item, simulated) => this.threadAnswered(lane, item, simulated),
        ended: (lane, loss, back) => this.threadEnded(lane, loss, back),
        broken: (promise) => this.events.broken(promise),
      }),
    )
  }

  private threadReady(): void {
    this.failedStarts = 0
    if (!this.isReady) this.events.ready()
    this.isReady = true
    this.feed()
  }

  private threadAnswered(lane: ThreadLane, item: WorkItem, simulated: Simulated): void {
    this.pace.note(item, simulated.wallSeconds)
    this.events.answered(item, simulated, lane.executor)
    if (lane.load < 2) this.feed()
  }

  private threadEnded(lane: ThreadLane, loss: Loss | undefined, back: readonly WorkItem[]): void {
    this.lanes.delete(lane)
    if (loss !== undefined) this.events.lost(loss, lane.executor)
    const doubtful = back.filter((item) => this.suspects.delete(item))
    for (const item of doubtful) this.events.doubtful(item)
    this.queue.putBack(back.filter((item) => !doubtful.includes(item)))
    if (lane.startFailure !== undefined && ++this.failedStarts >= failedStartsMost) {
      clearInterval(this.timer)
      this.events.unusable(lane.startFailure)
      return
    }
    this.addThread()
    this.feed()
  }

  /** Gives batches to threads that have room, the least loaded first. */
  private feed(): void {
    for (const depth of [1, 2]) {
      if (depth === 2 && this.pace.isSlow()) return
      for (const lane of this.lanes) {
        if (this.queue.length === 0) return
        if (lane.state !== 'working' || lane.load >= depth) continue
        // Batches get shorter with the queue, so that nobody idles while another has a long one.
        const share = Math.ceil(this.queue.length / (2 * this.options.threads))
        lane.send(this.queue.take(this.pace.batchLength(this.queue, share)))
      }
    }
  }

  private tick(seconds: number): void {
    for (const lane of this.lanes) lane.tick(seconds, (item) => this.pace.limitSeconds(item))
    if (!this.memoryGuard.isOver(seconds)) return
    for (const lane of this.lanes) {
      const item = lane.running()
      if (item === undefined) continue
      this.suspects.add(item)
      void lane.stop()
    }
  }
}

/**
 * Calls back about five times a second with the seconds that passed. A pause of this process (stopped, swapped, busy)
 * is no time that a simulation used: it counts as two ticks at most.
 */
export function everyTick(call: (seconds: number) => void): NodeJS.Timeout {
  let lastMs = performance.now()
  return setInterval(() => {
    const nowMs = performance.now()
    const seconds = Math.min((nowMs - lastMs) / 1000, 2 * tickSeconds)
    lastMs = nowMs
    call(seconds)
  }, tickSeconds * 1000)
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
