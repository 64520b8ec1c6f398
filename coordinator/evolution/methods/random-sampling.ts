// Random sampling: every proposal is a fresh random individual. The best `population` are kept as members, for
// statistics only: nobody breeds. A control: what the same budget finds by luck.

import { z } from 'zod'
import type { Stream } from '../../../shared/streams.js'
import type { Birth, Individual, Method, MethodContext, MethodMachine, Placement } from '../types.js'
import { newcomersOf, placeArrivals } from './arrivals.js'
import { founderBirth } from './breeding.js'
import { byParetoRank, paretoJudgement } from './pareto-ranking.js'
import { idsOf, savedIds } from './saved.js'
import { byScoreThenId } from './selection.js'

class RandomSamplingMachine implements MethodMachine {
  readonly #context: MethodContext
  /** Best first. */
  #members: Individual[]

  constructor(context: MethodContext, members: Individual[]) {
    this.#context = context
    this.#members = members
  }

  propose(stream: Stream): Birth {
    return founderBirth(this.#context.variation, stream)
  }

  commit(individual: Individual): void {
    if (this.#context.objectives === 1) this.#insert(individual)
    else this.#members = byParetoRank([...this.#members, individual])
    if (this.#members.length > this.#context.population) this.#members.pop()
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
    this.#members = byParetoRank(this.#members)
  }

  immigrate(arrivals: readonly Individual[], placement: Placement, stream: Stream): void {
    const { population } = this.#context
    if (placement === 'if-better') this.#members.push(...newcomersOf(this.#members, arrivals))
    else placeArrivals(this.#members, population, arrivals, placement, paretoJudgement, stream)
    this.#members = byParetoRank(this.#members).slice(0, population)
  }

  members(): readonly Individual[] {
    return this.#members
  }

  held(): readonly Individual[] {
    return this.#members
  }

  ranked(): readonly Individual[] {
    return this.#members
  }

  save(): unknown {
    return { members: idsOf(this.#members) }
  }
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
