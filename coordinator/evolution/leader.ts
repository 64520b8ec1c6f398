// The best an island has, and the smallest score it has seen of every objective: what a would-be best must beat.

import { columnsOf, scoreOf } from './estimate.js'
import type { ProblemPlan } from './plan.js'
import type { Individual, MethodMachine } from './types.js'

export class Leader {
  /** Score of whoever has none yet; shared, never written to. */
  readonly noScore: Float64Array
  readonly bestScores: Float64Array
  /** How often best scores were counted from nothing: until then they only ever fall. */
  recounts = 0
  #best: Individual | undefined

  constructor(objectives: number, best?: Individual, bestScores?: Float64Array) {
    this.noScore = new Float64Array(objectives).fill(Number.POSITIVE_INFINITY)
    this.bestScores = bestScores?.slice() ?? this.noScore.slice()
    this.#best = best
  }

  get best(): Individual | undefined {
    return this.#best
  }

  /** After a new or changed estimate; true when there is another best. */
  note(individual: Individual, machine: MethodMachine): boolean {
    this.#lower(individual.score)
    const before = this.#best
    // The best's own estimate may have become worse: then another member may be the best.
    if (individual === before) this.#best = [before, ...machine.members()].reduce(better)
    else this.#best = before ? better(before, individual) : individual
    return this.#best !== before
  }

  /** From nothing: after estimates of several were put right. */
  recount(machine: MethodMachine): void {
    this.recounts++
    const candidates = [...(this.#best ? [this.#best] : []), ...machine.members()]
    this.#best = candidates.length > 0 ? candidates.reduce(better) : undefined
    this.bestScores.set(this.noScore)
    for (const { score } of candidates) this.#lower(score)
  }

  #lower(score: Float64Array): void {
    for (let objective = 0; objective < score.length; objective++) {
      if (score[objective]! < this.bestScores[objective]!) this.bestScores[objective] = score[objective]!
    }
  }
}

/** True when these values (no failure among them) would beat a best score. */
export function wouldBeat(problem: ProblemPlan, values: Float64Array, bestScores: Float64Array): boolean {
  const { objectives } = problem
  const single = values.length === columnsOf(problem)
  const score = single ? values : scoreOf(problem, values, 0)
  for (let objective = 0; objective < objectives.length; objective++) {
    const turned = single && objectives[objective]!.direction === 'maximise'
    if ((turned ? 0 - score[objective]! : score[objective]!) < bestScores[objective]!) return true
  }
  return false
}

/** The better of two by the first objective; ties go to the older. */
function better(a: Individual, b: Individual): Individual {
  if (a.score[0]! !== b.score[0]!) return a.score[0]! < b.score[0]! ? a : b
  return a.id <= b.id ? a : b
}
