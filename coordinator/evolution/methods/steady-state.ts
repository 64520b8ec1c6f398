// Steady state: one child at a time. The population fills with founders; after that every free slot breeds a child
// of the committed members, and every committed child may take one seat, by a replacement rule. Those in flight
// are no members: they neither breed nor can be displaced.
//
// Founders are always proposed first, `population` of them. A founder that finds the seats taken (by arrivals or by
// children that were quicker) enters by the replacement rule like a child.

import { z } from 'zod'
import { check } from '../../../shared/check.js'
import type { Stream } from '../../../shared/streams.js'
import type { Birth, Individual, Method, MethodContext, MethodMachine, Placement } from '../types.js'
import { type Judgement, placeArrivals, replaceAt } from './arrivals.js'
import {
  type BreedingRules,
  breed,
  breedingRules,
  breedingSettings,
  fewestParents,
  founderBirth,
  numberSetting,
  wordSetting,
} from './breeding.js'
import { replacementNamed, replacements } from './replacement.js'
import { idsOf, savedCount, savedIds } from './saved.js'
import { byScoreThenId, compareScores, type TournamentRules, tournament } from './selection.js'

const judgement: Judgement = {
  rank: (members) => members.toSorted(byScoreThenId),
  better: (a, b) => compareScores(a, b) < 0,
}

export interface SteadyRules {
  readonly tournament: TournamentRules
  readonly replacement: string
}

export class SteadyStateMachine implements MethodMachine {
  readonly #context: MethodContext
  readonly #rules: SteadyRules
  readonly #breeding: BreedingRules
  readonly #fewest: number
  /** In order of entry. */
  readonly #members: Individual[]
  #foundersProposed: number

  constructor(context: MethodContext, rules: SteadyRules, members: Individual[], foundersProposed: number) {
    check(members.length <= context.population, 'members fit the population')
    this.#context = context
    this.#rules = rules
    this.#breeding = breedingRules(context)
    this.#fewest = fewestParents(this.#breeding, context.population)
    this.#members = members
    this.#foundersProposed = foundersProposed
  }

  propose(stream: Stream): Birth | 'wait' {
    if (this.#foundersProposed < this.#context.population) {
      this.#foundersProposed++
      return founderBirth(this.#context.variation, stream)
    }
    if (this.#members.length < this.#fewest) return 'wait'
    return breed(this.#breeding, this.#members, this.#draw, stream)
  }

  readonly #prefer = (a: number, b: number): number => compareScores(this.#members[a]!, this.#members[b]!)

  readonly #draw = (stream: Stream, except: number): number =>
    tournament(this.#members.length, this.#rules.tournament, this.#prefer, stream, except)

  commit(individual: Individual, stream: Stream): void {
    if (this.#members.length < this.#context.population) {
      this.#members.push(individual)
      return
    }
    const victim = replacementNamed(this.#rules.replacement).victim(
      this.#members,
      individual,
      this.#rules.tournament.size,
      stream,
    )
    if (victim >= 0) replaceAt(this.#members, victim, individual)
  }

  /** Scores are read where they are used; nothing is kept sorted. */
  reconsider(): void {}

  immigrate(arrivals: readonly Individual[], placement: Placement, stream: Stream): void {
    placeArrivals(this.#members, this.#context.population, arrivals, placement, judgement, stream)
  }

  members(): readonly Individual[] {
    return this.#members
  }

  held(): readonly Individual[] {
    return this.#members
  }

  ranked(): readonly Individual[] {
    return judgement.rank(this.#members)
  }

  save(): unknown {
    return { foundersProposed: this.#foundersProposed, members: idsOf(this.#members) }
  }
}

const savedShape = z.strictObject({ foundersProposed: savedCount, members: savedIds })

/** The machine that save() described; `drift` uses it too. */
export function restoreSteady(
  context: MethodContext,
  rules: SteadyRules,
  saved: unknown,
  individual: (id: number) => Individual,
): SteadyStateMachine {
  const state = savedShape.parse(saved)
  return new SteadyStateMachine(context, rules, state.members.map(individual), state.foundersProposed)
}

function rulesOf(context: MethodContext): SteadyRules {
  return {
    tournament: {
      size: numberSetting(context.settings, 'tournament'),
      distinct: wordSetting(context.settings, 'contestants') === 'distinct',
    },
    replacement: wordSetting(context.settings, 'replace'),
  }
}

export const steadyState: Method = {
  name: 'steady-state',
  title: 'Steady-state evolutionary algorithm',
  summary: 'one child at a time by tournament; each committed child may take one seat',
  source:
    'Syswerda, A study of reproduction in generational and steady-state genetic algorithms, 1991 (from memory); replacement rules: common practice',
  settings: {
    tournament: {
      kind: 'integer',
      default: 3,
      low: 1,
      high: 1000,
      help: 'contestants for each parent; 1 draws parents evenly',
    },
    contestants: {
      kind: 'choice',
      default: 'independent',
      options: ['independent', 'distinct'],
      help: 'whether one member can be drawn twice for the same tournament',
    },
    replace: {
      kind: 'choice',
      default: 'worst',
      options: replacements.map((row) => row.name),
      help: replacements.map((row) => `${row.name}: ${row.help}`).join('; '),
    },
    ...breedingSettings(0.5),
  },
  defaultPopulation: 100,
  pace: 'steady',
  objectives: 'one',
  create: (context) => new SteadyStateMachine(context, rulesOf(context), [], 0),
  restore: (context, saved, individual) => restoreSteady(context, rulesOf(context), saved, individual),
}
