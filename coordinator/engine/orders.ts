// Facts of the world on their way into a running search: each is given a stated point at which it enters, written
// down with it, and let in there. Which kinds have entered is the search's purity.

import type { Island } from '../evolution/island.js'
import type { IslandPlan } from '../evolution/plan.js'
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

  /** Enters at the end of the first epoch that no island has passed; where an island stands still, at once. */
  atEpoch(kind: string, sentence: string, make: (epoch: number, island: Island) => WorldFact): void {
    this.#impurities.add(kind)
    const { search } = this.#parts
    const shared = search.firstOpenEpoch()
    for (const island of search.islands) {
      const epoch = island.isControl ? island.counters.epochsPassed + 1 : shared
      const standsStill = island.ended || island.paused
      const stage = standsStill ? 'waiting' : 'epoch'
      const at = standsStill ? island.counters.commits : epoch
      this.at(island, kind, true, sentence, { stage, at, fact: make(epoch, island) })
    }
  }

  /** Who takes part after the first epoch that nobody has passed. Returns the islands that are new. */
  membership(sentence: string, active: readonly number[], added: readonly IslandPlan[]): readonly Island[] {
    const { search } = this.#parts
    const epoch = search.nextMembershipEpoch()
    const membership = { epoch, active: [...active], added: [...added], simulations: search.simulations }
    const before = [...search.islands]
    const begun = search.changeMembership(membership)
    const islands = search.islandPlans.length
    this.#impurities.add('islands-changed')
    for (const island of before) {
      const standsStill = island.ended || island.paused
      // A control is in no epoch of the others: it takes its new quota at its own next one.
      const next = island.isControl ? island.counters.epochsPassed + 1 : epoch
      this.at(island, 'islands-changed', true, sentence, {
        stage: standsStill ? 'waiting' : 'epoch',
        at: standsStill ? island.counters.commits : next,
        fact: { fact: 'islands', islands, ...membership },
      })
    }
    return begun
  }

  at(island: Island, kind: string, changesSearch: boolean, sentence: string, data: FactData): void {
    const { schedule, rows, wake } = this.#parts
    schedule.add(island.number, data, { kind, sentence })
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

  /**
   * An island that has ended never comes to the epochs for which something was ordered while it searched: stated
   * again, it enters now. False when there is nothing.
   */
  stateAgain(island: Island): boolean {
    const { commits, epochsPassed } = island.counters
    const overtaken = this.#parts.schedule.takeAfter(island.number, epochsPassed)
    for (const { kind, sentence, fact } of overtaken) {
      const entering = fact.fact === 'budget' ? { ...fact, silentFrom: epochsPassed + 1 } : fact
      const data: FactData = { stage: 'waiting', at: commits, fact: entering, endedWith: epochsPassed }
      this.at(island, kind, true, sentence, data)
    }
    return overtaken.length > 0
  }

  /** Lets the next fact for this point in; false when there is none. */
  enterNext(island: Island, stage: Stage, at: number): boolean {
    const fact = this.#parts.schedule.next(island.number, stage, at)
    if (fact) apply(this.#parts.search, island, stage, fact)
    return fact !== undefined
  }

  enterAll(island: Island, stage: Stage, at: number): void {
    while (this.enterNext(island, stage, at));
  }
}
