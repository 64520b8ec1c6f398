// One child process as the pool sees it: simulates one item at a time under limits of time and memory. Whoever kills
// it is known for certain, because nothing else was running.
//
//   (none) ──item──▶ starting ──ready──▶ busy ◀──▶ idle        (a fresh process after `itemsMost` items)
//                        └──────────── died, killed ────▶ (none)

import { check } from '../shared/check.js'
import type { Executor, WorkItem } from '../shared/result.js'
import type { ChildOrder } from './alone.js'
import { Child, type Ending } from './child.js'
import { type Loss, loadSeconds } from './lane-thread.js'
import {
  packBatch,
  type Simulated,
  type SimulatorMessage,
  type SimulatorSettings,
  unpackDone,
} from './wire.js'

export interface ProcessLaneOptions {
  readonly settings: SimulatorSettings
  readonly host: string
  readonly megabytes: number
  /** Items one process may simulate before a fresh one takes over. */
  readonly itemsMost: number
}

export interface ProcessLaneEvents {
  answered(item: WorkItem, simulated: Simulated, executor: Executor): void
  lost(loss: Loss, executor: Executor): void
  /** Process after process died before it was ready. */
  unusable(reason: string): void
  broken(promise: string): void
}

/** A process without a simulation holds about this much; what it may hold beyond is the simulation's. */
const ownMegabytes = 160
/** Processes in a row that may die before they are ready. */
export const failedStartsMost = 3

interface Simulating {
  readonly child: Child<ChildOrder, SimulatorMessage>
  readonly executor: Executor
  ready: boolean
  loadingSeconds: number
  items: number
}

export class ProcessLane {
  private readonly options: ProcessLaneOptions
  private readonly events: ProcessLaneEvents
  private readonly queue: WorkItem[] = []
  private current: Simulating | undefined
  private running: { readonly item: WorkItem; seconds: number } | undefined
  private closed = false
  private failedStarts = 0
  private readonly leaving = new Set<Promise<void>>()

  constructor(options: ProcessLaneOptions, events: ProcessLaneEvents) {
    this.options = options
    this.events = events
  }

  /** Items waiting or running. */
  get load(): number {
    return this.queue.length + (this.running ? 1 : 0)
  }

  add(item: WorkItem): void {
    this.queue.push(item)
    this.next()
  }

  /** Time has passed: ends the process when its item is over a limit. */
  tick(seconds: number, limitSeconds: (item: WorkItem) => number): void {
    const { current, running } = this
    if (current === undefined || current.child.verdict !== undefined) return
    if (!current.ready) {
      current.loadingSeconds += seconds
      if (current.loadingSeconds > loadSeconds) {
        current.child.end({ detail: `it was still loading after ${loadSeconds} s` })
      }
      return
    }
    if (running === undefined) return
    running.seconds += seconds
    const limit = limitSeconds(running.item)
    if (running.seconds > limit) {
      current.child.end({ cause: 'time-limit', detail: `still simulating after ${limit.toPrecision(3)} s` })
      return
    }
    const megabytes = current.child.residentMegabytes()
    if (megabytes !== undefined && megabytes > this.options.megabytes + ownMegabytes) {
      const detail = `held ${megabytes.toFixed(0)} MB; a simulation may hold ${this.options.megabytes} MB`
      current.child.end({ cause: 'memory', detail })
    }
  }

  /** Ends the process, whatever it does. */
  async stop(): Promise<void> {
    this.closed = true
    this.queue.length = 0
    this.current?.child.end({ detail: 'closed' })
    await Promise.all(this.leaving)
  }

  private next(): void {
    if (this.closed || this.running !== undefined) return
    const item = this.queue[0]
    if (this.current !== undefined && this.isSpent(this.current, item)) {
      this.current.child.end({ detail: 'replaced by a fresh process' })
      this.current = undefined
    }
    if (item === undefined) return
    this.current ??= this.start()
    const { current } = this
    if (!current.ready || current.child.verdict !== undefined) return
    this.queue.shift()
    this.running = { item, seconds: 0 }
    current.items++
    current.child.send({ item: packBatch(current.items, [item]) })
  }

  private isSpent({ items, executor }: Simulating, next: WorkItem | undefined): boolean {
    return items >= this.options.itemsMost || (next?.avoid.includes(executor.worker) ?? false)
  }

  private start(): Simulating {
    const { settings, host, megabytes } = this.options
    const child = new Child<ChildOrder, SimulatorMessage>('worker/alone', megabytes, {
      message: (message) => this.hear(started, message),
      gone: (ending) => this.gone(started, ending),
    })
    const executor: Executor = { kind: 'process', worker: `${host}/${child.pid}`, host }
    const started: Simulating = { child, executor, ready: false, loadingSeconds: 0, items: 0 }
    this.leaving.add(child.whenGone)
    void child.whenGone.then(() => this.leaving.delete(child.whenGone))
    child.send({ settings })
    return started
  }

  private hear(from: Simulating, message: SimulatorMessage): void {
    if (from !== this.current || this.closed || from.child.verdict !== undefined) return
    if (message.kind === 'ready') {
      from.ready = true
      this.failedStarts = 0
    } else if (message.kind === 'unusable') {
      from.child.end({ detail: message.reason })
    } else if (message.kind === 'broken') {
      this.events.broken(message.promise)
    } else {
      check(this.running !== undefined, 'an answer belongs to the item that is running')
      const { item } = this.running
      this.running = undefined
      for (const simulated of unpackDone(message)) this.events.answered(item, simulated, from.executor)
    }
    this.next()
  }

  private gone(from: Simulating, ending: Ending): void {
    if (from !== this.current || this.closed) return
    this.current = undefined
    const item = this.running?.item
    this.running = undefined
    if (!from.ready && ++this.failedStarts >= failedStartsMost) {
      this.events.unusable(ending.detail)
      return
    }
    if (item !== undefined) this.events.lost({ item, ...ending }, from.executor)
    this.next()
  }
}
