// Issues an island's tickets: numbers, costs and virtual times, and whether the quota allows one more.

import { check } from '../../shared/check.js'
import { genomeBytes } from '../../shared/encodings.js'
import type { Genome } from '../../shared/genome.js'
import { simulationsPerReplicate } from './estimate.js'
import type { Counters } from './island-state.js'
import type { SearchPlan } from './plan.js'
import type { Ticket } from './tickets.js'
import type { Individual } from './types.js'

export interface TicketOfficeTools {
  readonly plan: SearchPlan
  readonly expectedCost: (genome: Genome) => number
}

export class TicketOffice {
  readonly #tools: TicketOfficeTools
  readonly #counters: Counters
  readonly #perReplicate: number

  /** Counts in `counters`, which are the island's. */
  constructor(tools: TicketOfficeTools, counters: Counters) {
    this.#tools = tools
    this.#counters = counters
    this.#perReplicate = simulationsPerReplicate(tools.plan.problem)
  }

  affords(replicates: number, quota: number): boolean {
    return this.#counters.proposedSimulations + replicates * this.#perReplicate <= quota
  }

  issue(individual: Individual, replicates: number, founder: boolean): Ticket {
    const { plan, expectedCost } = this.#tools
    const counters = this.#counters
    const cost = expectedCost(individual.genome)
    check(Number.isSafeInteger(cost) && cost > 0, 'an expected cost is a positive whole number')
    const expected = Math.max(1, Math.round((cost * replicates) / plan.replicates.first))
    const simulations = replicates * this.#perReplicate
    const before = counters.proposedSimulations
    counters.proposedSimulations += simulations
    return {
      evaluation: ++counters.evaluations,
      individual,
      genome: genomeBytes(plan.problem.spec, individual.genome),
      firstReplicate: individual.replicates,
      replicates,
      simulations,
      simulationsBefore: before,
      expectedCost: expected,
      virtualFinish: counters.virtualTime + expected,
      founder,
    }
  }
}
