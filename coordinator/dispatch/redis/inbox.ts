// Facts between the loops that bring them and the one caller who takes them; and the receipts of deliveries, which are
// acknowledged when that caller has made durable what they brought: at its next call.

import { BrokenPromise } from '../../../shared/check.js'
import type { DispatchFact } from '../../../shared/result.js'
import type { Clock } from './clock.js'

/** How long take() waits for company of the first fact. */
const lingerMs = 20
/** Part of what is out that it need not wait beyond. */
const lingerPart = 0.25

export class Inbox {
  readonly #clock: Clock
  readonly #acknowledge: (receipts: readonly string[]) => Promise<void>
  #facts: DispatchFact[] = []
  /** Of deliveries whose facts wait here. */
  #receipts: string[] = []
  /** Of deliveries whose facts were taken, or that brought none. */
  #durable: string[] = []
  #failure: Error | undefined
  #closed = false
  #wake: (() => void) | undefined

  constructor(clock: Clock, acknowledge: (receipts: readonly string[]) => Promise<void>) {
    this.#clock = clock
    this.#acknowledge = acknowledge
  }

  get failed(): boolean {
    return this.#failure !== undefined
  }

  give(facts: readonly DispatchFact[], receipts: readonly string[] = []): void {
    this.#facts.push(...facts)
    this.#receipts.push(...receipts)
    if (facts.length > 0) this.#wake?.()
  }

  /** Deliveries that nobody needs: nothing has to become durable first. */
  drop(receipts: readonly string[]): void {
    this.#durable.push(...receipts)
  }

  /** The next take() throws this. The first failure counts. */
  fail(failure: Error): void {
    this.#failure ??= failure
    this.#wake?.()
  }

  close(): void {
    this.#closed = true
    this.#wake?.()
  }

  /** Facts since the last call; waits for the first one at most `waitMs`, then a moment for more while work is out. */
  async take(waitMs: number, outstanding: () => number): Promise<DispatchFact[]> {
    if (this.#wake !== undefined) throw new BrokenPromise('one caller at a time waits for facts')
    this.#settle()
    if (this.#facts.length === 0) await this.#enough(1, waitMs)
    if (this.#facts.length > 0 && outstanding() > 0)
      await this.#enough(Math.ceil(outstanding() * lingerPart), Math.min(lingerMs, waitMs))
    if (this.#failure !== undefined) throw this.#failure
    const facts = this.#facts
    this.#facts = []
    this.#durable.push(...this.#receipts.splice(0))
    return facts
  }

  /** What was taken at the last call is durable now. */
  #settle(): void {
    const receipts = this.#durable.splice(0)
    if (receipts.length > 0) this.#acknowledge(receipts).catch(() => this.#durable.push(...receipts))
  }

  #enough(count: number, waitMs: number): Promise<void> {
    const isOver = () => this.#facts.length >= count || this.#failure !== undefined || this.#closed
    if (isOver()) return Promise.resolve()
    return new Promise((resolve) => {
      const done = () => {
        cancel()
        this.#wake = undefined
        resolve()
      }
      const cancel = this.#clock.after(waitMs, done)
      this.#wake = () => {
        if (isOver()) done()
      }
    })
  }
}
