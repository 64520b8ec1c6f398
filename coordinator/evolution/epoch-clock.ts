// Where an island stands in its epochs: an epoch ends when the cost committed since the clock's origin reaches its
// end. Island time only; nothing here knows of other islands.

import type { Counters } from './island-state.js'

/** Length of an epoch where nothing migrates: budgets still end at epochs. */
const roundsWithoutMigration = 20

export class EpochClock {
  readonly #counters: Counters
  readonly #epochCost: number

  /** `everyRounds` of migration, undefined where there is none. Counts in `counters`, which are the island's. */
  constructor(counters: Counters, everyRounds: number | undefined, lookahead: number) {
    this.#counters = counters
    this.#epochCost = (everyRounds ?? roundsWithoutMigration) * lookahead
  }

  /** The epoch that has ended and whose work is not done, or undefined. */
  due(): number | undefined {
    const { epochsPassed, epochOriginCost, costCommitted } = this.#counters
    const epoch = epochsPassed + 1
    return costCommitted >= epochOriginCost + epoch * this.#epochCost ? epoch : undefined
  }

  get hasReceived(): boolean {
    return this.#counters.epochsReceived > this.#counters.epochsPassed
  }

  /** From now on as if `epoch` had just been passed, or the last one passed where that is later. */
  joinAfter(epoch: number): void {
    const counters = this.#counters
    const passed = Math.max(epoch, counters.epochsPassed)
    counters.epochOriginCost = counters.costCommitted - passed * this.#epochCost
    counters.epochsPassed = passed
    counters.epochsReceived = passed
    counters.bestSinceCost = counters.costCommitted
  }
}
