// Budgets that are not a count of simulations: a target value, core-hours, a date. A target is judged from commits
// alone, so it ends a search at the same point on every machine; hours and dates are facts of the world.

import { naturalValue } from '../evolution/estimate.js'
import type { Island } from '../evolution/island.js'
import type { SearchPlan } from '../evolution/plan.js'

/** True when the island's best has reached the target of the first objective on all the replicates it may get. */
export function targetReached(plan: SearchPlan, island: Island): boolean {
  const { target } = plan.budget
  const best = island.best
  const objective = plan.problem.objectives[0]
  if (target === undefined || !best || !objective || best.failedSimulations > 0) return false
  const needed = plan.replicates.topUp > 0 ? island.mostReplicates : plan.replicates.first
  if (best.replicates < needed) return false
  const value = naturalValue(objective, best.score[0]!)
  return objective.direction === 'maximise' ? value >= target : value <= target
}
