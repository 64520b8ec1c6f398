// Facts of the world that change a search, and the stated points at which they enter: after a commit, before an
// epoch's emigrants are chosen, at the end of an epoch, or where an island has ended. Each is an event in the
// record, so that a replay puts it in at the same point.

import { z } from 'zod'
import { refuse } from '../../shared/refusals.js'
import type { Island } from '../evolution/island.js'
import { quotasOf, type Search } from '../evolution/search.js'
import type { EventRow } from './ports.js'

/** Where a fact enters: number is a commit for 'commit' and 'ended', an epoch for 'sending' and 'epoch'. */
export type Stage = 'commit' | 'sending' | 'epoch' | 'ended'

const resultSchema = z.object({
  values: z.array(z.number()),
  failures: z.array(z.object({ simulation: z.number(), reason: z.string() })),
})
const factSchema = z.discriminatedUnion('fact', [
  z.object({ fact: z.literal('amend'), individual: z.number(), firstReplicate: z.number(), result: resultSchema }),
  z.object({ fact: z.literal('finish'), epoch: z.number() }),
  z.object({ fact: z.literal('budget'), simulations: z.number() }),
  z.object({ fact: z.literal('most-replicates'), most: z.number() }),
])
export type WorldFact = z.infer<typeof factSchema>

const dataSchema = z.object({
  stage: z.enum(['commit', 'sending', 'epoch', 'ended']),
  at: z.number(),
  fact: factSchema,
})
export type FactData = z.infer<typeof dataSchema>

/** The facts known for one search, by the point at which they enter. */
export class Schedule {
  readonly #facts = new Map<string, WorldFact[]>()

  /** Adds what an event of the record says; events without a fact are only news. */
  addRecorded(event: EventRow): void {
    if (event.data === null || typeof event.data !== 'object' || !('fact' in event.data)) return
    const parsed = dataSchema.safeParse(event.data)
    if (!parsed.success) {
      throw refuse('record-corrupted', { detail: `event "${event.kind}" has data this version cannot read` })
    }
    this.add(event.island, parsed.data)
  }

  add(island: number, { stage, at, fact }: FactData): void {
    const key = keyOf(island, stage, at)
    this.#facts.set(key, [...(this.#facts.get(key) ?? []), fact])
  }

  /** What enters here, once: it is taken off the schedule. */
  take(island: number, stage: Stage, at: number): readonly WorldFact[] {
    if (this.#facts.size === 0) return []
    const key = keyOf(island, stage, at)
    const facts = this.#facts.get(key) ?? []
    this.#facts.delete(key)
    return facts
  }

  /** Epoch ends are shared by all migrating islands: their facts stay until the last has passed. */
  at(island: number, stage: Stage, at: number): readonly WorldFact[] {
    return this.#facts.get(keyOf(island, stage, at)) ?? []
  }

  /** The epoch this island is ordered to finish with, if any. */
  finishOf(island: number): number | undefined {
    let earliest: number | undefined
    for (const [key, facts] of this.#facts) {
      if (!key.startsWith(`${island} epoch `)) continue
      for (const fact of facts) {
        if (fact.fact === 'finish') earliest = Math.min(earliest ?? Infinity, fact.epoch)
      }
    }
    return earliest
  }

  get isEmpty(): boolean {
    return this.#facts.size === 0
  }
}

function keyOf(island: number, stage: Stage, at: number): string {
  return `${island} ${stage} ${at}`
}

/** Lets a fact act on an island: the rows of what the world may change. */
export function apply(search: Search, island: Island, fact: WorldFact): void {
  switch (fact.fact) {
    case 'amend':
      island.amend({
        individual: fact.individual,
        firstReplicate: fact.firstReplicate,
        result: { values: Float64Array.from(fact.result.values), failures: fact.result.failures },
      })
      return
    case 'finish':
      if (fact.epoch > island.counters.epochsPassed) island.finishAfter(fact.epoch)
      return
    case 'budget': {
      const quota = quotasOf(search.plan, fact.simulations).get(island.number)
      if (quota !== undefined) island.setQuota(quota)
      return
    }
    case 'most-replicates':
      island.setMostReplicates(fact.most)
  }
}
