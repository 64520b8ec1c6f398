// Age-fitness Pareto optimisation: age is one more objective, so that young, still poor lineages live long enough to
// grow up, and every generation brings newcomers of age 0.
//
// What a generation is when proposals overlap. The island waits once, until all founders are committed, and never
// for a generation. A generation ends with every `population` commits after the founders. Then members and the committed offspring of the generation are reduced to the population, and the
// survivors grow one generation older. Among every `population` births after the founders, the first `newcomers`
// are fresh random individuals. Offspring of the generation in progress are no members and do not breed.
//
// Age is how many generations the oldest line of ancestors has spent here. A child counts the generations it spends
// in flight like its parent does, or a wide lookahead would keep lineages young for ever. So that the machine need
// not remember who is in flight, Birth.age carries the age minus the generations so far (a number below or equal
// to 0 that stays true while time passes); the age is made of it at the commit. Newcomers start at 0 there.
//
// Arrivals bring the age of their home island; one without (0) counts as old as the oldest member, or a stranger
// from a method that does not count ages would beat all the young. 'if-better': joins the offspring and competes
// at the end of the generation. The machine writes `age` of the individuals it is given.

import { z } from 'zod'
import type { Stream } from '../../../shared/streams.js'
import { numberSetting } from '../settings.js'
import type { Birth, Individual, Method, MethodContext, MethodMachine, Placement } from '../types.js'
import { survivorsOf } from './age-fitness-reduction.js'
import { newcomersOf, placeArrivals } from './arrivals.js'
import { type BreedingRules, breed, breedingRules, breedingSettings, founderBirth } from './breeding.js'
import { byParetoRank, paretoJudgement } from './pareto-ranking.js'
import { idsOf, savedCount, savedIds } from './saved.js'
import { hasFailed, uniformIndex } from './selection.js'

interface State {
  generation: number
  /** Births proposed so far, founders and newcomers included. */
  births: number
  /** Founders committed; ends at the population. */
  founders: number
  /** Commits of the generation in progress. */
  committed: number
  members: Individual[]
  /** Committed in the generation in progress, and arrivals that compete at its end. */
  offspring: Individual[]
}

class AgeFitnessMachine implements MethodMachine {
  readonly #context: MethodContext
  readonly #breeding: BreedingRules
  readonly #newcomers: number
  readonly #frontMost: number
  readonly #state: State
  /** Members that work, or all when none does; undefined when they have changed since. */
  #breeders: readonly Individual[] | undefined

  constructor(context: MethodContext, state: State) {
    this.#context = context
    this.#breeding = breedingRules(context)
    this.#newcomers = numberSetting(context.settings, 'newcomers')
    // Room for both ends of age and of every objective, whatever the limit.
    const ends = 2 * (context.objectives + 1)
    const limit = Math.floor(numberSetting(context.settings, 'frontLimit') * context.population)
    this.#frontMost = Math.max(limit, ends)
    this.#state = state
  }

  propose(stream: Stream): Birth | 'wait' {
    const state = this.#state
    const { population, variation } = this.#context
    const newcomer = state.births < population || state.births % population < this.#newcomers
    if (state.births >= population && state.founders < population) return 'wait'
    state.births++
    if (newcomer) return founderBirth(variation, stream)
    this.#breeders ??= breedersOf(state.members)
    const birth = breed(this.#breeding, this.#breeders, this.#draw, stream)
    return { ...birth, age: birth.age - state.generation }
  }

  readonly #draw = (stream: Stream, except: number): number =>
    uniformIndex(this.#breeders?.length ?? 0, except, stream)

  commit(individual: Individual, stream: Stream): void {
    const state = this.#state
    individual.age = individual.parents.length === 0 ? 0 : individual.age + state.generation
    const { population } = this.#context
    const isFounder = state.founders < population
    if (isFounder) state.founders++
    if (state.members.length < population) {
      state.members.push(individual)
      this.#breeders = undefined
      return
    }
    state.offspring.push(individual)
    if (!isFounder && ++state.committed === population) this.#endGeneration(stream)
  }

  #endGeneration(stream: Stream): void {
    const state = this.#state
    const pool = [...state.members, ...state.offspring]
    state.members = survivorsOf(pool, this.#context.population, this.#frontMost, stream)
    for (const member of state.members) member.age++
    state.offspring = []
    state.committed = 0
    state.generation++
    this.#breeders = undefined
  }

  reconsider(): void {
    this.#breeders = undefined
  }

  immigrate(arrivals: readonly Individual[], placement: Placement, stream: Stream): void {
    const { members, offspring } = this.#state
    const strangers = newcomersOf(this.held(), arrivals)
    const oldest = members.reduce((age, member) => Math.max(age, member.age), 0)
    for (const stranger of strangers) if (stranger.age === 0) stranger.age = oldest
    const { population } = this.#context
    if (placement === 'if-better' && members.length >= population) offspring.push(...strangers)
    else {
      const seats = Math.max(population, members.length)
      placeArrivals(members, seats, strangers, placement, paretoJudgement, stream)
    }
    this.#breeders = undefined
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
    const { generation, births, founders, committed, members, offspring } = this.#state
    const ages = this.held().map((one) => one.age)
    return {
      generation,
      births,
      founders,
      committed,
      members: idsOf(members),
      offspring: idsOf(offspring),
      ages,
    }
  }
}

function breedersOf(members: readonly Individual[]): readonly Individual[] {
  const working = members.filter((member) => !hasFailed(member))
  return working.length > 0 ? working : [...members]
}

const savedShape = z.strictObject({
  generation: savedCount,
  births: savedCount,
  founders: savedCount,
  committed: savedCount,
  members: savedIds,
  offspring: savedIds,
  /** Of members, then offspring. */
  ages: z.array(z.int().nonnegative()),
})

function restore(
  context: MethodContext,
  saved: unknown,
  individual: (id: number) => Individual,
): MethodMachine {
  const { ages, ...state } = savedShape.parse(saved)
  const members = state.members.map(individual)
  const offspring = state.offspring.map(individual)
  for (const [index, one] of [...members, ...offspring].entries()) one.age = ages[index]!
  return new AgeFitnessMachine(context, { ...state, members, offspring })
}

export const ageFitnessPareto: Method = {
  name: 'age-fitness-pareto',
  title: 'Age-fitness Pareto optimisation',
  summary: 'age is one more objective and newcomers keep coming, so that young lineages can grow up',
  source:
    'Age-Fitness Pareto Optimization, in Genetic Programming Theory and Practice VIII, 2011, 129-146 (abstract read; details from memory)',
  settings: {
    newcomers: {
      kind: 'integer',
      default: 1,
      low: 0,
      high: 1000,
      help: 'fresh random individuals among every `population` births',
    },
    frontLimit: {
      kind: 'number',
      default: 2,
      low: 1,
      high: 100,
      help: 'how many times the population the front of age and objectives may grow to before it is thinned by crowding',
    },
    ...breedingSettings(0.75),
  },
  defaultPopulation: 100,
  pace: 'steady',
  objectives: 'any',
  create: (context) =>
    new AgeFitnessMachine(context, {
      generation: 0,
      births: 0,
      founders: 0,
      committed: 0,
      members: [],
      offspring: [],
    }),
  restore,
}
