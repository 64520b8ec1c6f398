// The search's best against a control's best, both simulated on fresh conditions: the difference with its standard error.
// Where rivals share their conditions the simulations are paired, which takes out what the conditions do to both.

import type { EvaluationResult } from '../../../shared/result.js'
import { type ResultFact, shownError, significant } from '../../evidence/pictures/facts.js'
import { estimateOf, replicateValues } from '../../evolution/estimate.js'
import type { ObjectivePlan, SearchPlan } from '../../evolution/plan.js'
import { standardErrorOf } from './view.js'

type Estimate = Omit<ResultFact, 'name' | 'unit'>

export interface Difference {
  readonly control: Estimate
  /** By how much the search's best is better, in the objective's unit; negative when it is worse. */
  readonly better: Estimate
  readonly replicates: number
}

/** By the first objective; undefined where either is missing or failed in any simulation. */
export function compareFresh(
  plan: SearchPlan,
  best: EvaluationResult | undefined,
  control: EvaluationResult | undefined,
): Difference | undefined {
  if (!best || !control || best.failures.length + control.failures.length > 0) return undefined
  const objective = plan.problem.objectives[0]!
  const ours = replicateValues(plan.problem, objective, 0, best.values)
  const theirs = replicateValues(plan.problem, objective, 0, control.values)
  const sign = objective.direction === 'maximise' ? 1 : -1
  const gap =
    estimateOf(plan.problem, objective, 0, best.values) -
    estimateOf(plan.problem, objective, 0, control.values)
  // Only of means is the error known from the replicates alone.
  const isMean = objective.reduce === 'mean'
  return {
    control: {
      value: estimateOf(plan.problem, objective, 0, control.values),
      ...error(isMean ? standardErrorOf(theirs) : undefined),
    },
    better: {
      value: sign * gap,
      ...error(isMean ? errorOfDifference(ours, theirs, plan.replicates.shared) : undefined),
    },
    replicates: ours.length,
  }
}

function error(standardError: number | undefined): Pick<Estimate, 'standardError'> {
  return standardError === undefined ? {} : { standardError }
}

/** Of the difference of two means: of the paired differences, or of two independent samples. */
export function errorOfDifference(
  ours: Float64Array,
  theirs: Float64Array,
  paired: boolean,
): number | undefined {
  if (paired) return standardErrorOf(ours.map((value, at) => value - theirs[at]!))
  const [one, two] = [standardErrorOf(ours), standardErrorOf(theirs)]
  return one === undefined || two === undefined ? undefined : Math.sqrt(one * one + two * two)
}

/** Errors a difference must exceed before it is called one. Common practice, no source. */
const errorsForADifference = 2

/** "The search's best is better by 0.31 ± 0.02 m ..." */
export function differenceSentence({ unit }: ObjectivePlan, { better, replicates }: Difference): string {
  const shown = shownError(better)
  const ending = unit === '1' || unit === '' ? '' : ` ${unit}`
  const size = Math.abs(better.value)
  const decimals = shown === undefined ? 0 : Math.min(9, Math.max(0, 1 - Math.floor(Math.log10(shown))))
  const amount =
    shown === undefined
      ? `${significant(size)}${ending}`
      : `${size.toFixed(decimals)} ± ${shown.toFixed(decimals)}${ending} (one standard error, ${replicates} replicates)`
  if (size <= errorsForADifference * (shown ?? 0)) {
    return `The search's best differs by ${amount}: no more than chance may do.`
  }
  return `The search's best is ${better.value > 0 ? 'better' : 'WORSE'} by ${amount}. Another seed may give another difference.`
}
