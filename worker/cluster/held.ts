// A job that this agent has taken, from the moment it is taken until the server has forgotten it.
//
//   taken ──items begin, end──▶ all answered ──answers written──▶ finished
//     └──────────── no item answered: handed back as it is; some: the rest as losses ────▶

import { check } from '../../shared/check.js'
import type { WorkItem } from '../../shared/result.js'
import type { TakenJob } from './port.js'

/** Which of the pool's lanes its items run in. */
export type Kind = 'shared' | 'confirm' | 'alone'

export class HeldJob {
  readonly taken: TakenJob
  readonly kind: Kind
  /** Which connection's server it was taken from; after a move its lease means nothing. */
  readonly epoch: number
  private readonly open: boolean[]
  /** Items that have neither answer nor loss. */
  left: number
  /** Answers and losses that the server does not have yet. */
  unwritten = 0
  /** Handed back or dropped: whatever still comes of its items is nobody's. */
  abandoned = false

  constructor(taken: TakenJob, epoch: number) {
    const { header, items } = taken.job
    this.taken = taken
    this.epoch = epoch
    this.kind = header.isolation === 'alone' ? 'alone' : header.purpose === 'confirm' ? 'confirm' : 'shared'
    this.open = items.map(() => true)
    this.left = items.length
  }

  get dispatch(): number {
    return this.taken.job.header.dispatch
  }
  get isUntouched(): boolean {
    return this.left === this.open.length
  }
  /** Nothing of it is missing, here or on the server. */
  get isComplete(): boolean {
    return this.left === 0 && this.unwritten === 0
  }

  settle(index: number): void {
    check(this.open[index] === true, 'an item of a job is settled once')
    this.open[index] = false
    this.left--
  }

  /** Places of the items that are not settled. */
  unsettled(): number[] {
    return this.open.flatMap((isOpen, index) => (isOpen ? [index] : []))
  }

  pending(): Pending[] {
    return this.taken.job.items.map((item, index) => ({ job: this, index, item }))
  }
}

/** One item of a job. */
export interface Pending {
  readonly job: HeldJob
  readonly index: number
  readonly item: WorkItem
}

/** Two items of one key are one simulation: re-sent work, or work that came twice. */
export function keyOf({
  island,
  evaluation,
  attempt,
  purpose,
}: Pick<WorkItem, 'island' | 'evaluation' | 'attempt' | 'purpose'>): string {
  return `${purpose} ${island} ${evaluation} ${attempt}`
}
