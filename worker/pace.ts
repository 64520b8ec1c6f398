// How long simulations take, learnt from those that returned: it sizes batches and says when a thread hangs. It
// decides where and when things run, never what they give.
//
// Model: wall seconds = secondsPerCost * expectedCost * replicates, secondsPerCost a ratio of two sums that forget
// (common practice, no source).

import { limits } from '../shared/limits.js'
import type { WorkItem } from '../shared/result.js'

/** The wall-time backstop of one evaluation, in seconds: factor times the expected, but never under `leastSeconds`. */
export interface TimeLimit {
  readonly factor: number
  /** A machine may be busy with other things: no thread is replaced sooner. */
  readonly leastSeconds: number
  /** The limit as long as nothing has been measured. */
  readonly unmeasuredSeconds: number
}

export const defaultTimeLimit: TimeLimit = {
  factor: limits.wallTimeFactor,
  leastSeconds: 20,
  unmeasuredSeconds: 600,
}

/** A message to a thread should last about this long: long against sending it, short against a person's patience. */
const batchSeconds = 0.4
/** Nor are messages made that last less, however few items are left to share out. */
const batchSecondsLeast = 0.02
const memory = 0.99

export class Pace {
  private readonly limit: TimeLimit
  private seconds = 0
  private cost = 0
  /** Mean wall seconds of the latest items, 0 until one has returned. */
  lastSeconds = 0

  /** `secondsPerCost` where it is known beforehand, e.g. from `check`. */
  constructor(limit: TimeLimit, secondsPerCost?: number) {
    this.limit = limit
    if (secondsPerCost !== undefined) {
      this.seconds = secondsPerCost
      this.cost = 1
    }
  }

  note(item: WorkItem, wallSeconds: number): void {
    this.seconds = this.seconds * memory + wallSeconds
    this.cost = this.cost * memory + costOf(item)
    this.lastSeconds =
      this.lastSeconds === 0 ? wallSeconds : this.lastSeconds * memory + wallSeconds * (1 - memory)
  }

  /** Undefined until something has been measured. */
  expectedSeconds(item: WorkItem): number | undefined {
    return this.cost === 0 ? undefined : (this.seconds / this.cost) * costOf(item)
  }

  limitSeconds(item: WorkItem): number {
    const expected = this.expectedSeconds(item)
    if (expected === undefined) return this.limit.unmeasuredSeconds
    return Math.max(this.limit.leastSeconds, this.limit.factor * expected)
  }

  /** How many items from the front of `queue` make a batch: at least 1; more than `most` only where they are very cheap. */
  batchLength(queue: Iterable<WorkItem>, most: number): number {
    let seconds = 0
    let count = 0
    for (const item of queue) {
      if (count >= limits.dispatchBatch || (count >= most && seconds >= batchSecondsLeast)) break
      seconds += this.expectedSeconds(item) ?? batchSeconds
      if (count > 0 && seconds > batchSeconds) break
      count++
    }
    return Math.max(1, count)
  }

  /** Batch length for items like those of late. */
  usualBatchLength(): number {
    if (this.lastSeconds === 0) return 1
    return Math.max(1, Math.min(limits.dispatchBatch, Math.floor(batchSeconds / this.lastSeconds)))
  }
  /** True when an item lasts so long that the pause between two messages is nothing against it. */
  isSlow(): boolean {
    return this.lastSeconds > 0.25
  }
}

function costOf(item: WorkItem): number {
  return item.expectedCost * item.replicates
}
