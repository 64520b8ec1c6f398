// From the rows of simulations to an individual's score: cases become one number a replicate, replicates
// become one number an objective, and the sign is turned so that smaller is better.

import { check } from '../../shared/check.js'
import type { CaseCombination, Direction, Reduction } from '../../shared/problem.js'
import type { ObjectivePlan, ProblemPlan } from './plan.js'

/** Simulations in one replicate: one per case, or one where the problem names no cases. */
export function simulationsPerReplicate(problem: ProblemPlan): number {
  return Math.max(1, problem.cases.length)
}

/** Numbers in one row of results: objectives, then measures. */
export function columnsOf(problem: ProblemPlan): number {
  return problem.objectives.length + problem.measures.length
}

/**
 * The score of an individual: one number an objective, to be minimised. +Infinity on every objective when any
 * of its simulations failed (a machine that sometimes cannot be simulated is no candidate) and when an estimate
 * is beyond the largest number.
 */
export function scoreOf(problem: ProblemPlan, values: Float64Array, failedSimulations: number): Float64Array {
  const score = new Float64Array(problem.objectives.length)
  if (failedSimulations > 0 || values.length === 0) return score.fill(Number.POSITIVE_INFINITY)
  // One row needs no reducing: mean, median, worst and every quantile of one number are that number.
  const single = values.length === columnsOf(problem)
  for (let column = 0; column < score.length; column++) {
    const objective = problem.objectives[column]!
    const estimate = single ? values[column]! : estimateOf(problem, objective, column, values)
    // Finite numbers can have a sum that is not: what cannot be ranked is no candidate either.
    if (!Number.isFinite(estimate)) return score.fill(Number.POSITIVE_INFINITY)
    score[column] = objective.direction === 'maximise' ? 0 - estimate : estimate
  }
  return score
}

/** An objective's estimate in its own direction and unit. */
export function estimateOf(
  problem: ProblemPlan,
  objective: ObjectivePlan,
  column: number,
  values: Float64Array,
): number {
  return reduce(objective.reduce, objective.direction, replicateValues(problem, objective, column, values))
}

/** One number a replicate: the objective's cases combined. */
export function replicateValues(
  problem: ProblemPlan,
  objective: ObjectivePlan,
  column: number,
  values: Float64Array,
): Float64Array {
  const width = columnsOf(problem)
  const cases = simulationsPerReplicate(problem)
  const replicates = values.length / (width * cases)
  check(Number.isInteger(replicates), 'values hold whole replicates')
  const combined = new Float64Array(replicates)
  for (let replicate = 0; replicate < replicates; replicate++) {
    const start = replicate * cases * width + column
    let total = values[start]!
    for (let number = 1; number < cases; number++) {
      total = combine[objective.overCases](total, values[start + number * width]!, objective.direction)
    }
    combined[replicate] = objective.overCases === 'mean' ? total / cases : total
  }
  return combined
}

const combine: Record<CaseCombination, (a: number, b: number, direction: Direction) => number> = {
  mean: (a, b) => a + b,
  sum: (a, b) => a + b,
  worst: (a, b, direction) => (direction === 'maximise' ? Math.min(a, b) : Math.max(a, b)),
}

/** Replicates to one number. Quantiles are definition 7 of Hyndman and Fan, Sample quantiles (1996). */
export function reduce(reduction: Reduction, direction: Direction, values: Float64Array): number {
  check(values.length > 0, 'an estimate needs a replicate')
  if (typeof reduction === 'object') return quantile(values, reduction.quantile)
  return reductions[reduction](values, direction)
}

const reductions: Record<
  'mean' | 'median' | 'worst',
  (values: Float64Array, direction: Direction) => number
> = {
  mean: (values) => {
    let sum = 0
    for (let i = 0; i < values.length; i++) sum += values[i]!
    return sum / values.length
  },
  median: (values) => quantile(values, 0.5),
  worst: (values, direction) => {
    let worst = values[0]!
    for (const value of values) worst = combine.worst(worst, value, direction)
    return worst
  },
}

function quantile(values: Float64Array, probability: number): number {
  const sorted = values.slice().sort()
  const position = probability * (sorted.length - 1)
  const below = Math.floor(position)
  const above = Math.min(below + 1, sorted.length - 1)
  return sorted[below]! + (position - below) * (sorted[above]! - sorted[below]!)
}

/** An objective's number as people read it, from a score that was turned to be minimised. */
export function naturalValue(objective: ObjectivePlan, score: number): number {
  return objective.direction === 'maximise' ? 0 - score : score
}
