// (1 + lambda): one parent, `population` mutants of it, then the best of them takes its place unless it is worse.
// The whole generation is proposed, then the island waits. It starts from one founder.
//
// An arrival takes the parent's place by the rules of placement; children in flight are then compared with the new
// parent.

import { z } from 'zod'
import { check } from '../../../shared/check.js'
import type { Stream } from '../../../shared/streams.js'
import type { Birth, Individual, Method, MethodContext, MethodMachine, Placement } from '../types.js'
import { type Judgement, newcomersOf, placeArrivals } from './arrivals.js'
import { founderBirth } from './breeding.js'
import { idsOf, savedCount, savedIds } from './saved.js'
import { byScoreThenId, compareScores } from './selection.js'

const judgement: Judgement = {
  rank: (members) => members.toSorted(byScoreThenId),
  better: (a, b) => compareScores(a, b) < 0,
}

interface State {
  founding: boolean
  /** The parent, or nobody yet. */
  members: Individual[]
  /** Committed births of the generation in progress. */
  offspring: Individual[]
  /** Births proposed in the generation in progress. */
  proposed: number
}

class OnePlusLambdaMachine implements MethodMachine {
  readonly #context: MethodContext
  readonly #state: State

  constructor(context: MethodContext, state: State) {
    check(state.members.length <= 1, 'there is one parent')
    this.#context = context
    this.#state = state
  }

  #due(): number {
    return this.#state.founding ? 1 : this.#context.population
  }

  propose(stream: Stream): Birth | 'wait' {
    const state = this.#state
    if (state.proposed === this.#due()) return 'wait'
    state.proposed++
    if (state.founding) return founderBirth(this.#context.variation, stream)
    const parent = state.members[0]!
    return {
      genome: this.#context.variation.mutate(parent.genome, stream),
      parents: [parent.id],
      origin: 'mutated',
      age: parent.age,
    }
  }

  commit(individual: Individual): void {
    const state = this.#state
    state.offspring.push(individual)
    check(state.offspring.length <= state.proposed, 'only what was proposed is committed')
    if (state.offspring.length < this.#due()) return
    const best = judgement.rank(state.offspring)[0]!
    const parent = state.members[0]
    if (parent === undefined || compareScores(best, parent) <= 0) state.members = [best]
    state.founding = false
    state.offspring = []
    state.proposed = 0
  }

  /** Scores are read where they are used; nothing is kept sorted. */
  reconsider(): void {}

  immigrate(arrivals: readonly Individual[], placement: Placement, stream: Stream): void {
    const strangers = newcomersOf(this.held(), arrivals)
    placeArrivals(this.#state.members, 1, strangers, placement, judgement, stream)
  }

  members(): readonly Individual[] {
    return this.#state.members
  }

  held(): readonly Individual[] {
    return [...this.#state.members, ...this.#state.offspring]
  }

  ranked(): readonly Individual[] {
    return this.#state.members
  }

  save(): unknown {
    const { founding, members, offspring, proposed } = this.#state
    return { founding, members: idsOf(members), offspring: idsOf(offspring), proposed }
  }
}

const savedShape = z.strictObject({
  founding: z.boolean(),
  members: savedIds,
  offspring: savedIds,
  proposed: savedCount,
})

export const onePlusLambda: Method = {
  name: 'one-plus-lambda',
  title: '(1+lambda) evolutionary algorithm',
  summary:
    'mutation only: the best of `population` mutants takes the place of their parent unless it is worse',
  source: 'Rechenberg, Evolutionsstrategie, 1973 (from memory)',
  settings: {},
  defaultPopulation: 8,
  pace: 'generational',
  objectives: 'one',
  create: (context) =>
    new OnePlusLambdaMachine(context, { founding: true, members: [], offspring: [], proposed: 0 }),
  restore: (context, saved, individual) => {
    const state = savedShape.parse(saved)
    return new OnePlusLambdaMachine(context, {
      founding: state.founding,
      members: state.members.map(individual),
      offspring: state.offspring.map(individual),
      proposed: state.proposed,
    })
  },
}
