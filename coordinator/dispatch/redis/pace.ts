// How long items take on a thread, learnt from answers, and how many of them make a job of the wanted duration. It
// decides how work is parcelled, never what it gives.
//
// Model: wall seconds = secondsPerCost * expectedCost * replicates, secondsPerCost a ratio of two sums that forget
// (common practice, no source).

import { limits } from '../../../shared/limits.js'
import type { WorkItem } from '../../../shared/result.js'

const memory = 0.99
/** Bytes of genomes in one job: what a slow network still carries within a second or two. */
const jobBytesMost = 2 ** 18

export class JobPace {
  readonly #jobSeconds: number
  #seconds = 0
  #cost = 0
  #usualSeconds = 0

  constructor(jobMs: number) {
    this.#jobSeconds = jobMs / 1000
  }

  note(item: WorkItem, wallSeconds: number): void {
    this.#seconds = this.#seconds * memory + wallSeconds
    this.#cost = this.#cost * memory + costOf(item)
    this.#usualSeconds =
      this.#usualSeconds === 0 ? wallSeconds : this.#usualSeconds * memory + wallSeconds * (1 - memory)
  }

  /** Wall seconds of one replicate at expected cost 1; undefined until something was measured. */
  get secondsPerCost(): number | undefined {
    return this.#cost === 0 ? undefined : this.#seconds / this.#cost
  }

  /** Wall seconds the item should take; as long as a whole job while nothing is known. */
  seconds(item: WorkItem): number {
    return this.#cost === 0 ? this.#jobSeconds : (this.#seconds / this.#cost) * costOf(item)
  }

  /** Job length for items like those of late. */
  usualLength(): number {
    if (this.#usualSeconds === 0) return 1
    return Math.max(1, Math.min(limits.dispatchBatch, Math.floor(this.#jobSeconds / this.#usualSeconds)))
  }

  /** Where a job that begins at `from` ends: after it has lasted long enough, or holds `most` items. */
  jobEnd(items: readonly WorkItem[], from: number, most: number): number {
    let seconds = 0
    let bytes = 0
    let end = from
    while (end < items.length && end - from < Math.min(most, limits.dispatchBatch)) {
      const item = items[end]!
      seconds += this.seconds(item)
      bytes += item.genome.length
      if (end > from && (seconds > this.#jobSeconds || bytes > jobBytesMost)) break
      end++
    }
    return end
  }
}

function costOf(item: WorkItem): number {
  return item.expectedCost * item.replicates
}
