// A gate that knows only the record: it moves islands exactly as far as their commit journals go, compares every
// recorded digest and stops. Recovery hands over to the engine from there; rederive starts it from nothing.

import { equalBytes, hex } from '../../shared/digests.js'
import { islandName } from '../../shared/ids.js'
import { refuse } from '../../shared/refusals.js'
import type { Island } from '../evolution/island.js'
import type { Mail } from '../evolution/post.js'
import type { Gate, Outcome, Search } from '../evolution/search.js'
import type { Ticket } from '../evolution/tickets.js'
import type { RecordReader } from './ports.js'
import { apply, type Schedule, type Stage } from './world-facts.js'

type RecordedCommit = { readonly commit: number; readonly evaluation: number; readonly digest?: Uint8Array }

export interface ReplayProgress {
  /** Commits done again, over all islands. */
  commits: number
  /** Digests that were compared and equal. */
  digestsCompared: number
  /** Mail that the record lacks because the process ended between a commit and its epoch's work. */
  readonly unsent: Mail[]
}

export class ReplayGate implements Gate {
  readonly progress: ReplayProgress = { commits: 0, digestsCompared: 0, unsent: [] }
  readonly #search: Search
  readonly #reader: RecordReader
  readonly #schedule: Schedule
  readonly #journals = new Map<
    number,
    { readonly rows: Iterator<RecordedCommit>; next: RecordedCommit | undefined }
  >()
  readonly #onCommit: ((island: Island, ticket: Ticket) => void) | undefined

  constructor(
    search: Search,
    reader: RecordReader,
    schedule: Schedule,
    onCommit?: (island: Island, ticket: Ticket) => void,
  ) {
    this.#search = search
    this.#reader = reader
    this.#schedule = schedule
    this.#onCommit = onCommit
    for (const island of search.islands) {
      const rows = reader.commits(island.number, island.counters.commits)[Symbol.iterator]()
      this.#journals.set(island.number, { rows, next: nextOf(rows) })
      schedule.skip(island)
    }
  }

  /** Moves every island to the end of its journal. */
  run(): void {
    this.#search.advanceAll(this)
    for (const island of this.#search.islands) {
      const left = this.#journals.get(island.number)?.next
      if (left) {
        throw refuse('record-differs', {
          detail: `${islandName(island.number)} cannot be derived beyond commit ${island.counters.commits}, but the record has commit ${left.commit}`,
        })
      }
    }
  }

  mayCommit(island: Island): boolean {
    return this.#journals.get(island.number)?.next !== undefined
  }

  nextArrival(island: Island): number | undefined {
    return this.#journals.get(island.number)?.next?.evaluation
  }

  outcome(island: Island, ticket: Ticket): Outcome | undefined {
    const recorded = this.#journals.get(island.number)?.next
    if (!recorded) return undefined
    if (recorded.evaluation !== ticket.evaluation || recorded.commit !== island.counters.commits + 1) {
      throw refuse('record-differs', {
        detail: `${islandName(island.number)} commits evaluation ${ticket.evaluation} as number ${island.counters.commits + 1}, the record has evaluation ${recorded.evaluation} as number ${recorded.commit}`,
      })
    }
    const arrival = this.#reader.arrival(island.number, ticket.evaluation)
    if (!arrival) {
      throw refuse('record-corrupted', {
        detail: `${islandName(island.number)} committed evaluation ${ticket.evaluation}, but its result is not in the record`,
      })
    }
    return { result: arrival.result, digest: arrival.digest }
  }

  committed(island: Island, ticket: Ticket): void {
    const journal = this.#journals.get(island.number)!
    const digest = journal.next?.digest
    if (digest) {
      if (!equalBytes(digest, island.digest)) {
        throw refuse('record-differs', {
          detail: `${islandName(island.number)} at commit ${island.counters.commits}: derived digest ${hex(island.digest).slice(0, 16)}, recorded ${hex(digest).slice(0, 16)}`,
        })
      }
      this.progress.digestsCompared++
    }
    this.progress.commits++
    this.#onCommit?.(island, ticket)
    journal.next = nextOf(journal.rows)
  }

  maySend(island: Island, epoch: number): boolean {
    return this.#reader.mail(island.number, epoch) !== undefined
  }

  sent(mail: Mail): void {
    const recorded = this.#reader.mail(mail.island, mail.epoch)
    if (!recorded) {
      this.progress.unsent.push(mail)
      return
    }
    const same =
      recorded.ended === mail.ended &&
      recorded.emigrants.length === mail.emigrants.length &&
      recorded.emigrants.every((emigrant, at) => emigrant.id === mail.emigrants[at]?.id)
    if (!same) {
      throw refuse('record-differs', {
        detail: `${islandName(mail.island)} sent others at the end of epoch ${mail.epoch} than the record says`,
      })
    }
  }

  released(): void {}

  factWhileWaiting(island: Island): boolean {
    const fact = this.#schedule.next(island.number, 'waiting', island.counters.commits)
    if (fact) apply(this.#search, island, 'waiting', fact)
    return fact !== undefined
  }
  factsBeforeSending(island: Island, epoch: number): void {
    this.#enterAll(island, 'sending', epoch)
  }
  factsAtEpoch(island: Island, epoch: number): void {
    this.#enterAll(island, 'epoch', epoch)
  }
  #enterAll(island: Island, stage: Stage, at: number): void {
    for (let fact = this.#schedule.next(island.number, stage, at); fact; ) {
      apply(this.#search, island, stage, fact)
      fact = this.#schedule.next(island.number, stage, at)
    }
  }
}

function nextOf(rows: Iterator<RecordedCommit>): RecordedCommit | undefined {
  const step = rows.next()
  return step.done ? undefined : step.value
}
