// What waits becomes jobs in the queue: packed, addressed, numbered. A job has a number that no other has ever had.

import { type Heartbeat, protocolVersion } from '../../../shared/cluster/messages.js'
import type { WorkItem } from '../../../shared/result.js'
import type { Book, SentJob } from './book.js'
import type { Clock } from './clock.js'
import type { Counters } from './counters.js'
import { type Fleet, takesWork } from './fleet.js'
import type { JobPace } from './pace.js'
import { type Parcel, type Parcels, pack } from './parcels.js'
import type { CoordinatorQueue } from './port.js'

export interface SenderParts {
  readonly queue: CoordinatorQueue
  readonly search: { readonly search: string; readonly record: string; readonly holder: number }
  readonly nonce: string
  readonly book: Book
  readonly fleet: Fleet
  readonly pace: JobPace
  readonly counters: Counters
  readonly clock: Clock
  /** Which filling of the server jobs go to; undefined while there is none. */
  readonly instance: () => string | undefined
  /** Hosts and agents that get nothing. */
  readonly shutOut: () => readonly string[]
  /** Nobody may do these. */
  readonly unfit: (items: readonly WorkItem[]) => void
  readonly fault: (fault: unknown) => void
}

export class Sender {
  readonly #parts: SenderParts
  readonly #firstNumber: number
  #numbers = 0
  #sending = false
  #closed = false

  constructor(parts: SenderParts) {
    this.#parts = parts
    this.#firstNumber = firstNumber(parts.search.holder, parts.nonce)
  }

  /** Whether this coordinator gave that number to a job. */
  isOurs(dispatch: number): boolean {
    return dispatch > this.#firstNumber && dispatch <= this.#firstNumber + this.#numbers
  }

  close(): void {
    this.#closed = true
  }

  /** Sends all that waits; when the server does not take it, it waits on. */
  async send(): Promise<void> {
    if (this.#sending) return
    this.#sending = true
    const { book, instance } = this.#parts
    try {
      // What is handed over in one go of the caller travels together.
      await Promise.resolve()
      for (let filling = instance(); filling !== undefined && book.waiting.length > 0; filling = instance())
        if (this.#closed || !(await this.#sendWaiting(filling))) return
    } finally {
      this.#sending = false
    }
  }

  async #sendWaiting(instance: string): Promise<boolean> {
    const { queue, book, counters, unfit, fault: hear } = this.#parts
    const { parcels, unfit: items } = this.#packWaiting()
    if (items.length > 0) unfit(items)
    const jobs = parcels.map((parcel) => this.#post(parcel, instance))
    if (jobs.length === 0) return true
    try {
      await queue.add(jobs.map(({ outgoing }) => outgoing))
      counters.jobs += jobs.length
      return true
    } catch (fault) {
      // Some may have arrived all the same: they go out again under other numbers, and both answers count.
      for (const { job } of jobs) if (book.job(job.dispatch) === job) book.recall(job)
      hear(fault)
      return false
    }
  }

  #packWaiting(): Parcels {
    const { book, pace } = this.#parts
    const items = book.takeWaiting()
    const able = this.#ableAgents()
    const threads = able.reduce((sum, { cores }) => sum + cores, 0)
    // Two jobs a thread: nobody is idle while somebody else has a long job before it.
    const most = Math.max(1, Math.ceil(book.outstanding / (2 * Math.max(1, threads))))
    return pack(items, able, pace, { most, load: this.#loads(), holders: this.#holdersOf(items) })
  }

  /** Living agents that this search may use and that take work. */
  #ableAgents(): Heartbeat[] {
    const shutOut = this.#parts.shutOut()
    return this.#parts.fleet
      .alive()
      .filter((one) => takesWork(one) && !shutOut.includes(one.agent) && !shutOut.includes(one.host))
  }

  #loads(): Map<string, number> {
    const loads = new Map<string, number>()
    for (const { agent, open } of this.#parts.book.jobs())
      if (agent !== undefined) loads.set(agent, (loads.get(agent) ?? 0) + open.size)
    return loads
  }

  /** For items that double an earlier try: who has that. */
  #holdersOf(items: readonly WorkItem[]): Map<WorkItem, Set<string>> {
    const { book, fleet, search } = this.#parts
    const hedges = items.filter(({ hedge }) => hedge)
    if (hedges.length === 0) return new Map()
    const holders = new Map<number, string>()
    for (const { agent, held } of fleet.alive())
      for (const dispatch of held[search.search] ?? []) holders.set(dispatch, agent)
    const holderOf = ({ dispatch, agent }: SentJob) => agent ?? holders.get(dispatch)
    return new Map(
      hedges.map((item) => [item, new Set(book.otherTries(item).flatMap((job) => holderOf(job) ?? []))]),
    )
  }

  #post({ items, agent, urgent }: Parcel, instance: string) {
    const { book, clock } = this.#parts
    const { search, record } = this.#parts.search
    const dispatch = this.#firstNumber + ++this.#numbers
    const job = book.send(dispatch, agent, items, clock.nowMs())
    const { purpose, isolation, avoid, avoidHosts = [] } = items[0]!
    const common = { protocol: protocolVersion, search, record, instance, dispatch }
    const header = { ...common, purpose, isolation, avoid: [...avoid], avoidHosts: [...avoidHosts] }
    const address = agent === undefined ? {} : { agent }
    return { job, outgoing: { job: { header, items }, urgent, ...address } }
  }
}

/**
 * Numbers of dispatches begin here: 2^32 for each coordinator. Coordinators of one record differ in `holder`; one that
 * goes on from a backup, and has the number of one that is forgotten, differs in its nonce with all but certainty.
 */
function firstNumber(holder: number, nonce: string): number {
  let word = 0
  for (const character of nonce) word = (Math.imul(word, 31) + character.codePointAt(0)!) >>> 0
  return ((holder % 2 ** 10) * 2 ** 11 + (word % 2 ** 11)) * 2 ** 32
}
