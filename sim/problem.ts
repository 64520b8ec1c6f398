// How a problem is written: defineProblem() takes what an author must say, fills in the rest and checks all of it.
// The types (what a problem is) live in shared/problem.ts. No clock, no files, no entropy: a problem's bundle
// carries this file with it, so it stays small and needs no other package.

import type { GenomeOf, GenomeSpec } from '../shared/genome.js'
import type { Parts, Process } from '../shared/making/types.js'
import { type NeedsInput, needsOf } from '../shared/needs.js'
import type {
  AnyProblem,
  CaseCombination,
  Caution,
  Direction,
  Exactness,
  Frames,
  Measure,
  Objective,
  Problem,
  Reduction,
  SimulationOutcome,
  Situation,
  Tolerance,
  UseOf,
} from '../shared/problem.js'
import type { Stream } from '../shared/streams.js'
import { unmakeable } from './making-guard.js'
import { checkProblem } from './problem-check.js'

export { columnsOf } from './columns.js'

/** What an author says of an objective; `reduce` and `overCases` are 'mean' unless said. */
export interface ObjectiveInput {
  readonly direction: Direction
  readonly unit: string
  readonly reduce?: Reduction
  readonly overCases?: CaseCombination
}

/** What an author says of a problem. The meaning of every field: shared/problem.ts. */
export interface ProblemInput<S extends GenomeSpec, Condition> {
  readonly name: string
  readonly version: string
  readonly summary: string
  readonly genome: S
  readonly objectives: { readonly [name: string]: ObjectiveInput }
  /** None unless said. */
  readonly measures?: { readonly [name: string]: Measure }
  /** None unless said. */
  readonly cases?: readonly string[]
  /** 'bits' unless said. */
  readonly exactness?: Exactness
  /** Asked for with exactness 'tolerance' or 'statistical', for every objective and measure; else not taken. */
  readonly tolerance?: { readonly [name: string]: Tolerance }
  readonly drawCondition: (stream: Stream) => Condition
  readonly simulate: (genome: GenomeOf<S>, situations: readonly Situation<Condition>[]) => SimulationOutcome[]
  /** As simulate, with the step divided by `divide`; not judged unless given. */
  readonly simulateFiner?: (
    genome: GenomeOf<S>,
    situations: readonly Situation<Condition>[],
    divide: number,
  ) => SimulationOutcome[]
  /** 1 core, 1,024 MB and no licences unless said. */
  readonly needs?: NeedsInput
  /** 1 unless said. */
  readonly expectedCost?: (genome: GenomeOf<S>) => number
  /** Leaves the genome as it is unless said. */
  readonly repair?: (genome: GenomeOf<S>) => GenomeOf<S>
  readonly frames?: (genome: GenomeOf<S>, situation: Situation<Condition>) => Frames
  readonly describe?: (genome: GenomeOf<S>) => readonly string[]
  readonly cautions?: (genome: GenomeOf<S>) => readonly Caution[]
  /** Not limited unless said. */
  readonly process?: Process
  readonly parts?: (genome: GenomeOf<S>) => Parts
  /** Not declared unless said: then every caution is shown. */
  readonly use?: UseOf<S>
}

/**
 * The problem that an author described, complete and checked; give it as the default export of the plug-in.
 * Throws a Refusal that names the field: names are plain identifiers, there is at least one objective, every
 * number has a unit (1 for none), ranges are in order, cases differ.
 */
export function defineProblem<const S extends GenomeSpec, Condition>(
  input: ProblemInput<S, Condition>,
): Problem<S, Condition> {
  const objectives: { [name: string]: Objective } = {}
  for (const [name, given] of Object.entries(input.objectives ?? {})) {
    objectives[name] = { reduce: 'mean', overCases: 'mean', ...given }
  }
  const problem: Problem<S, Condition> = {
    ...input,
    objectives,
    measures: input.measures ?? {},
    cases: input.cases ?? [],
    exactness: input.exactness ?? 'bits',
    expectedCost: input.expectedCost ?? (() => 1),
    repair: input.repair ?? ((genome) => genome),
    simulate: onlyMakeable(input),
  }
  checkProblem(problem)
  return problem
}

/** The author's simulate, except that what the declared process cannot make fails without being simulated. */
function onlyMakeable<S extends GenomeSpec, Condition>(
  input: ProblemInput<S, Condition>,
): Problem<S, Condition>['simulate'] {
  if (input.process === undefined || input.parts === undefined) return input.simulate
  return (genome, situations) => {
    const failed = unmakeable(input, genome)
    return failed ? situations.map(() => failed) : input.simulate(genome, situations)
  }
}

/**
 * The default export of a plug-in, checked again as a stranger: it may come from a bundle that another version
 * made. Throws a Refusal ('not-a-problem', 'missing-field', ...) naming the field.
 */
export function asProblem(value: unknown): AnyProblem {
  checkProblem(value)
  return value
}

/** Number of simulations of one replicate: one for each case, or one. */
export function simulationsPerReplicate(problem: { readonly cases: readonly string[] }): number {
  return Math.max(1, problem.cases.length)
}

/** What a search keeps of its problem, as plain data; `digest` is the hex SHA-256 of the bundled plug-in. */
export function problemPlan(problem: AnyProblem, digest: string) {
  return {
    name: problem.name,
    version: problem.version,
    digest,
    spec: problem.genome,
    objectives: Object.entries(problem.objectives).map(([name, { direction, unit, reduce, overCases }]) => ({
      name,
      direction,
      unit,
      reduce,
      overCases,
    })),
    measures: Object.entries(problem.measures).map(([name, { low, high, unit }]) => ({
      name,
      low,
      high,
      unit,
    })),
    cases: [...problem.cases],
    // What most problems promise is not said, so that their plans stay as they were.
    ...(problem.exactness === 'bits' ? {} : { exactness: problem.exactness }),
    ...(problem.needs === undefined ? {} : { needs: needsOf(problem.needs) }),
    ...(problem.tolerance === undefined ? {} : { tolerances: tolerancesOf(problem, problem.tolerance) }),
  }
}

/** One entry a column of a result: objectives, then measures, in the order of declaration. */
function tolerancesOf(problem: AnyProblem, tolerance: { readonly [name: string]: Tolerance }): Tolerance[] {
  return [...Object.keys(problem.objectives), ...Object.keys(problem.measures)].map((name) => ({
    ...tolerance[name],
  }))
}
