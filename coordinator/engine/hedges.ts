// Stragglers: the piece of work that an island waits for, and that takes much longer than such work usually does, is
// submitted a second time, to another worker; whichever answer comes first counts, the other must be equal (Dean and
// Barroso, The tail at scale, 2013: hedged requests, from memory). A budget keeps a slow fleet from doubling its own
// load. Work that is sent again because its worker fell silent is no hedge.

import type { DispatchFact } from '../../shared/result.js'
import type { Search } from '../evolution/search.js'
import type { EngineCounts } from './counts.js'
import { isNeeded, type Purpose, type Work, type Works } from './works.js'

/** Hedges may be so large a part of all results. */
export const hedgeBudget = 0.02
/** As many of the last times are remembered, and so many are wanted before any is judged. */
const timesKept = 256
const timesWanted = 32
/** Twice the 95th percentile: what is slower is slow. */
const percentile = 0.95
const patienceFactor = 2

export class Hedges {
  readonly #search: Search
  readonly #works: Works
  readonly #counts: EngineCounts
  readonly #leastMs: number
  /** Milliseconds from handing out to answer, for one unit of expected cost; a ring. */
  readonly #times: number[] = []
  #noted = 0
  #percentile = Number.POSITIVE_INFINITY

  constructor(search: Search, works: Works, counts: EngineCounts, leastMs: number) {
    this.#search = search
    this.#works = works
    this.#counts = counts
    this.#leastMs = leastMs
  }

  /** An answer: how long such work takes. */
  note(work: Work, { item }: Extract<DispatchFact, { kind: 'result' }>, nowMs: number): void {
    const lane = work[item.purpose]
    if (lane.state !== 'submitted' || lane.attempt !== item.attempt || lane.earlier > 0) return
    this.#times[this.#noted % timesKept] = (nowMs - lane.sinceMs) / work.expectedCost
    this.#noted++
    if (this.#noted < timesWanted || this.#noted % timesWanted !== 0) return
    const sorted = this.#times.toSorted((a, b) => a - b)
    this.#percentile = sorted[Math.floor(percentile * (sorted.length - 1))]!
  }

  /** Asks for what every island waits for, where it takes too long and the budget allows it. */
  look(nowMs: number): void {
    if (this.#percentile === Number.POSITIVE_INFINITY) return
    for (const island of this.#search.islands) {
      if (island.ended || island.paused) continue
      const ticket = island.next()
      const work = ticket && this.#works.find(island.number, ticket.evaluation)
      if (!work) continue
      for (const purpose of ['evaluate', 'confirm'] as const) {
        if (this.#isSlow(work, purpose, nowMs) && this.#isAfforded()) {
          this.#counts.hedges++
          this.#works.hedge(work, purpose)
        }
      }
    }
  }

  #isSlow(work: Work, purpose: Purpose, nowMs: number): boolean {
    const lane = work[purpose]
    if (lane.state !== 'submitted' || lane.earlier > 0 || lane.hedged || !isNeeded(work, purpose))
      return false
    const usualMs = this.#percentile * work.expectedCost
    return nowMs - lane.sinceMs > Math.max(this.#leastMs, patienceFactor * usualMs)
  }

  #isAfforded(): boolean {
    return this.#counts.hedges + 1 <= hedgeBudget * this.#counts.results
  }
}
