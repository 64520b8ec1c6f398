// How many commits a second the engine alone makes, in memory, with a problem that costs nothing: proposals,
// tickets, acceptance, ordered commit and the island's running SHA-256 (@noble/hashes), nothing durable.

import type { RecordReader } from '../../coordinator/engine/ports.js'
import { openEngine } from '../../coordinator/engine/recover.js'
import { searchTools } from '../../coordinator/evolution/build.js'
import { methodNamed } from '../../coordinator/evolution/methods/index.js'
import { defaultOperators } from '../../coordinator/evolution/operators/index.js'
import type { SearchPlan } from '../../coordinator/evolution/plan.js'
import { defaultSettings } from '../../coordinator/evolution/settings.js'
import { resultDigest } from '../../shared/digests.js'
import { bits } from '../../shared/encodings.js'
import type { DispatchFact, WorkItem } from '../../shared/result.js'

export interface EngineFigures {
  readonly commits: number
  readonly commitsPerSecond: number
  readonly cpuMicrosecondsPerCommit: number
}

const spec = { bits: bits({ length: 16 }) }

export function benchPlan(simulations: number): SearchPlan {
  const method = methodNamed('steady-state')
  const island = (number: number) => ({
    island: number,
    method: method.name,
    settings: defaultSettings(method.settings),
    population: 50,
    lookahead: 32,
    order: 'proposal' as const,
    share: 1,
    operators: defaultOperators(spec),
  })
  return {
    name: 'bench',
    seed: 1,
    semantics: 1,
    problem: {
      name: 'bench',
      version: '1',
      digest: '0'.repeat(64),
      spec,
      objectives: [{ name: 'ones', direction: 'maximise', unit: '1', reduce: 'mean', overCases: 'mean' }],
      measures: [],
      cases: [],
    },
    islands: [1, 2, 3, 4].map(island),
    controls: [],
    migration: { everyRounds: 20, emigrants: 2, topology: 'ring', lag: 1, leave: 'best', arrive: 'worst' },
    replicates: { first: 1, topUp: 0, most: 1, shared: true },
    budget: { simulations },
    confirm: { fraction: 0.02 },
    genomes: 'none',
  }
}

const emptyRecord: RecordReader = {
  snapshot: () => undefined,
  commits: () => [],
  lastCommit: () => undefined,
  arrival: () => undefined,
  mail: () => undefined,
  lastMail: () => undefined,
  events: () => [],
  isConfirmed: () => false,
  confirmations: () => [],
  arrivalsOf: () => [],
  birth: () => undefined,
  totals: () => ({ arrivals: 0, cpuSeconds: 0 }),
}

/** Best of `rounds`. Results are made before the clock starts where they can be: the engine is measured, not they. */
export function benchEngine(commits = 400_000, rounds = 3): EngineFigures {
  const runs = Array.from({ length: rounds }, () => once(commits))
  return runs.reduce((a, b) => (b.commitsPerSecond > a.commitsPerSecond ? b : a))
}

function once(simulations: number): EngineFigures {
  const tools = searchTools(benchPlan(simulations), { expectedCost: () => 1, repair: (genome) => genome })
  // What a record would give back, kept in a byte an evaluation, so that the memory of the bench is not measured.
  const ones = tools.plan.islands.map(() => new Uint8Array(simulations + 1))
  const reader: RecordReader = {
    ...emptyRecord,
    arrival: (island, evaluation) => {
      const stored = ones[island - 1]![evaluation]!
      if (stored === 0) return undefined
      const outcome = outcomes[stored - 1]!
      return { island, evaluation, worker: 'a', host: 'bench', attempt: 1, cpuSeconds: 0, ...outcome }
    },
  }
  const { engine } = openEngine(tools, reader, { leaseMs: Number.POSITIVE_INFINITY, snapshotCommits: 1e9 })
  const started = process.cpuUsage()
  const startedMs = performance.now()
  let facts: DispatchFact[] = []
  for (;;) {
    engine.take(facts, 0)
    const rows = engine.rows()
    if (rows) engine.appended()
    if (engine.status() !== 'running') break
    facts = engine.work(512, 0).map((item) => factOf(item, ones[item.island - 1]!))
  }
  const seconds = (performance.now() - startedMs) / 1000
  const used = process.cpuUsage(started)
  const commits = engine.search.islands.reduce((sum, island) => sum + island.counters.commits, 0)
  return {
    commits,
    commitsPerSecond: commits / seconds,
    cpuMicrosecondsPerCommit: (used.user + used.system) / commits,
  }
}

/** The 17 possible results. */
const outcomes = Array.from({ length: 17 }, (_, count) => {
  const result = { values: Float64Array.of(count), failures: [] }
  return { result, digest: resultDigest(result) }
})
const first = { kind: 'thread', worker: 'a', host: 'bench' } as const
const second = { kind: 'process', worker: 'b', host: 'bench' } as const

function factOf(item: WorkItem, ones: Uint8Array): DispatchFact {
  let count = 0
  for (const byte of item.genome) for (let rest = byte; rest > 0; rest >>= 1) count += rest & 1
  ones[item.evaluation] = count + 1
  const { result, digest } = outcomes[count]!
  const executor = item.purpose === 'evaluate' ? first : second
  return { kind: 'result', item, result, digest, executor, cpuSeconds: 0, wallSeconds: 0 }
}
