// Facts of the world that change a search, and the stated points at which they enter: while an island waits for the
// result after a given commit (or has ended there), before an epoch's emigrants are chosen, or at the end of an
// epoch. Each is an event in the record, so that a replay puts it in at the same point.

import { z } from 'zod'
import { refuse } from '../../shared/refusals.js'
import type { Island } from '../evolution/island.js'
import type { IslandPlan } from '../evolution/plan.js'
import type { Search } from '../evolution/search.js'
import type { EventRow } from './ports.js'

/** Where a fact enters: its number is a count of commits for 'waiting', an epoch for 'sending' and 'epoch'. */
export type Stage = 'waiting' | 'sending' | 'epoch'

const resultSchema = z.object({
  values: z.array(z.number()),
  failures: z.array(z.object({ simulation: z.number(), reason: z.string() })),
})
const factSchema = z.discriminatedUnion('fact', [
  z.object({
    fact: z.literal('amend'),
    individual: z.number(),
    firstReplicate: z.number(),
    result: resultSchema,
  }),
  z.object({ fact: z.literal('finish'), epoch: z.number() }),
  /** `silentFrom` > 0: the island had ended and sent nothing from that epoch on; it goes on after `epoch`. */
  z.object({
    fact: z.literal('budget'),
    simulations: z.number(),
    /** How many islands there were to share it. */
    islands: z.number(),
    epoch: z.number(),
    silentFrom: z.number(),
  }),
  z.object({ fact: z.literal('most-replicates'), most: z.number() }),
  /** Islands added, paused or continued; the plans of added ones are checked when the search file is read. */
  z.object({
    fact: z.literal('islands'),
    epoch: z.number(),
    active: z.array(z.number()),
    simulations: z.number(),
    islands: z.number(),
    added: z.array(
      z.custom<IslandPlan>((plan) => typeof plan === 'object' && plan !== null && 'island' in plan),
    ),
  }),
])
export type WorldFact = z.infer<typeof factSchema>

const dataSchema = z.object({
  stage: z.enum(['waiting', 'sending', 'epoch']),
  at: z.number(),
  fact: factSchema,
  /** Stated again by an island that had ended with this epoch: what was stated for later ones is void. */
  endedWith: z.number().optional(),
})
export type FactData = z.infer<typeof dataSchema>

/** A fact with how it is told. */
export interface StatedFact {
  readonly fact: WorldFact
  readonly kind: string
  readonly sentence: string
}

/** The facts known for one search, by the point at which they enter. */
export class Schedule {
  readonly #facts = new Map<string, StatedFact[]>()

  /** Adds what an event of the record says; events without a fact are only news. */
  addRecorded(event: EventRow): FactData | undefined {
    if (event.data === null || typeof event.data !== 'object' || !('fact' in event.data)) return undefined
    const parsed = dataSchema.safeParse(event.data)
    if (!parsed.success) {
      throw refuse('record-corrupted', { detail: `event "${event.kind}" has data this version cannot read` })
    }
    const { endedWith } = parsed.data
    if (endedWith !== undefined) this.takeAfter(event.island, endedWith)
    this.add(event.island, parsed.data, event)
    return parsed.data
  }

  add(
    island: number,
    { stage, at, fact }: FactData,
    { kind, sentence }: Pick<EventRow, 'kind' | 'sentence'>,
  ): void {
    const key = keyOf(island, stage, at)
    this.#facts.set(key, [...(this.#facts.get(key) ?? []), { fact, kind, sentence }])
  }

  /** The next fact that enters here, in the order they were stated; it is taken off the schedule. */
  next(island: number, stage: Stage, at: number): WorldFact | undefined {
    if (this.#facts.size === 0) return undefined
    const key = keyOf(island, stage, at)
    const facts = this.#facts.get(key)
    const stated = facts?.shift()
    if (facts?.length === 0) this.#facts.delete(key)
    return stated?.fact
  }

  /** Facts that a snapshot already has in it are not let in again. */
  skip(island: Island): void {
    const { commits, epochsPassed, factsWaiting, factsSending } = island.counters
    for (let n = 0; n < factsWaiting; n++) this.next(island.number, 'waiting', commits)
    for (let n = 0; n < factsSending; n++) this.next(island.number, 'sending', epochsPassed + 1)
  }

  /** Takes off the schedule what was stated for ends of epochs after this one, by epoch; finishes stay. */
  takeAfter(island: number, epoch: number): StatedFact[] {
    const prefix = `${island} epoch `
    const epochs = [...this.#facts.keys()]
      .filter((key) => key.startsWith(prefix) && Number(key.slice(prefix.length)) > epoch)
      .map((key) => Number(key.slice(prefix.length)))
    return epochs
      .sort((a, b) => a - b)
      .flatMap((at) => {
        const key = keyOf(island, 'epoch', at)
        const facts = this.#facts.get(key)!
        const finishes = facts.filter(({ fact }) => fact.fact === 'finish')
        if (finishes.length > 0) this.#facts.set(key, finishes)
        else this.#facts.delete(key)
        return facts.filter(({ fact }) => fact.fact !== 'finish')
      })
  }
}

function keyOf(island: number, stage: Stage, at: number): string {
  return `${island} ${stage} ${at}`
}

type Actions = {
  readonly [Kind in WorldFact['fact']]: (
    search: Search,
    island: Island,
    fact: Extract<WorldFact, { fact: Kind }>,
  ) => void
}

/** What each kind of fact does to an island. */
const actions: Actions = {
  amend: (_search, island, { individual, firstReplicate, result }) =>
    island.amend({
      individual,
      firstReplicate,
      result: { values: Float64Array.from(result.values), failures: result.failures },
    }),
  finish: (_search, island, { epoch }) => {
    if (epoch === island.counters.epochsPassed) island.end()
  },
  budget: (search, island, { simulations, islands, epoch }) => {
    island.setQuota(search.quotas(simulations, islands).get(island.number) ?? island.quota)
    if (island.ended) search.resume(island, epoch)
  },
  'most-replicates': (_search, island, { most }) => island.setMostReplicates(most),
  islands: (search, island, { epoch, active, simulations, islands }) => {
    island.setQuota(search.quotas(simulations, islands).get(island.number) ?? island.quota)
    if (island.isControl) return
    if (!active.includes(island.number)) search.pause(island, epoch)
    else if (island.paused) island.continueAfter(epoch)
  },
}

/** Lets a fact act on an island. */
export function apply(search: Search, island: Island, stage: Stage, fact: WorldFact): void {
  if (stage !== 'epoch') island.noteFact(stage)
  const act = actions[fact.fact] as (search: Search, island: Island, fact: WorldFact) => void
  act(search, island, fact)
}
