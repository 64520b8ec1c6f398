// One evaluation: conditions drawn, situations listed, the problem called once, every number checked. Whatever
// the problem does wrong becomes a failed row with a reason; the search goes on. evaluateStrict() keeps apart
// what the problem said itself (a machine that failed) and what is a fault of the problem, for `check`.

import { conditionStream } from '../shared/conditions.js'
import type { Genome } from '../shared/genome.js'
import { limits } from '../shared/limits.js'
import type { AnyProblem, Situation } from '../shared/problem.js'
import { plainText } from '../shared/refusals.js'
import type { EvaluationResult, SimulationFailure } from '../shared/result.js'
import type { Purpose } from '../shared/streams.js'
import { columnsOf } from './columns.js'

/** The values as evaluate() gives them; `faults` are the failures that are the problem's doing, not the machine's. */
export interface StrictEvaluation extends EvaluationResult {
  readonly faults: readonly SimulationFailure[]
}

/**
 * Simulates replicates `firstReplicate` to `firstReplicate + replicates - 1` of one individual. Never throws for
 * what a problem does. Rows: replicate-major, then case (shared/result.ts).
 */
export function evaluate(
  problem: AnyProblem,
  genome: Genome,
  seed: number,
  sharedConditions: boolean,
  individualId: number,
  firstReplicate: number,
  replicates: number,
): EvaluationResult {
  const strict = evaluateStrict(
    problem,
    genome,
    seed,
    sharedConditions,
    individualId,
    firstReplicate,
    replicates,
  )
  return { values: strict.values, failures: strict.failures }
}

/** As evaluate(), and says which failures are faults of the problem. */
export function evaluateStrict(
  problem: AnyProblem,
  genome: Genome,
  seed: number,
  sharedConditions: boolean,
  individualId: number,
  firstReplicate: number,
  replicates: number,
  purpose: Purpose = 'condition',
): StrictEvaluation {
  const cases = problem.cases.length > 0 ? problem.cases : ['']
  const rows = replicates * cases.length
  const columns = columnsOf(problem)
  const values = new Float64Array(rows * columns.length)
  let outcomes: unknown
  try {
    const situations: Situation<unknown>[] = []
    for (let j = firstReplicate; j < firstReplicate + replicates; j++) {
      const drawn = conditionStream(seed, sharedConditions, individualId, j, purpose)
      const condition = problem.drawCondition(drawn)
      for (const name of cases) situations.push({ condition, case: name })
    }
    outcomes = problem.simulate(genome, situations)
  } catch (error) {
    return allFailed(values, rows, `the problem threw: ${fieldOf(error)}${textOf(error).replace(/\.$/, '')}`)
  }
  if (!Array.isArray(outcomes) || outcomes.length !== rows) {
    const got = Array.isArray(outcomes) ? `${outcomes.length} outcomes` : typeof outcomes
    return allFailed(values, rows, `simulate returned ${got} for ${rows} situations`)
  }
  return readOutcomes(problem, outcomes, columns, values)
}

function readOutcomes(
  problem: AnyProblem,
  outcomes: readonly unknown[],
  columns: readonly string[],
  values: Float64Array,
): StrictEvaluation {
  const failures: SimulationFailure[] = []
  const faults: SimulationFailure[] = []
  for (const [simulation, outcome] of outcomes.entries()) {
    const row = values.subarray(simulation * columns.length, (simulation + 1) * columns.length)
    const read = readOutcome(problem, outcome, row)
    if (!read) continue
    row.fill(0)
    const failure = { simulation, reason: reasonText(read.reason) }
    failures.push(failure)
    if (read.isFault) faults.push(failure)
  }
  return { values, failures, faults }
}

/** Fills one row, or says why it cannot be filled. */
function readOutcome(
  problem: AnyProblem,
  outcome: unknown,
  row: Float64Array,
): { reason: string; isFault: boolean } | undefined {
  const fault = (reason: string) => ({ reason, isFault: true })
  if (typeof outcome !== 'object' || outcome === null)
    return fault(`an outcome is ${textOf(outcome)}, not an object`)
  const { failed, objectives, measures } = outcome as { readonly [field: string]: unknown }
  if (failed !== undefined) {
    return typeof failed === 'string'
      ? { reason: failed || 'failed without a reason', isFault: failed === '' }
      : fault(`failed is ${textOf(failed)}, not a sentence`)
  }
  const count = Object.keys(problem.objectives).length
  const trouble =
    readNumbers('objective', Object.keys(problem.objectives), objectives, row, 0) ??
    readNumbers('measure', Object.keys(problem.measures), measures ?? {}, row, count)
  return trouble === undefined ? undefined : fault(trouble)
}

function readNumbers(
  word: string,
  names: readonly string[],
  given: unknown,
  row: Float64Array,
  first: number,
): string | undefined {
  if (typeof given !== 'object' || given === null) return `${word}s are ${textOf(given)}, not an object`
  const bag = given as { readonly [name: string]: unknown }
  for (const [i, name] of names.entries()) {
    const value = Object.hasOwn(bag, name) ? bag[name] : undefined
    if (value === undefined) return `${word} ${name} is missing`
    if (typeof value !== 'number') return `${word} ${name} is ${textOf(value)}, not a number`
    if (!Number.isFinite(value)) return `${word} ${name} is ${value}, not a finite number`
    row[first + i] = value + 0 // -0 + 0 is 0
  }
  const extra = Object.keys(bag).find((name) => !names.includes(name))
  return extra === undefined ? undefined : `${word} ${extra} is not declared`
}

function allFailed(values: Float64Array, rows: number, reason: string): StrictEvaluation {
  values.fill(0)
  const failures = Array.from({ length: rows }, (_, simulation) => ({
    simulation,
    reason: reasonText(reason),
  }))
  return { values, failures, faults: failures }
}

function reasonText(reason: string): string {
  return plainText(reason).slice(0, limits.failureReasonLength)
}

/**
 * The field that a refusal names, such as the strut of a lattice, before its text. Read by its shape: a bundle has a
 * Refusal class of its own.
 */
function fieldOf(error: unknown): string {
  try {
    if (!(error instanceof Error) || !('where' in error)) return ''
    const where = error.where as { readonly field?: unknown } | null | undefined
    return typeof where?.field === 'string' ? `${where.field}: ` : ''
  } catch {
    return ''
  }
}

/** A short text of anything at all, also of things whose own toString throws. */
function textOf(value: unknown): string {
  try {
    return value instanceof Error ? value.message : String(value)
  } catch {
    return 'something without a text'
  }
}
