// What is out: every item that was handed over and not answered, and the jobs they travel in.
//
//   add() -> waiting -- send() --> in a job -- answer() --> forgotten
//               ^                     |
//               +------ recall() -----+------ lose() ------> forgotten, told as lost
//
// A job has a number that is used once. What comes back under an old number is still an answer.

import { check } from '../../../shared/check.js'
import type { WorkItem } from '../../../shared/result.js'

export type ItemName = Pick<WorkItem, 'island' | 'evaluation' | 'attempt' | 'purpose'>

export interface SentJob {
  readonly dispatch: number
  /** Addressed to this agent; undefined: to any. */
  readonly agent: string | undefined
  readonly items: readonly WorkItem[]
  /** Places of the items that are not answered. */
  readonly open: Set<number>
  readonly sentMs: number
  /** Since when it was taken by nobody who says so, or cannot be found. */
  strayedMs: number | undefined
}

/** Tries of one work that are looked at: more are hardly ever out. */
const triesLookedAt = 8

interface Entry {
  readonly item: WorkItem
  job: SentJob | undefined
  place: number
}

export class Book {
  readonly #entries = new Map<string, Entry>()
  readonly #jobs = new Map<number, SentJob>()
  #waiting: WorkItem[] = []

  get outstanding(): number {
    return this.#entries.size
  }
  get waiting(): readonly WorkItem[] {
    return this.#waiting
  }
  jobs(): Iterable<SentJob> {
    return this.#jobs.values()
  }
  job(dispatch: number): SentJob | undefined {
    return this.#jobs.get(dispatch)
  }
  find(name: ItemName): WorkItem | undefined {
    return this.#entries.get(nameOf(name))?.item
  }

  /** The outstanding try of this work, whichever it is. */
  findAnyTry({ island, evaluation, purpose }: ItemName): WorkItem | undefined {
    for (let attempt = 1; attempt <= triesLookedAt; attempt++) {
      const item = this.find({ island, evaluation, attempt, purpose })
      if (item) return item
    }
    return undefined
  }

  add(items: readonly WorkItem[]): void {
    for (const item of items) {
      const name = nameOf(item)
      // Work that was settled without it and is taken up anew counts its tries from 1 again: what is out answers it.
      if (this.#entries.has(name)) continue
      this.#entries.set(name, { item, job: undefined, place: 0 })
      this.#waiting.push(item)
    }
  }

  /** Takes all that waits out of the queue, to be sent, lost or put back. */
  takeWaiting(): WorkItem[] {
    const taken = this.#waiting
    this.#waiting = []
    return taken
  }

  putBack(items: readonly WorkItem[]): void {
    this.#waiting = [...items.filter((item) => this.#entries.has(nameOf(item))), ...this.#waiting]
  }

  send(dispatch: number, agent: string | undefined, items: readonly WorkItem[], nowMs: number): SentJob {
    check(items.length > 0 && !this.#jobs.has(dispatch), 'a job holds something and its number is new')
    const job: SentJob = {
      dispatch,
      agent,
      items,
      open: new Set(items.keys()),
      sentMs: nowMs,
      strayedMs: undefined,
    }
    for (const [place, item] of items.entries()) {
      const entry = this.#entries.get(nameOf(item))
      check(entry !== undefined && entry.job === undefined, 'what is sent is outstanding and in no other job')
      entry.job = job
      entry.place = place
    }
    this.#jobs.set(dispatch, job)
    return job
  }

  /** The item is answered; undefined when it was before, or was never handed over. */
  answer(name: ItemName): WorkItem | undefined {
    const entry = this.#entries.get(nameOf(name))
    if (!entry) return undefined
    this.#entries.delete(nameOf(name))
    if (entry.job) this.#close(entry.job, entry.place)
    else this.#waiting = this.#waiting.filter((item) => item !== entry.item)
    return entry.item
  }

  /** The item at this place of a job, when it is still that job's. */
  answerPlace(dispatch: number, place: number): WorkItem | undefined {
    const job = this.#jobs.get(dispatch)
    const item = job?.open.has(place) ? job.items[place] : undefined
    return item && this.answer(item)
  }

  #close(job: SentJob, place: number): void {
    job.open.delete(place)
    if (job.open.size === 0) this.#jobs.delete(job.dispatch)
  }

  /** Jobs in which earlier tries of the same work travel. */
  otherTries({ island, evaluation, attempt, purpose }: ItemName): SentJob[] {
    const jobs: SentJob[] = []
    for (let earlier = attempt - 1; earlier > 0 && attempt - earlier <= triesLookedAt; earlier--) {
      const job = this.#entries.get(nameOf({ island, evaluation, attempt: earlier, purpose }))?.job
      if (job) jobs.push(job)
    }
    return jobs
  }

  /** What is not answered of the job waits again. */
  recall(job: SentJob): number {
    const items = this.#openItems(job)
    for (const item of items) this.#entries.get(nameOf(item))!.job = undefined
    this.#waiting = [...items, ...this.#waiting]
    this.#jobs.delete(job.dispatch)
    return items.length
  }

  /** What is not answered of the job is given up. */
  lose(job: SentJob): WorkItem[] {
    const items = this.#openItems(job)
    this.forget(items)
    this.#jobs.delete(job.dispatch)
    return items
  }

  /** Gives up items that are in no job. */
  forget(items: readonly WorkItem[]): void {
    for (const item of items) this.#entries.delete(nameOf(item))
  }

  #openItems(job: SentJob): WorkItem[] {
    check(this.#jobs.get(job.dispatch) === job, 'the job is out')
    return [...job.open].map((place) => job.items[place]!)
  }
}

function nameOf({ island, evaluation, attempt, purpose }: ItemName): string {
  return `${island}/${evaluation}/${attempt}/${purpose}`
}
