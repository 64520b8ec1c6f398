// Joins a plan with the tables of methods and operators and with the two functions of the problem that a
// search calls while it proposes.

import type { Genome } from '../../shared/genome.js'
import { methodNamed } from './methods/index.js'
import { makeVariation } from './operators/index.js'
import type { SearchPlan } from './plan.js'
import type { SearchTools } from './search.js'

/** What proposing needs of a problem; both pure. */
export interface ProblemFunctions {
  readonly expectedCost: (genome: Genome) => number
  readonly repair: (genome: Genome) => Genome
}

/** Tools for a Search of this plan. */
export function searchTools(plan: SearchPlan, problem: ProblemFunctions): SearchTools {
  return {
    plan,
    toolsOf: (island, quota) => ({
      plan,
      island,
      quota,
      method: methodNamed(island.method),
      variation: makeVariation(plan.problem.spec, island.operators, { repair: problem.repair }),
      expectedCost: problem.expectedCost,
    }),
  }
}
