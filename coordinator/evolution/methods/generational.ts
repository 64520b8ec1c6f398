// Generational: a whole generation is proposed, then the island waits until all of it is committed; then the
// offspring and the elites of the old generation are the new one. Generation 0 are founders.
//
// A generation g > 0 has population - elites births. Arrivals wait for the end of the generation, because most
// children of the current one are bred already; then they are placed among the new generation.

import { z } from 'zod'
import { check } from '../../../shared/check.js'
import type { Stream } from '../../../shared/streams.js'
import { choiceSetting, numberSetting } from '../settings.js'
import type { Birth, Individual, Method, MethodContext, MethodMachine, Placement } from '../types.js'
import { type Judgement, newcomersOf, placeArrivals } from './arrivals.js'
import { type BreedingRules, breed, breedingRules, breedingSettings, founderBirth } from './breeding.js'
import { idsOf, savedCount, savedIds } from './saved.js'
import {
  byScoreThenId,
  compareScores,
  linearRank,
  tournament,
  truncatedRank,
  uniformIndex,
} from './selection.js'

const judgement: Judgement = {
  rank: (members) => members.toSorted(byScoreThenId),
  better: (a, b) => compareScores(a, b) < 0,
}

interface Waiting {
  readonly placement: Placement
  readonly arrivals: readonly Individual[]
}
interface State {
  /** The generation that breeds, best first when it was made. */
  members: readonly Individual[]
  /** Committed births of the generation in progress. */
  offspring: Individual[]
  waiting: Waiting[]
  /** Births proposed in the generation in progress. */
  proposed: number
}

/** Draws a parent: an index into members ranked best first, never `except`. */
type ParentRule = (
  context: MethodContext,
) => (ranked: readonly Individual[], stream: Stream, except: number) => number

/** How parents are drawn: rows of a table. */
const parentRules: { readonly [name: string]: ParentRule } = {
  tournament: (context) => {
    const rules = {
      size: numberSetting(context.settings, 'tournament'),
      distinct: choiceSetting(context.settings, 'contestants') === 'distinct',
    }
    return (ranked, stream, except) =>
      tournament(ranked.length, rules, (a, b) => compareScores(ranked[a]!, ranked[b]!), stream, except)
  },
  'linear-ranking': (context) => {
    const pressure = numberSetting(context.settings, 'pressure')
    return (ranked, stream, except) =>
      mateOf(except, ranked.length, stream, (n) => linearRank(n, pressure, stream))
  },
  truncation: (context) => {
    const fraction = numberSetting(context.settings, 'fraction')
    return (ranked, stream, except) =>
      mateOf(except, ranked.length, stream, (n) => truncatedRank(n, fraction, stream))
  },
}

/** Once more when the first parent is drawn again, then anybody else: a bounded number of draws. */
function mateOf(except: number, count: number, stream: Stream, draw: (count: number) => number): number {
  for (let tries = 0; tries < 16; tries++) {
    const index = draw(count)
    if (index !== except) return index
  }
  return uniformIndex(count, except, stream)
}

class GenerationalMachine implements MethodMachine {
  readonly #context: MethodContext
  readonly #breeding: BreedingRules
  readonly #elites: number
  readonly #parent: ReturnType<ParentRule>
  readonly #state: State
  /** Members best first, or undefined when an estimate has changed since. */
  #ranked: readonly Individual[] | undefined

  constructor(context: MethodContext, state: State) {
    const rule = parentRules[choiceSetting(context.settings, 'parents')]
    check(rule !== undefined, 'the way parents are drawn is a row of the table')
    this.#context = context
    this.#breeding = breedingRules(context)
    // At least one birth a generation, or the island would stand still.
    this.#elites = Math.min(numberSetting(context.settings, 'elites'), context.population - 1)
    this.#parent = rule(context)
    this.#state = state
  }

