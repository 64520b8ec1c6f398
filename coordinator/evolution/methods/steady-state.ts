// Steady state: one child at a time. The population fills with founders; after that every free slot breeds a child
// of the committed members, and every committed child may take one seat, by a replacement rule. Those in flight
// are no members: they neither breed nor can be displaced.
//
// Nobody breeds before the last founder is committed: children of the first few would fill the lookahead, and
// founders that happen to be proposed early (or to be cheap) would take over a flat landscape. That costs idle
// slots once in a search. A founder that finds the seats taken by arrivals enters by the replacement rule.

import { z } from 'zod'
import { check } from '../../../shared/check.js'
import type { Stream } from '../../../shared/streams.js'
import { choiceSetting, numberSetting } from '../settings.js'
import type { Birth, Individual, Method, MethodContext, MethodMachine, Placement } from '../types.js'
import { type Judgement, placeArrivals, replaceAt } from './arrivals.js'
import { type BreedingRules, breed, breedingRules, breedingSettings, founderBirth } from './breeding.js'
import { replacementNamed, replacements } from './replacement.js'
import { idsOf, savedCount, savedIds } from './saved.js'
import { byScoreThenId, compareScores, type TournamentRules, tournament } from './selection.js'

const judgement: Judgement = {
  rank: (members) => members.toSorted(byScoreThenId),
  better: (a, b) => compareScores(a, b) < 0,
}

/** How many founders were proposed and committed; both end at the population. */
interface Founders {
  proposed: number
  committed: number
}

export interface SteadyRules {
  readonly tournament: TournamentRules
  readonly replacement: string
}

class SteadyStateMachine implements MethodMachine {
  readonly #context: MethodContext
  readonly #rules: SteadyRules
  readonly #breeding: BreedingRules
  /** In order of entry. */
  readonly #members: Individual[]
  readonly #founders: Founders

  constructor(context: MethodContext, rules: SteadyRules, members: Individual[], founders: Founders) {
    check(members.length <= context.population, 'members fit the population')
    this.#context = context
    this.#rules = rules
    this.#breeding = breedingRules(context)
    this.#members = members
    this.#founders = founders
  }

  propose(stream: Stream): Birth | 'wait' {
    const { population, variation } = this.#context
    if (this.#founders.proposed < population) {
      this.#founders.proposed++
      return founderBirth(variation, stream)
    }
    if (this.#founders.committed < population) return 'wait'
    return breed(this.#breeding, this.#members, this.#draw, stream)
  }

  readonly #prefer = (a: number, b: number): number => compareScores(this.#members[a]!, this.#members[b]!)

  readonly #draw = (stream: Stream, except: number): number =>
    tournament(this.#members.length, this.#rules.tournament, this.#prefer, stream, except)

  commit(individual: Individual, stream: Stream): void {
    if (this.#founders.committed < this.#context.population) this.#founders.committed++
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
    return { founders: { ...this.#founders }, members: idsOf(this.#members) }
  }
}

const savedShape = z.strictObject({
  founders: z.strictObject({ proposed: savedCount, committed: savedCount }),
  members: savedIds,
})

/** A new machine; `drift` uses it too. */
export function createSteady(context: MethodContext, rules: SteadyRules): MethodMachine {
  return new SteadyStateMachine(context, rules, [], { proposed: 0, committed: 0 })
}

/** The machine that save() described. */
export function restoreSteady(
  context: MethodContext,
  rules: SteadyRules,
  saved: unknown,
  individual: (id: number) => Individual,
): MethodMachine {
  const state = savedShape.parse(saved)
  return new SteadyStateMachine(context, rules, state.members.map(individual), state.founders)
}

function rulesOf(context: MethodContext): SteadyRules {
  return {
    tournament: {
      size: numberSetting(context.settings, 'tournament'),
      distinct: choiceSetting(context.settings, 'contestants') === 'distinct',
    },
    replacement: choiceSetting(context.settings, 'replace'),
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
  create: (context) => createSteady(context, rulesOf(context)),
  restore: (context, saved, individual) => restoreSteady(context, rulesOf(context), saved, individual),
}
