// Confirmation by somebody else: agents of one thread, in processes that never compute a first result. That is what
// 'fresh' means here: another process than the one that answered first, and of no great age. One confirms many items,
// because to start it and let V8 compile the plug-in once more costs about a second of CPU; it leaves when it has done
// its number of items and has simulated for a stated time, so that what a plug-in may keep between calls does not live
// long. Its successor is started when half of that is done, so that nobody waits for it.

import type { Executor, WorkItem } from '../shared/result.js'
import { AgentLane, type AgentLaneEvents } from './lane-agent.js'
import type { ThreadsOptions } from './threads.js'

export interface ConfirmLaneOptions {
  readonly agent: ThreadsOptions
  /** Items one process may simulate before a fresh one takes over. */
  readonly itemsMost: number
  /** Nor is a process replaced before it has simulated for so long, however many items that are. */
  readonly secondsLeast: number
}

export type ConfirmLaneEvents = Omit<AgentLaneEvents, 'ready'>

interface Serving {
  readonly lane: AgentLane
  /** Items handed to it so far, and those of them that are not answered. */
  given: number
  open: number
  /** How long it has simulated. */
  seconds: number
}

export class ConfirmLane {
  private readonly options: ConfirmLaneOptions
  private readonly events: ConfirmLaneEvents
  private readonly waiting: WorkItem[] = []
  private current: Serving | undefined
  private successor: Serving | undefined
  private readonly leaving = new Set<Promise<void>>()
  private closed = false

  constructor(options: ConfirmLaneOptions, events: ConfirmLaneEvents) {
    this.options = options
    this.events = events
  }

  /** Items waiting or running. */
  get load(): number {
    return this.waiting.length + (this.current?.open ?? 0)
  }

  add(item: WorkItem): void {
    this.waiting.push(item)
    // Items that are added together travel together.
    if (this.waiting.length === 1) queueMicrotask(() => this.serve())
  }

  async stop(): Promise<void> {
    this.closed = true
    this.waiting.length = 0
    const last = [this.current, this.successor].map((serving) => serving?.lane.stop())
    await Promise.all([...this.leaving, ...last])
  }

  private serve(): void {
    if (this.closed || this.waiting.length === 0) return
    if (this.current?.open === 0) this.retireSpent(this.current)
    this.current ??= this.take()
    const { current } = this
    if (this.isSpent(current, 1)) return
    const { itemsMost } = this.options
    const items = this.waiting.splice(
      0,
      Math.max(itemsMost - current.given, this.isOld(current, 1) ? 0 : itemsMost),
    )
    current.given += items.length
    current.open += items.length
    // Nobody is idle until they are all confirmed.
    current.lane.submit(items, 0)
    if (this.isSpent(current, 0.5)) this.successor ??= this.open()
    if (this.waiting.length > 0) queueMicrotask(() => this.serve())
  }

  /** Whether it has served this part of its time and of its items. */
  private isSpent(serving: Serving, part: number): boolean {
    return serving.given >= part * this.options.itemsMost && this.isOld(serving, part)
  }
  private isOld({ seconds }: Serving, part: number): boolean {
    return seconds >= part * this.options.secondsLeast
  }

  /** The successor, or a fresh one when there is none. */
  private take(): Serving {
    const serving = this.successor ?? this.open()
    this.successor = undefined
    return serving
  }

  private open(): Serving {
    const { events } = this
    const settle = () => this.settled(serving)
    const lane = new AgentLane(this.options.agent, {
      ready: () => undefined,
      answered: (item, simulated, executor) => {
        serving.seconds += simulated.wallSeconds
        settle()
        events.answered(item, simulated, processOf(executor))
      },
      lost: (loss, executor) => {
        settle()
        events.lost(loss, processOf(executor))
      },
      doubtful: (item) => {
        settle()
        events.doubtful(item)
      },
      unusable: events.unusable,
      broken: events.broken,
    })
    const serving: Serving = { lane, given: 0, open: 0, seconds: 0 }
    lane.start()
    return serving
  }

  private settled(serving: Serving): void {
    serving.open--
    if (serving.open > 0 || serving !== this.current) return
    this.retireSpent(serving)
    this.serve()
  }

  private retireSpent(serving: Serving): void {
    if (!this.isSpent(serving, 1)) return
    this.current = undefined
    const gone = serving.lane.stop()
    this.leaving.add(gone)
    void gone.then(() => this.leaving.delete(gone))
  }
}

/** Confirmation is by a process; which of its threads did it is nobody's concern. */
function processOf({ worker, host }: Executor): Executor {
  return { kind: 'process', worker: worker.slice(0, worker.lastIndexOf('/')), host }
}
