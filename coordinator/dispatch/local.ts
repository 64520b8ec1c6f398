// The embedded dispatcher: threads and processes of this machine. It keeps an inbox of facts and lets the caller wait
// for it; everything about threads lives in the pool, which is handed in (coordinator/main.ts joins the two).

import { BrokenPromise } from '../../shared/check.js'
import type { DispatchFact, WorkItem } from '../../shared/result.js'
import type { Dispatcher, DispatchStatus } from '../engine/ports.js'

/** What the dispatcher needs of whoever simulates here; worker/pool.ts has it. */
export interface LocalPool {
  start(): Promise<void>
  submit(items: readonly WorkItem[]): void
  status(): DispatchStatus
  close(): Promise<void>
}
/** How long facts() waits for company of the first fact, at most. */
const lingerMs = 500
/** Part of what is out that it need not wait beyond. */
const lingerPart = 0.5

export interface LocalPoolEvents {
  fact(fact: DispatchFact): void
  failed(error: Error): void
}

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
  /** Facts that are worth waking for. */
  private enough = 1
  private closed = false

  constructor(createPool: (events: LocalPoolEvents) => LocalPool) {
    this.pool = createPool({
      fact: (fact) => {
        this.inbox.push(fact)
        if (this.inbox.length >= this.enough) this.wake?.()
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
    if (items.length > 0) this.pool.submit(items)
  }

  async facts(waitMs: number): Promise<DispatchFact[]> {
    if (this.wake !== undefined) throw new BrokenPromise('one caller at a time waits for facts')
    if (this.isQuiet()) await this.somethingHappens(waitMs, 1)
    const enough = this.enoughFacts()
    if (this.inbox.length > 0 && this.inbox.length < enough)
      await this.somethingHappens(Math.min(lingerMs, waitMs), enough)
    else await new Promise((resolve) => setImmediate(resolve))
    if (this.failure !== undefined) throw this.failure
    const facts = this.inbox
    this.inbox = []
    return facts
  }

  status(): DispatchStatus {
    return this.pool.status()
  }

  async close(): Promise<void> {
    this.closed = true
    this.wake?.()
    await this.pool.close()
  }

  private isQuiet(): boolean {
    return this.inbox.length === 0 && this.failure === undefined && !this.closed
  }

  /**
   * How many facts are worth an append, which costs as much CPU as a small simulation: half of what is out, as
   * long as every slot has something left to do meanwhile.
   */
  private enoughFacts(): number {
    const { outstanding, slots } = this.pool.status()
    // What has been answered is not outstanding any more.
    const out = outstanding + this.inbox.length
    return Math.max(1, Math.min(Math.ceil(out * lingerPart), out - 2 * slots))
  }

  /** Resolves when so many facts are in, on failure, or after that time. */
  private somethingHappens(waitMs: number, enough: number): Promise<void> {
    this.enough = enough
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
