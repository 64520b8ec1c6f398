// Random sampling: every proposal is a fresh random individual. The best `population` are kept as members, for
// statistics only: nobody breeds. A control: what the same budget finds by luck.

import { z } from 'zod'
import type { Stream } from '../../../shared/streams.js'
import { dominates, nonDominatedFronts } from '../pareto.js'
import type { Birth, Individual, Method, MethodContext, MethodMachine, Placement } from '../types.js'
import { newcomersOf, placeArrivals } from './arrivals.js'
import { founderBirth } from './breeding.js'
import { byParetoRank, paretoJudgement } from './pareto-ranking.js'
import { idsOf, savedIds } from './saved.js'
import { byScoreThenId } from './selection.js'

class RandomSamplingMachine implements MethodMachine {
  readonly #context: MethodContext
  /** Best first when they were ranked last. */
  #members: Individual[]
  /** Several objectives: the members of the last front, or undefined when members or estimates have changed. */
  #lastFront: readonly Individual[] | undefined

  constructor(context: MethodContext, members: Individual[]) {
    this.#context = context
    this.#members = members
  }

  propose(stream: Stream): Birth {
    return founderBirth(this.#context.variation, stream)
  }

  commit(individual: Individual): void {
    if (this.#context.objectives === 1) this.#insert(individual)
    else if (this.#isBehindAll(individual)) return
    else this.#rankWith([individual])
    if (this.#members.length > this.#context.population) this.#members.pop()
  }

  /**
   * True when the seats are taken and somebody of the last front dominates the newcomer: it would be a front of its
   * own behind all others and leave at once, and nobody else's rank depends on it. Spares the sorting.
   */
  #isBehindAll(individual: Individual): boolean {
    if (this.#members.length < this.#context.population) return false
    this.#lastFront ??= lastFrontOf(this.#members)
    return this.#lastFront.some((member) => dominates(member.score, individual.score))
  }

  #rankWith(newcomers: readonly Individual[]): void {
    this.#members = byParetoRank([...this.#members, ...newcomers])
    this.#lastFront = undefined
  }

  /** One objective: keeps the order without sorting. */
  #insert(individual: Individual): void {
    let low = 0
    let high = this.#members.length
    while (low < high) {
      const middle = (low + high) >>> 1
      if (byScoreThenId(this.#members[middle]!, individual) < 0) low = middle + 1
      else high = middle
    }
    this.#members.splice(low, 0, individual)
  }

  reconsider(): void {
    this.#rankWith([])
  }

  immigrate(arrivals: readonly Individual[], placement: Placement, stream: Stream): void {
    const { population } = this.#context
    if (placement === 'if-better') this.#members.push(...newcomersOf(this.#members, arrivals))
    else placeArrivals(this.#members, population, arrivals, placement, paretoJudgement, stream)
    this.#rankWith([])
    this.#members.length = Math.min(this.#members.length, population)
  }

  members(): readonly Individual[] {
    return this.#members
  }

  held(): readonly Individual[] {
    return this.#members
  }

  ranked(): readonly Individual[] {
    // With several objectives who left last may have changed how crowded the others are.
    return this.#context.objectives === 1 ? this.#members : byParetoRank(this.#members)
  }

  save(): unknown {
    return { members: idsOf(this.#members) }
  }
}

function lastFrontOf(members: readonly Individual[]): readonly Individual[] {
  const fronts = nonDominatedFronts(members.map((member) => member.score))
  return (fronts.at(-1) ?? []).map((index) => members[index]!)
}

const savedShape = z.strictObject({ members: savedIds })

export const randomSampling: Method = {
  name: 'random-sampling',
  title: 'Random sampling (control)',
  summary: 'every individual is fresh and random: what the same budget finds by luck',
  source: 'common practice, no source',
  settings: {},
  defaultPopulation: 100,
  pace: 'steady',
  objectives: 'any',
  create: (context) => new RandomSamplingMachine(context, []),
  restore: (context, saved, individual) =>
    new RandomSamplingMachine(context, savedShape.parse(saved).members.map(individual)),
}
