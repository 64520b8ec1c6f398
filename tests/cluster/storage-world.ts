// A small search on a real SQLite record whose storage fails on purpose, driven by the real loop. The dispatcher
// is made up: results come late and in another order, both drawn from a seed, so that two runs are alike call by
// call until one of them meets its fault.

import { type LoopEnd, runLoop } from '../../coordinator/engine/loop.js'
import type { Dispatcher, Journal } from '../../coordinator/engine/ports.js'
import { openEngine, replayRecord } from '../../coordinator/engine/recover.js'
import type { SearchPlan } from '../../coordinator/evolution/plan.js'
import { StorageError } from '../../coordinator/record/faulty.js'
import {
  type OpenRecord,
  openRecord,
  readRecord,
  type StoredReader,
  thisProcess,
} from '../../coordinator/record/index.js'
import { type Storage, sqliteStorage } from '../../coordinator/record/storage.js'
import { hex, resultDigest } from '../../shared/digests.js'
import { genomeFromBytes } from '../../shared/encodings.js'
import { Refusal } from '../../shared/refusals.js'
import type { DispatchFact, EvaluationResult, WorkItem } from '../../shared/result.js'
import { stream } from '../../shared/streams.js'
import { pinned } from '../contract/record-fixture.js'
import { fixtureTools, islandPlan, simulated } from '../fixture.js'

/** Two islands, both orders, top-ups, migration, spot checks: about 200 rows in 28 transactions. */
export const small = pinned({
  islands: [
    islandPlan(1, { population: 6, lookahead: 6, share: 3 }),
    islandPlan(2, { method: 'generational', population: 8, lookahead: 8, share: 4, order: 'cost' }),
  ],
  controls: [],
  migration: { everyRounds: 6, emigrants: 1, topology: 'ring', lag: 1, leave: 'best', arrive: 'worst' },
  replicates: { first: 1, topUp: 1, most: 2, shared: true },
  budget: { simulations: 80 },
  confirm: { fraction: 0.05 },
  genomes: 'none',
})
const tools = fixtureTools(small.plan)
const me = thisProcess()

// -------------------------------------------------------------------------------------------- the world

const outcomes = new Map<string, { readonly result: EvaluationResult; readonly digest: Uint8Array }>()

/** Equal work has equal results: made once, because thousands of runs ask for the same. */
function outcomeOf(plan: SearchPlan, { genome, firstReplicate, replicates }: WorkItem) {
  const key = `${hex(genome)} ${firstReplicate} ${replicates}`
  const known = outcomes.get(key)
  if (known) return known
  const result = simulated(plan, genomeFromBytes(plan.problem.spec, genome), firstReplicate, replicates)
  const outcome = { result, digest: resultDigest(result) }
  outcomes.set(key, outcome)
  return outcome
}

/** Answers a drawn part of what it holds at each call, in a drawn order. */
function delayingDispatcher(plan: SearchPlan, seed: number): Dispatcher {
  const draw = stream(seed, 'weather')
  const slots = 14
  let held: WorkItem[] = []
  const answer = (item: WorkItem): DispatchFact => {
    const free = ['w0', 'w1', 'w2', 'w3'].filter((worker) => !item.avoid.includes(worker))
    const executor = { kind: 'thread', worker: free[draw.below(free.length)]!, host: 'h0' } as const
    return { kind: 'result', item, ...outcomeOf(plan, item), executor, cpuSeconds: 1, wallSeconds: 1 }
  }
  return {
    start: async () => {},
    submit: (items) => void held.push(...items),
    facts: async () => {
      const order = [...draw.permutation(held.length)].map((position) => held[position]!)
      const count = Math.min(held.length, 3 + draw.below(8))
      held = order.slice(count)
      return order.slice(0, count).map(answer)
    },
    status: () => ({ slots, outstanding: held.length, wanted: slots - held.length }),
    close: async () => {},
  }
}

/**
 * SQLite on a disk that is full from a given call on, until there is room: whatever would write fails, reading and
 * rolling back still work. Calls are counted as FaultyStorage counts them.
 */
export class FullDisk implements Storage {
  readonly #from: number
  #room = false
  calls = 0
  failures = 0

  constructor(from: number) {
    this.#from = from
  }
  makeRoom(): void {
    this.#room = true
  }

  open(path: string, mode: 'create' | 'write' | 'read'): ReturnType<Storage['open']> {
    this.#count(mode === 'create')
    const database = sqliteStorage.open(path, mode)
    return {
      ...database,
      exec: (sql) => {
        this.#count(!/^(PRAGMA|BEGIN|ROLLBACK)/.test(sql))
        database.exec(sql)
      },
      prepare: (sql) => {
        const statement = database.prepare(sql)
        const writes = !/^(SELECT|PRAGMA|BEGIN|ROLLBACK)/.test(sql)
        const counted = <T>(call: () => T): T => {
          this.#count(writes)
          return call()
        }
        return {
          run: (...values) => counted(() => statement.run(...values)),
          get: (...values) => counted(() => statement.get(...values)),
          all: (...values) => counted(() => statement.all(...values)),
        }
      },
    }
  }

