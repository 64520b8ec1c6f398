// Golden evaluations: one founder of a problem that comes with the program, evaluated as a worker does.

import { randomGenome } from '../../shared/encodings.js'
import type { Genome } from '../../shared/genome.js'
import type { AnyProblem } from '../../shared/problem.js'
import type { EvaluationResult } from '../../shared/result.js'
import { stream } from '../../shared/streams.js'
import { evaluate } from '../../sim/evaluate.js'

const seed = 20_261_209

function founder(problem: AnyProblem, number: number): Genome {
  return problem.repair(randomGenome(problem.genome, stream(seed, 'founder', 0, number)))
}

export function evaluateFounder(problem: AnyProblem, number: number, replicates: number): EvaluationResult {
  return evaluate(problem, founder(problem, number), seed, true, number, 0, replicates)
}

/** Values of all simulations; a failure is the number of its simulation and its reason, as character codes. */
export function evaluationNumbers(problem: AnyProblem, number: number, replicates: number): number[] {
  const { values, failures } = evaluateFounder(problem, number, replicates)
  const reasons = failures.flatMap(({ simulation, reason }) => [
    simulation,
    ...Array.from(reason, (character) => character.codePointAt(0)!),
  ])
  return [...values, ...reasons]
}