  /** Births of the generation in progress. */
  #due(): number {
    return this.#context.population - (this.#state.members.length === 0 ? 0 : this.#elites)
  }

  propose(stream: Stream): Birth | 'wait' {
    if (this.#state.proposed === this.#due()) return 'wait'
    this.#state.proposed++
    if (this.#state.members.length === 0) return founderBirth(this.#context.variation, stream)
    const ranked = this.ranked()
    return breed(this.#breeding, ranked, (s, except) => this.#parent(ranked, s, except), stream)
  }

  commit(individual: Individual, stream: Stream): void {
    this.#state.offspring.push(individual)
    check(this.#state.offspring.length <= this.#state.proposed, 'only what was proposed is committed')
    if (this.#state.offspring.length === this.#due()) this.#turn(stream)
  }

  #turn(stream: Stream): void {
    const state = this.#state
    const next = [...this.ranked().slice(0, this.#elites), ...state.offspring]
    for (const { placement, arrivals } of state.waiting) {
      placeArrivals(next, this.#context.population, arrivals, placement, judgement, stream)
    }
    check(next.length === this.#context.population, 'a generation fills the population')
    state.members = next
    state.offspring = []
    state.waiting = []
    state.proposed = 0
    this.#ranked = undefined
  }

  reconsider(): void {
    this.#ranked = undefined
  }

  immigrate(arrivals: readonly Individual[], placement: Placement): void {
    const strangers = newcomersOf(this.held(), arrivals)
    if (strangers.length > 0) this.#state.waiting.push({ placement, arrivals: strangers })
  }

  members(): readonly Individual[] {
    return this.#state.members
  }

  held(): readonly Individual[] {
    const { members, offspring, waiting } = this.#state
    return [...members, ...offspring, ...waiting.flatMap((one) => one.arrivals)]
  }

  ranked(): readonly Individual[] {
    this.#ranked ??= judgement.rank(this.#state.members)
    return this.#ranked
  }

  save(): unknown {
    return {
      members: idsOf(this.#state.members),
      offspring: idsOf(this.#state.offspring),
      waiting: this.#state.waiting.map((one) => ({
        placement: one.placement,
        arrivals: idsOf(one.arrivals),
      })),
      proposed: this.#state.proposed,
    }
  }
}

const savedShape = z.strictObject({
  members: savedIds,
  offspring: savedIds,
  waiting: z.array(
    z.strictObject({ placement: z.enum(['worst', 'random', 'if-better']), arrivals: savedIds }),
  ),
  proposed: savedCount,
})

export const generational: Method = {
  name: 'generational',
  title: 'Generational evolutionary algorithm',
  summary: 'a whole generation is bred, evaluated, and takes the place of the old one, save for a few elites',
  source: 'Goldberg, Genetic algorithms in search, optimization, and machine learning, 1989 (from memory)',
  settings: {
    elites: {
      kind: 'integer',
      default: 1,
      low: 0,
      high: 100000,
      help: 'best members that stay for the next generation, at most the population less one; equal scores: the older stay',
    },
    parents: {
      kind: 'choice',
      default: 'tournament',
      options: Object.keys(parentRules),
      help: 'how parents are drawn',
    },
    tournament: {
      kind: 'integer',
      default: 2,
      low: 1,
      high: 1000,
      help: 'contestants for each parent (parents: tournament); 1 draws parents evenly',
    },
    contestants: {
      kind: 'choice',
      default: 'independent',
      options: ['independent', 'distinct'],
      help: 'whether one member can be drawn twice for the same tournament',
    },
    pressure: {
      kind: 'number',
      default: 1.5,
      low: 1,
      high: 2,
      help: 'children expected of the best rank (parents: linear-ranking)',
    },
    fraction: {
      kind: 'number',
      default: 0.5,
      low: 0.001,
      high: 1,
      help: 'share of the best that breeds, evenly (parents: truncation)',
    },
    ...breedingSettings(0.7),
  },
  defaultPopulation: 100,
  pace: 'generational',
  objectives: 'one',
  create: (context) =>
    new GenerationalMachine(context, { members: [], offspring: [], waiting: [], proposed: 0 }),
  restore: (context, saved, individual) => {
    const state = savedShape.parse(saved)
    return new GenerationalMachine(context, {
      members: state.members.map(individual),
      offspring: state.offspring.map(individual),
      waiting: state.waiting.map((one) => ({
        placement: one.placement,
        arrivals: one.arrivals.map(individual),
      })),
      proposed: state.proposed,
    })
  },
}