  #count(writes: boolean): void {
    this.calls++
    if (this.#room || !writes || this.calls < this.#from) return
    this.failures++
    throw new StorageError('SQLITE_FULL')
  }
}

// --------------------------------------------------------------------------------------------- one run

/** What a record acknowledged, over all runs on one folder, and what it must still hold. */
export class Acknowledged {
  readonly #arrivals = new Map<string, { island: number; evaluation: number; digest: Uint8Array }>()
  readonly #commits = new Map<number, number>()
  rows = 0
  /** Over all runs; at first those that the record had already. */
  appends: number
  /** What append() has refused, the last one. */
  refused: Refusal | undefined

  constructor(appends = 0) {
    this.appends = appends
  }

  journal(inner: Journal): Journal {
    return {
      append: (rows) => {
        try {
          inner.append(rows)
        } catch (error) {
          if (error instanceof Refusal) this.refused = error
          throw error
        }
        this.appends++
        this.rows += Object.values(rows).reduce((sum, list: readonly unknown[]) => sum + list.length, 0)
        for (const row of rows.arrivals) this.#arrivals.set(`${row.island} ${row.evaluation}`, row)
        for (const { island, commit } of rows.commits) this.#commits.set(island, commit)
      },
    }
  }

  /** What the record lacks or has twice, in words; empty when it keeps its word. */
  missing(reader: StoredReader): string[] {
    const lacks: string[] = []
    const { appends } = reader.totals()
    // An append whose answer was lost may be there: one at most, because nothing follows it.
    if (appends < this.appends || appends > this.appends + 1)
      lacks.push(`${appends} of ${this.appends} appends`)
    for (const { island, evaluation, digest } of this.#arrivals.values()) {
      const found = reader.arrival(island, evaluation)
      if (!found || hex(found.digest) !== hex(digest)) lacks.push(`arrival ${island} ${evaluation}`)
    }
    for (const [island, commit] of this.#commits) {
      if ((reader.lastCommit(island)?.commit ?? 0) < commit) lacks.push(`commit ${island} ${commit}`)
    }
    this.appends = appends
    return lacks
  }
}

export interface Run {
  readonly end: LoopEnd
  readonly digest: string
  readonly arrivals: number
  readonly impurities: readonly string[]
  /** How often the loop waited for room. */
  readonly pauses: number
}

export interface RunOptions {
  readonly acknowledged: Acknowledged
  readonly storage?: Storage
  /** Sees the record as it was found. */
  readonly onOpen?: (record: OpenRecord) => void
  /** Called whenever the loop waits for room on the disk; the second argument asks it to stop. */
  readonly onPause?: (pauses: number, stop: () => void) => void
  /** Called after every durable step. */
  readonly onStep?: () => void
}

/** Opens the record of a folder, made when there is none, and runs its search to its end. @throws Refusal as `run` would */
export async function runOn(folder: string, options: RunOptions): Promise<Run> {
  const record = openRecord(folder, {
    create: small,
    holder: me,
    nonce: 'f'.repeat(32),
    clock: () => 1_700_000_000_000,
    isRunning: () => false,
    ...(options.storage ? { storage: options.storage } : {}),
  })
  try {
    options.onOpen?.(record)
    return await search(record, options)
  } finally {
    record.close()
  }
}

async function search(record: OpenRecord, { acknowledged, onPause, onStep }: RunOptions): Promise<Run> {
  const { engine } = openEngine(tools, record.reader, {
    leaseMs: Number.POSITIVE_INFINITY,
    snapshotCommits: 20,
  })
  const stop = new AbortController()
  let pauses = 0
  const end = await runLoop(engine, {
    journal: acknowledged.journal(record.journal),
    dispatcher: delayingDispatcher(small.plan, 7),
    nowMs: () => 0,
    pause: async () => {
      pauses++
      onPause?.(pauses, () => stop.abort())
    },
    signal: stop.signal,
    onStep: () => onStep?.(),
  })
  return {
    end,
    digest: hex(engine.search.digest()),
    arrivals: record.reader.totals().arrivals,
    impurities: engine.impurities(),
    pauses,
  }
}

/** Checks the chain from end to end and derives the search again from its journal alone. */
export function rederived(folder: string): { readonly digest: string; readonly commits: number } {
  const record = readRecord(folder)
  try {
    const { intact, sentences } = record.verify()
    if (!intact) throw new Error(sentences.join(' '))
    const { search, replay } = replayRecord(tools, record.reader, { fromStart: true })
    return { digest: hex(search.digest()), commits: replay.commits }
  } finally {
    record.close()
  }
}
