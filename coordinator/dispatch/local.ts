// The embedded dispatcher: threads and processes of this machine. It keeps an inbox of facts and lets the caller wait
// for it; everything about threads lives in the pool, which is handed in (coordinator/main.ts joins the two).
//
// Facts are handed over by the handful, because whoever takes them makes them durable first, and that costs as much CPU
// for one as for a hundred. Nobody waits for it: they are held back only as long as the threads have work in hand.
//
//   submitted ...... work in hand falls ...... to the mark: facts() returns; new work comes before the threads run dry
//
// The mark is the work that the threads do while the caller takes facts in, measured from call to call.

import { BrokenPromise } from '../../shared/check.js'
import type { DispatchFact, WorkItem } from '../../shared/result.js'
import type { Dispatcher, DispatchStatus } from '../engine/ports.js'

/** What the dispatcher needs of whoever simulates here; worker/pool.ts has it. */
export interface LocalPool {
  start(): Promise<void>
  /** Answers may be gathered until no more than `reportAt` of the shared threads' items are without one, for a moment. */
  submit(items: readonly WorkItem[], reportAt: number): void
  status(): LocalStatus
  close(): Promise<void>
}
export interface LocalStatus extends DispatchStatus {
  /** Items that the shared threads have and have not answered. */
  readonly queued: number
  /** What an item takes of late, 0 where nobody knows. */
  readonly secondsEach: number
}
export interface LocalPoolEvents {
  fact(fact: DispatchFact): void
  failed(error: Error): void
}

/** How long facts() holds the first fact back, at most. */
const lingerMs = 250
/** Part of what is out that facts() need not wait beyond. */
const lingerPart = 0.5
/** Time between two calls of facts() as long as none was measured, and what messages take beside it. */
const stepSecondsAtFirst = 0.02
const messageSeconds = 0.02

/**
 * A dispatcher over a pool of this machine. `createPool` makes the pool with the events it is to report to, e.g.
 * `(events) => createPool({ pluginFile, seed, sharedConditions, threads }, events)`.
 * facts() throws what made the pool fail: a Refusal ('no-workers') or a broken promise.
 */
export function localDispatcher(createPool: (events: LocalPoolEvents) => LocalPool): Dispatcher {
  return new LocalDispatcher(createPool)
}

class LocalDispatcher implements Dispatcher {
  private readonly pool: LocalPool
  private inbox: DispatchFact[] = []
  private failure: Error | undefined
  private wake: (() => void) | undefined
  private closed = false
  /** With no more items than this in hand, facts are handed over. */
  private mark = 0
  private isMarked = false
  private stepSeconds = stepSecondsAtFirst
  private handedOverMs: number | undefined

  constructor(createPool: (events: LocalPoolEvents) => LocalPool) {
    this.pool = createPool({
      fact: (fact) => {
        this.inbox.push(fact)
        if (this.wake !== undefined && this.isEnough()) this.wake()
      },
      failed: (error) => {
        this.failure ??= error
        this.wake?.()
      },
    })
  }

  start(): Promise<void> {
    return this.pool.start()
  }

  submit(items: readonly WorkItem[]): void {
    if (items.length === 0) return
    this.setMark(items.length)
    this.pool.submit(items, this.mark)
  }

  async facts(waitMs: number): Promise<DispatchFact[]> {
    if (this.wake !== undefined) throw new BrokenPromise('one caller at a time waits for facts')
    this.measureStep()
    if (!this.isMarked) this.setMark(0)
    this.isMarked = false
    if (this.isQuiet()) await this.somethingHappens(waitMs)
    if (this.inbox.length > 0 && !this.isEnough() && this.failure === undefined)
      await this.somethingHappens(lingerMs)
    else await new Promise((resolve) => setImmediate(resolve))
    if (this.failure !== undefined) throw this.failure
    const facts = this.inbox
    this.inbox = []
    if (facts.length > 0) this.handedOverMs = performance.now()
    return facts
  }

  status(): DispatchStatus {
    const { slots, outstanding, wanted } = this.pool.status()
    return { slots, outstanding, wanted }
  }

  async close(): Promise<void> {
    this.closed = true
    this.wake?.()
    await this.pool.close()
  }

  private isQuiet(): boolean {
    return this.inbox.length === 0 && this.failure === undefined && !this.closed
  }

  /** How long the caller took over what it was given: to make it durable, let the islands move, send out new work. */
  private measureStep(): void {
    if (this.handedOverMs === undefined) return
    const seconds = (performance.now() - this.handedOverMs) / 1000
    this.stepSeconds += (seconds - this.stepSeconds) / 8
    this.handedOverMs = undefined
  }

  /**
   * The work in hand that lasts until new work comes, with `more` items beside what is queued: at most half of all, so
   * that there is something to wait for, and at least one item a slot beside the one it is at.
   */
  private setMark(more: number): void {
    const { slots, queued, secondsEach } = this.pool.status()
    const half = Math.floor((queued + more) * lingerPart)
    const bridge = slots * ((2 * this.stepSeconds + messageSeconds) / secondsEach)
    this.mark = Math.max(2 * slots, Math.min(half, Math.ceil(bridge)))
    this.isMarked = true
  }

  private isEnough(): boolean {
    return this.inbox.length > 0 && (this.closed || this.pool.status().queued <= this.mark)
  }

  /** Resolves when there is enough, on failure, or after that time. */
  private somethingHappens(waitMs: number): Promise<void> {
    return new Promise((resolve) => {
      const done = () => {
        clearTimeout(timer)
        this.wake = undefined
        resolve()
      }
      const timer = setTimeout(done, waitMs)
      this.wake = done
    })
  }
}
