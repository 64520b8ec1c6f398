// How honest the step size is: some machines simulated again with half the step, the change of every objective
// beside the spread between replicates of one machine. A change that is small against that spread disappears in it;
// one that is not says that machines are ranked by the step as much as by their worth.

import { idOf } from '../../../shared/ids.js'
import type { AnyProblem, Objective } from '../../../shared/problem.js'
import { evaluateStrict, type StrictEvaluation } from '../../../sim/evaluate.js'
import { columnsOf, simulationsPerReplicate } from '../../../sim/problem.js'
import type { Machine, TrialPlan } from './trials.js'

/** What halving the step does to one objective. */
export interface StepChange {
  readonly objective: string
  readonly unit: string
  /** Mean of the values at the step as it is. */
  readonly mean: number
  /** Mean of the sizes of the changes of single simulations. */
  readonly change: number
  readonly largestChange: number
  /** Mean of the changes with their sign: what does not average out. */
  readonly bias: number
  /** Standard deviation between replicates of one machine and case, pooled; absent with fewer than 2 replicates. */
  readonly spread?: number
}

export interface StepTrial {
  readonly machines: number
  /** Simulations compared. */
  readonly simulations: number
  /** Simulations that failed at one step size and not at the other. */
  readonly failedAtOne: number
  readonly changes: readonly StepChange[]
}

const divide = 2
const machinesMost = 4
const replicatesLeast = 4

/** Undefined where the problem cannot simulate with a smaller step, or no machine came through. */
export function tryStep(
  problem: AnyProblem,
  plan: TrialPlan,
  machines: readonly Machine[],
  clockSeconds: () => number,
  begin: (machine: number) => void,
): StepTrial | undefined {
  const { simulateFiner } = problem
  if (simulateFiner === undefined) return undefined
  const finer: AnyProblem = {
    ...problem,
    simulate: (genome, situations) => simulateFiner(genome, situations, divide),
  }
  const replicates = Math.max(plan.replicates, replicatesLeast)
  const run = (one: AnyProblem, { genome, number }: Machine) =>
    evaluateStrict(one, genome, plan.seed, plan.shared, idOf(1, number), 0, replicates, 'check')
  const pairs: Pair[] = []
  const began = clockSeconds()
  for (const machine of machines) {
    if (machine.first.failures.length > 0) continue
    if (pairs.length >= machinesMost) break
    if (pairs.length > 0 && clockSeconds() - began > plan.secondsMost / 2) break
    begin(machine.number)
    pairs.push({ coarse: run(problem, machine), fine: run(finer, machine) })
  }
  return pairs.length === 0 ? undefined : compare(problem, pairs)
}

interface Pair {
  readonly coarse: StrictEvaluation
  readonly fine: StrictEvaluation
}

/** The values of objective `column` where both came through, machine by machine and case by case. */
function compare(problem: AnyProblem, pairs: readonly Pair[]): StepTrial {
  const columns = columnsOf(problem).length
  const cases = simulationsPerReplicate(problem)
  const failedOf = ({ failures }: StrictEvaluation) => new Set(failures.map(({ simulation }) => simulation))
  const failed = pairs.map(({ coarse, fine }) => ({ coarse: failedOf(coarse), fine: failedOf(fine) }))
  const rows = pairs.map(({ coarse }) => coarse.values.length / columns)
  const isSound = (pair: number, row: number) =>
    !failed[pair]!.coarse.has(row) && !failed[pair]!.fine.has(row)
  let failedAtOne = 0
  let simulations = 0
  for (const [pair, { coarse, fine }] of failed.entries()) {
    for (let row = 0; row < rows[pair]!; row++) {
      if (coarse.has(row) !== fine.has(row)) failedAtOne++
      if (isSound(pair, row)) simulations++
    }
  }
  const changes = Object.entries(problem.objectives).flatMap(([name, objective], column) => {
    const groups = pairs.flatMap(({ coarse, fine }, pair) =>
      Array.from({ length: cases }, (_, one) => {
        const group: [number, number][] = []
        for (let row = one; row < rows[pair]!; row += cases) {
          const at = row * columns + column
          if (isSound(pair, row)) group.push([coarse.values[at]!, fine.values[at]!])
        }
        return group
      }),
    )
    return changeOf(name, objective, groups) ?? []
  })
  return { machines: pairs.length, simulations, failedAtOne, changes }
}

function changeOf(
  objective: string,
  { unit }: Objective,
  groups: readonly (readonly (readonly [number, number])[])[],
): StepChange | undefined {
  const all = groups.flat()
  if (all.length === 0) return undefined
  const mean = (values: readonly number[]) => values.reduce((sum, value) => sum + value, 0) / values.length
  const changes = all.map(([coarse, fine]) => fine - coarse)
  const variances = groups
    .filter((group) => group.length > 1)
    .map((group) => {
      const middle = mean(group.map(([coarse]) => coarse))
      return group.reduce((sum, [coarse]) => sum + (coarse - middle) ** 2, 0) / (group.length - 1)
    })
  return {
    objective,
    unit,
    mean: mean(all.map(([coarse]) => coarse)),
    change: mean(changes.map(Math.abs)),
    largestChange: Math.max(...changes.map(Math.abs)),
    bias: mean(changes),
    ...(variances.length === 0 ? {} : { spread: Math.sqrt(mean(variances)) }),
  }
}
