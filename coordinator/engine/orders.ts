// Facts of the world on their way into a running search: each is given a stated point at which it enters, written
// down with it, and let in there. Which kinds have entered is the search's purity.

import type { Island } from '../evolution/island.js'
import type { Search, Standing } from '../evolution/search.js'
import type { RecordReader } from './ports.js'
import { eventRow, type Rows } from './rows.js'
import { apply, type FactData, type Schedule, type Stage, type WorldFact } from './world-facts.js'

export interface OrderParts {
  readonly search: Search
  readonly schedule: Schedule
  readonly rows: Rows
  readonly reader: RecordReader
  readonly standing: (island: number) => Standing | undefined
  readonly wake: (island: number) => void
}

export class Orders {
  readonly #parts: OrderParts
  readonly #impurities = new Set<string>()

  constructor(parts: OrderParts) {
    this.#parts = parts
    for (const event of parts.reader.events()) if (event.changesSearch) this.#impurities.add(event.kind)
  }

  /** Kinds of facts that have changed this search: empty for a pure one. */
  impurities(): readonly string[] {
    return [...this.#impurities].sort()
  }
  addImpurity(kind: string): void {
    this.#impurities.add(kind)
  }

  /** Enters where the island stands now: the next point that no replay can miss. */
  now(island: Island, kind: string, sentence: string, fact: WorldFact): void {
    this.#impurities.add(kind)
    const standing = this.#parts.standing(island.number)
    const { commits, epochsPassed } = island.counters
    const atEpoch = standing === 'confirmation' || standing === 'mail'
    const data: FactData = atEpoch
      ? { stage: 'sending', at: epochsPassed + 1, fact }
      : { stage: 'waiting', at: commits, fact }
    this.at(island, kind, true, sentence, data)
  }

  /** Enters at the end of the first epoch that no island has passed; where an island has ended, at once. */
  atEpoch(kind: string, sentence: string, make: (epoch: number, island: Island) => WorldFact): void {
    this.#impurities.add(kind)
    const { search } = this.#parts
    const shared = search.firstOpenEpoch()
    for (const island of search.islands) {
      const epoch = island.isControl ? island.counters.epochsPassed + 1 : shared
      const stage = island.ended ? 'waiting' : 'epoch'
      const at = island.ended ? island.counters.commits : epoch
      this.at(island, kind, true, sentence, { stage, at, fact: make(epoch, island) })
    }
  }

  at(island: Island, kind: string, changesSearch: boolean, sentence: string, data: FactData): void {
    const { schedule, rows, wake } = this.#parts
    schedule.add(island.number, data)
    if (data.fact.fact === 'finish' && data.fact.epoch > island.counters.epochsPassed) {
      island.finishAfter(data.fact.epoch)
    }
    rows.event(
      eventRow({
        kind,
        island: island.number,
        atCommit: data.stage === 'waiting' ? data.at : island.counters.commits,
        epoch: data.stage === 'waiting' ? 0 : data.at,
        changesSearch,
        sentence,
        data,
      }),
    )
    wake(island.number)
  }

  /** Lets the next fact for this point in; false when there is none. */
  enterNext(island: Island, stage: Stage, at: number): boolean {
    const fact = this.#parts.schedule.next(island.number, stage, at)
    if (fact) apply(this.#parts.search, island, fact)
    return fact !== undefined
  }

  enterAll(island: Island, stage: Stage, at: number): void {
    while (this.enterNext(island, stage, at));
  }
}
