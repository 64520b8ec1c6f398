// What happens to an individual: it is born, blocks of results are added, a wrong block is put right. Its arrays are
// replaced, never written to: copies of it may be on their way to other islands.

import type { EvaluationResult } from '../../shared/result.js'
import { columnsOf, scoreOf, simulationsPerReplicate } from './estimate.js'
import type { Amendment } from './island-state.js'
import type { ProblemPlan } from './plan.js'
import type { Birth, Block, Individual } from './types.js'

/** Values of whoever has none yet; shared, never written to. */
const noValues = new Float64Array(0)

/** An individual nobody has simulated; `noScore` is +Infinity for every objective. */
export function newborn(id: number, birth: Birth, bornAtCommit: number, noScore: Float64Array): Individual {
  return {
    id,
    genome: birth.genome,
    parents: birth.parents,
    origin: birth.origin,
    bornAtCommit,
    blocks: [],
    values: noValues,
    replicates: 0,
    failedSimulations: 0,
    score: noScore,
    age: birth.age,
  }
}

/** Takes a block of results in and works the score out anew. */
export function addBlock(
  problem: ProblemPlan,
  individual: Individual,
  result: EvaluationResult,
  block: Block,
): void {
  individual.values = joined(individual.values, result.values)
  individual.replicates += block.replicates
  individual.failedSimulations += block.failedSimulations
  individual.blocks = individual.blocks.length === 0 ? [block] : [...individual.blocks, block]
  individual.score = scoreOf(problem, individual.values, individual.failedSimulations)
}

/** The individual with a wrong block put right, or unchanged where the amendment is not about it. */
export function amended(problem: ProblemPlan, individual: Individual, amendment: Amendment): Individual {
  const { individual: id, firstReplicate, result } = amendment
  const start = firstReplicate * columnsOf(problem) * simulationsPerReplicate(problem)
  if (id !== individual.id || individual.values.length < start + result.values.length) return individual
  const values = individual.values.slice()
  values.set(result.values, start)
  const blocks = individual.blocks.map((block) =>
    block.firstReplicate === firstReplicate ? { ...block, failedSimulations: result.failures.length } : block,
  )
  const failedSimulations = blocks.reduce((sum, block) => sum + block.failedSimulations, 0)
  return {
    ...individual,
    values,
    blocks,
    failedSimulations,
    score: scoreOf(problem, values, failedSimulations),
  }
}

/** Rows of `a`, then of `b`. */
export function joined(a: Float64Array, b: Float64Array): Float64Array {
  if (a.length === 0) return b
  const both = new Float64Array(a.length + b.length)
  both.set(a)
  both.set(b, a.length)
  return both
}
