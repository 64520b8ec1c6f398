// NSGA-II: parents and offspring together, sorted into non-dominated fronts; the best fronts survive, the last one
// that does not fit is thinned by crowding distance. A whole generation is proposed, then the island waits.
//
// Two points the paper leaves open: both contestants of a tournament are distinct, and crowding distances are taken
// again among the survivors before they breed, so that a restored island computes the same ones.
//
// Arrivals join at once: parents persist from one generation to the next, so they are not lost to a generation
// that is bred already. 'if-better' is the survivor selection itself.

import { z } from 'zod'
import { check } from '../../../shared/check.js'
import type { Stream } from '../../../shared/streams.js'
import { numberSetting } from '../settings.js'
import type { Birth, Individual, Method, MethodContext, MethodMachine, Placement } from '../types.js'
import { newcomersOf, placeArrivals } from './arrivals.js'
import { type BreedingRules, breed, breedingRules, breedingSettings, founderBirth } from './breeding.js'
import {
  byParetoRank,
  crowdedComparison,
  type ParetoRanking,
  paretoJudgement,
  paretoRanking,
} from './pareto-ranking.js'
import { idsOf, savedCount, savedIds } from './saved.js'
import { tournament } from './selection.js'

interface State {
  /** True until the founders are committed. */
  founding: boolean
  members: Individual[]
  /** Committed births of the generation in progress. */
  offspring: Individual[]
  /** Births proposed in the generation in progress. */
  proposed: number
}

class NsgaMachine implements MethodMachine {
  readonly #context: MethodContext
  readonly #breeding: BreedingRules
  readonly #tournamentSize: number
  readonly #state: State
  /** Of the members, or undefined when they or an estimate have changed since. */
  #ranking: ParetoRanking | undefined

  constructor(context: MethodContext, state: State) {
    this.#context = context
    this.#breeding = breedingRules(context)
    this.#tournamentSize = numberSetting(context.settings, 'tournament')
    this.#state = state
  }

  propose(stream: Stream): Birth | 'wait' {
    const state = this.#state
    if (state.proposed === this.#context.population) return 'wait'
    state.proposed++
    if (state.founding) return founderBirth(this.#context.variation, stream)
    this.#ranking ??= paretoRanking(state.members)
    return breed(this.#breeding, state.members, this.#draw, stream)
  }

  readonly #draw = (stream: Stream, except: number): number => {
    const ranking = this.#ranking
    check(ranking !== undefined, 'members are ranked before they breed')
    return tournament(
      this.#state.members.length,
      { size: this.#tournamentSize, distinct: true },
      (a, b) => crowdedComparison(ranking, a, b),
      stream,
      except,
    )
  }

  commit(individual: Individual): void {
    const state = this.#state
    state.offspring.push(individual)
    check(state.offspring.length <= state.proposed, 'only what was proposed is committed')
    if (state.offspring.length < this.#context.population) return
    this.#keepBestOf([...state.members, ...state.offspring])
    state.founding = false
    state.offspring = []
    state.proposed = 0
  }

  #keepBestOf(pool: readonly Individual[]): void {
    this.#state.members = byParetoRank(pool).slice(0, this.#context.population)
    this.#ranking = undefined
  }

  reconsider(): void {
    this.#ranking = undefined
  }

  immigrate(arrivals: readonly Individual[], placement: Placement, stream: Stream): void {
    const strangers = newcomersOf(this.held(), arrivals)
    const { members } = this.#state
    if (placement === 'if-better') this.#keepBestOf([...members, ...strangers])
    else placeArrivals(members, this.#context.population, strangers, placement, paretoJudgement, stream)
    this.#ranking = undefined
  }

  members(): readonly Individual[] {
    return this.#state.members
  }

  held(): readonly Individual[] {
    return [...this.#state.members, ...this.#state.offspring]
  }

  ranked(): readonly Individual[] {
    return byParetoRank(this.#state.members)
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

export const nsgaTwo: Method = {
  name: 'nsga-ii',
  title: 'NSGA-II',
  summary: 'several objectives: non-dominated fronts first, then the less crowded',
  source:
    'Deb, Pratap, Agarwal and Meyarivan, A fast and elitist multiobjective genetic algorithm: NSGA-II, 2002',
  settings: {
    tournament: {
      kind: 'integer',
      default: 2,
      low: 1,
      high: 1000,
      help: 'distinct contestants for each parent, compared by front, then crowding; the paper has 2',
    },
    ...breedingSettings(0.9),
  },
  defaultPopulation: 100,
  pace: 'generational',
  objectives: 'any',
  create: (context) => new NsgaMachine(context, { founding: true, members: [], offspring: [], proposed: 0 }),
  restore: (context, saved, individual) => {
    const state = savedShape.parse(saved)
    return new NsgaMachine(context, {
      founding: state.founding,
      members: state.members.map(individual),
      offspring: state.offspring.map(individual),
      proposed: state.proposed,
    })
  },
}
