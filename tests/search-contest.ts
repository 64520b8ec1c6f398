// A search against chance: the search of a search file and as many simulations of random individuals, driven in this
// process; the best of each by the first objective is then simulated on fresh conditions, the same for both, as every
// search ends (coordinator/cli/join/finish.ts).

import { errorOfDifference } from '../coordinator/cli/join/comparison.js'
import { retestReplicates } from '../coordinator/cli/join/finish.js'
import { bestOf } from '../coordinator/cli/join/view.js'
import { searchTables } from '../coordinator/cli/search-tables.js'
import { planSearch, readSearchFile } from '../coordinator/cli/searchfile/read.js'
import { searchTools } from '../coordinator/evolution/build.js'
import { replicateValues } from '../coordinator/evolution/estimate.js'
import type { Island } from '../coordinator/evolution/island.js'
import type { SearchPlan } from '../coordinator/evolution/plan.js'
import { limits } from '../shared/limits.js'
import type { AnyProblem } from '../shared/problem.js'
import type { EvaluationResult } from '../shared/result.js'
import { columnsOf } from '../sim/columns.js'
import { evaluate } from '../sim/evaluate.js'
import { problemPlan } from '../sim/problem.js'
import { drivenSearch, gateOf } from './drive-search.js'

/** What a search file makes of a problem that is there already, not bundled. */
export function planOf(searchText: string, problem: AnyProblem): SearchPlan {
  const tables = searchTables()
  const { plan, findings } = planSearch(
    readSearchFile(searchText, tables),
    problemPlan(problem, '0'.repeat(64)),
    tables,
  )
  if (!plan) throw new Error(findings.map(({ field, found }) => `${field}: ${found}`).join('; '))
  return plan
}

export interface Contestant {
  /** The best, simulated on fresh conditions. */
  readonly fresh: EvaluationResult
  /** Its first objective, one number a replicate; `failedAs` for one with a failed simulation. */
  readonly values: Float64Array
  readonly mean: number
  /** Mean of every objective and measure over the simulations that did not fail. */
  readonly means: { readonly [name: string]: number }
  readonly failedReplicates: number
}

export interface ContestResult {
  readonly seed: number
  readonly search: Contestant
  readonly chance: Contestant
  /** By how much the first objective is better in the search's best; with the standard error of paired replicates. */
  readonly better: number
  readonly standardError: number
}

export interface ContestOptions {
  readonly seed: number
  /** Of the search, and of chance once more. */
  readonly simulations: number
  /** What a replicate with a failed simulation counts. */
  readonly failedAs: number
  readonly change?: (plan: SearchPlan) => SearchPlan
}

/** Runs the search of this file, which names random sampling as its control, with another seed and budget. */
export function runContest(searchText: string, problem: AnyProblem, options: ContestOptions): ContestResult {
  const { seed, simulations, change = (plan) => plan } = options
  const plan = change({ ...planOf(searchText, problem), seed, budget: { simulations } })
  const { shared } = plan.replicates
  const gate = gateOf((_, { individual, firstReplicate, replicates }) =>
    evaluate(problem, individual.genome, seed, shared, individual.id, firstReplicate, replicates),
  )
  const { expectedCost, repair } = problem
  const { islands } = drivenSearch(plan, gate, searchTools(plan, { expectedCost, repair }))
  const [search, chance] = [islands.filter(isOfSearch), islands.filter(isOfChance)].map((side) =>
    retested(side, problem, plan, options.failedAs),
  )
  const sign = plan.problem.objectives[0]!.direction === 'maximise' ? 1 : -1
  return {
    seed,
    search: search!,
    chance: chance!,
    better: sign * (search!.mean - chance!.mean),
    standardError: errorOfDifference(search!.values, chance!.values, shared)!,
  }
}

const isOfSearch = (island: Island) => !island.isControl
const isOfChance = (island: Island) => island.isControl && island.tools.island.method === 'random-sampling'

function retested(
  side: readonly Island[],
  problem: AnyProblem,
  plan: SearchPlan,
  failedAs: number,
): Contestant {
  const best = bestOf(side)
  if (!best) throw new Error(`none of ${side.length} islands has a machine that does not fail`)
  const { seed, replicates } = plan
  const first = limits.replicatesMost
  const fresh = evaluate(problem, best.genome, seed, replicates.shared, best.id, first, retestReplicates)
  const cases = Math.max(1, plan.problem.cases.length)
  const failed = new Set(fresh.failures.map(({ simulation }) => Math.floor(simulation / cases)))
  const values = replicateValues(plan.problem, plan.problem.objectives[0]!, 0, fresh.values).map(
    (value, replicate) => (failed.has(replicate) ? failedAs : value),
  )
  const sound = retestReplicates * cases - fresh.failures.length
  const columns = columnsOf(problem)
  const sums = columns.map((_, column) =>
    fresh.values.reduce((sum, value, at) => sum + (at % columns.length === column ? value : 0), 0),
  )
  return {
    fresh,
    values,
    mean: values.reduce((a, b) => a + b, 0) / values.length,
    // Rows of failed simulations are zero.
    means: Object.fromEntries(columns.map((name, column) => [name, sums[column]! / sound])),
    failedReplicates: failed.size,
  }
}
