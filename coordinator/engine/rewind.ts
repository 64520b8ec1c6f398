// A search that used wrong results, begun again: everything its record knows and nobody doubts is used once more, in a
// new record, until something is asked for that is not known. Up to the first wrong commit that is the same search;
// from there the right results take the place of the wrong ones, and whoever continues the new record simulates on.

import { z } from 'zod'
import { equalBytes, resultDigest, sha256 } from '../../shared/digests.js'
import { refuse } from '../../shared/refusals.js'
import type { DispatchFact, EvaluationResult, Executor, WorkItem } from '../../shared/result.js'
import type { SearchTools } from '../evolution/search.js'
import { executorOf, setAsideWorker } from './confirmed.js'
import type { Engine } from './engine.js'
import type { EventRow, Journal, RecordReader } from './ports.js'
import { replayRecord } from './recover.js'
import { Trust } from './trust.js'

/** Facts that changed a search because machines were wrong; with others there is nothing to go back to. */
const undone = new Set(['correction', 'pinned-to-processor', 'set-aside', 'dispute-unsettled'])

const correctionSchema = z.object({
  fact: z.object({
    individual: z.number(),
    firstReplicate: z.number(),
    result: z.object({
      values: z.array(z.number()),
      failures: z.array(z.object({ simulation: z.number(), reason: z.string() })),
    }),
  }),
})

interface Asked {
  readonly individual: number
  readonly firstReplicate: number
  readonly genome: Uint8Array
}

export interface DoubtfulCommit {
  readonly island: number
  readonly commit: number
  readonly evaluation: number
}

/** What a record knows of each evaluation it committed, and who said so. */
export class KnownResults {
  readonly #reader: RecordReader
  readonly #trust = new Trust()
  readonly #asked = new Map<string, Asked>()
  readonly #corrected = new Map<string, EvaluationResult>()
  /** The first commit of every island that used a wrong result, or one that nobody who is believed vouches for. */
  readonly doubtful: DoubtfulCommit[] = []
  /** Who is not believed, to be told to the new record. */
  readonly decided: readonly EventRow[]

  /** @throws Refusal usage, when an operator changed the search on its way */
  constructor(tools: SearchTools, reader: RecordReader) {
    this.#reader = reader
    const events = [...reader.events()]
    const changed = events.find(({ kind, changesSearch }) => changesSearch && !undone.has(kind))
    if (changed) {
      throw refuse('usage', {
        detail: `the search was changed from outside (${changed.kind}: ${changed.sentence}); only a search that nothing but wrong machines changed can be rewound`,
      })
    }
    this.decided = events.filter((event) => this.#trust.recall(event))
    for (const { kind, data } of events) {
      if (kind !== 'correction') continue
      const { individual, firstReplicate, result } = correctionSchema.parse(data).fact
      const values = Float64Array.from(result.values)
      this.#corrected.set(`${individual} ${firstReplicate}`, { values, failures: result.failures })
    }
    const seen = new Set<number>()
    replayRecord(tools, reader, {
      fromStart: true,
      onCommit: (island, { evaluation, individual, firstReplicate, genome }) => {
        const asked = { individual: individual.id, firstReplicate, genome: sha256(genome) }
        this.#asked.set(`${island.number} ${evaluation}`, asked)
        if (seen.has(island.number) || !this.#isDoubtful(island.number, evaluation, asked)) return
        seen.add(island.number)
        this.doubtful.push({ island: island.number, commit: island.counters.commits, evaluation })
      },
    })
  }

  #isDoubtful(island: number, evaluation: number, { individual, firstReplicate }: Asked): boolean {
    const used = this.#reader.arrival(island, evaluation)
    const corrected = this.#corrected.get(`${individual} ${firstReplicate}`)
    if (!used || used.worker === setAsideWorker) return true
    if (corrected && !equalBytes(used.digest, resultDigest(corrected))) return true
    return this.#witnesses(island, evaluation, used.digest).length === 0
  }

  /** The answer to an item, by somebody who gave it and may give it; undefined where the record has none. */
  answer(item: WorkItem): DispatchFact | undefined {
    const { island, evaluation } = item
    const asked = this.#asked.get(`${island} ${evaluation}`)
    const isSame =
      asked?.individual === item.individual &&
      asked.firstReplicate === item.firstReplicate &&
      equalBytes(asked.genome, sha256(item.genome))
    const arrival = isSame ? this.#reader.arrival(island, evaluation) : undefined
    if (!asked || !arrival || arrival.worker === setAsideWorker) return undefined
    const corrected = this.#corrected.get(`${asked.individual} ${asked.firstReplicate}`)
    const result = corrected ?? arrival.result
    const digest = corrected ? resultDigest(corrected) : arrival.digest
    const executor = this.#witnesses(island, evaluation, digest).find(
      ({ worker, host }) => !item.avoid.includes(worker) && !item.avoidHosts?.includes(host),
    )
    if (!executor) return undefined
    return { kind: 'result', item, result, digest, executor, cpuSeconds: 0, wallSeconds: 0 }
  }

  #witnesses(island: number, evaluation: number, digest: Uint8Array): Executor[] {
    const arrival = this.#reader.arrival(island, evaluation)
    return [...(arrival ? [arrival] : []), ...this.#reader.confirmations(island, evaluation)]
      .filter((row) => equalBytes(row.digest, digest) && this.#trust.accepts(row))
      .map(executorOf)
  }
}

/** Drives a fresh engine as far as known results lead, everything durable. Returns how many were used. */
export function rewind(engine: Engine, known: KnownResults, journal: Journal): number {
  const makeDurable = () => {
    for (let rows = engine.rows(); rows; rows = engine.rows()) {
      journal.append(rows)
      engine.appended()
    }
  }
  // What was noted beforehand.
  makeDurable()
  let used = 0
  for (let facts: DispatchFact[] = [], first = true; first || facts.length > 0; first = false) {
    used += facts.length
    engine.take(facts, 0)
    makeDurable()
    if (engine.status() !== 'running') break
    facts = engine.work(itemsAtOnce, 0).flatMap((item) => known.answer(item) ?? [])
  }
  engine.snapshotAll()
  makeDurable()
  return used
}

const itemsAtOnce = 1_024
