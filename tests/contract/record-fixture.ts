// Rows for tests of the record: a made-up search in which results arrive out of order and are committed in
// batches. Everything follows from the seed. Also the whole content of a record as one value to compare.

import { createHash, randomBytes } from 'node:crypto'
import { existsSync, mkdtempSync, rmSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import type { Append, ArrivalRow, BirthRow, CommitRow, MailRow } from '../../coordinator/engine/ports.js'
import type { SearchPlan } from '../../coordinator/evolution/plan.js'
import type { Individual } from '../../coordinator/evolution/types.js'
import {
  type OpenOptions,
  type OpenRecord,
  openRecord,
  type Pinned,
  type StoredReader,
  thisProcess,
} from '../../coordinator/record/index.js'
import { resultDigest } from '../../shared/digests.js'
import { idOf } from '../../shared/ids.js'
import type { EvaluationResult } from '../../shared/result.js'
import { type Stream, stream } from '../../shared/streams.js'
import { mixedPlan } from '../fixture.js'

export const empty: Append = {
  arrivals: [],
  confirmations: [],
  births: [],
  commits: [],
  mail: [],
  events: [],
  snapshots: [],
}
export const rows = (some: Partial<Append>): Append => ({ ...empty, ...some })

export function digestOf(...words: readonly (string | number)[]): Uint8Array {
  return Uint8Array.from(createHash('sha256').update(words.join(' ')).digest())
}

export function arrival(
  island: number,
  evaluation: number,
  result: EvaluationResult,
  some: Partial<ArrivalRow> = {},
): ArrivalRow {
  return {
    island,
    evaluation,
    worker: 'host-a/4711/t1',
    host: 'host-a',
    attempt: 1,
    cpuSeconds: 0.25,
    result,
    digest: resultDigest(result),
    ...some,
  }
}
export const good = (...values: number[]): EvaluationResult => ({
  values: Float64Array.from(values),
  failures: [],
})

export function individual(island: number, number: number, draw: Stream): Individual {
  return {
    id: idOf(island, number),
    genome: {
      place: Float64Array.from([draw.normal(), draw.normal(), 0]),
      size: Int32Array.from([draw.below(10), -draw.below(10)]),
      legs: Uint8Array.from([1, 0, 1]),
    },
    parents: number > 2 ? [idOf(island, number - 1), idOf(island + 1, number - 2)] : [],
    origin: number > 2 ? 'crossed-mutated' : 'founder',
    bornAtCommit: number - 1,
    blocks: [{ island, evaluation: number, firstReplicate: 0, replicates: 2, failedSimulations: 1 }],
    values: Float64Array.from([draw.uniform(), 0, 1e-300, Number.MAX_VALUE, 0, 0]),
    replicates: 2,
    failedSimulations: 1,
    score: Float64Array.from([Number.POSITIVE_INFINITY, -draw.uniform()]),
    age: number % 7,
  }
}

export interface MadeUp {
  readonly islands?: number
  readonly batches?: number
  /** Evaluations an island adds in a batch. */
  readonly perBatch?: number
  readonly numbers?: number
  readonly genomes?: boolean
}

/** Appends of a search: each batch brings results of every island in a shuffled order and commits the last batch's. */
export function* madeUpSearch(seed: number, options: MadeUp = {}): Iterable<Append> {
  const { islands = 3, batches = 10, perBatch = 8, numbers = 3, genomes = true } = options
  for (let batch = 1; batch <= batches; batch++) {
    const draw = stream(seed, 'spare', batch, 0, 0)
    const arrivals: ArrivalRow[] = []
    const commits: CommitRow[] = []
    const births: BirthRow[] = []
    for (let island = 1; island <= islands; island++) {
      for (let i = 0; i < perBatch; i++) {
        const evaluation = (batch - 1) * perBatch + i + 1
        arrivals.push(madeUpArrival(island, evaluation, numbers, draw))
        if (genomes) births.push(madeUpBirth(island, evaluation, draw))
      }
      commits.push(...madeUpCommits(island, batch, perBatch))
    }
    const order = draw.permutation(arrivals.length)
    const shuffled = arrivals.map((_, i) => arrivals[order[i]!]!)
    yield { ...empty, arrivals: shuffled, births, commits, ...madeUpRest(batch, islands, perBatch, draw) }
  }
}

function madeUpArrival(island: number, evaluation: number, numbers: number, draw: Stream): ArrivalRow {
  const values = Float64Array.from({ length: numbers }, () => draw.normal())
  const failed = draw.chance(1, 20)
  const failures = failed ? [{ simulation: 0, reason: 'the puck left the culvert: “sideways”' }] : []
  const result = { values: failed ? values.fill(0) : values, failures }
  const thread = draw.below(7)
  return arrival(island, evaluation, result, {
    worker: `host-${thread % 3}/4711/t${thread}`,
    host: `host-${thread % 3}`,
    ...(thread % 3 === 0 ? {} : { processor: `x64 class ${thread % 3}` }),
    attempt: 1 + draw.below(3),
    cpuSeconds: draw.uniform(),
  })
}

function madeUpBirth(island: number, number: number, draw: Stream): BirthRow {
  return {
    id: idOf(island, number),
    parents: number > 1 ? [idOf(island, number - 1)] : [],
    origin: 'mutated',
    atCommit: number - 1,
    genome: Uint8Array.from({ length: 16 }, () => draw.below(256)),
  }
}

/** Odd islands commit in order of proposal, even ones each pair swapped. */
function madeUpCommits(island: number, batch: number, perBatch: number): CommitRow[] {
  return Array.from({ length: perBatch }, (_, i) => {
    const commit = (batch - 1) * perBatch + i + 1
    const evaluation = island % 2 === 1 ? commit : commit % 2 === 1 ? commit + 1 : commit - 1
    return { island, commit, evaluation, digest: digestOf('commit', island, commit) }
  })
}

function madeUpRest(batch: number, islands: number, perBatch: number, draw: Stream): Partial<Append> {
  const island = 1 + (batch % islands)
  const commit = batch * perBatch
  const mail: MailRow[] =
    batch % 2 === 0
      ? [
          {
            island,
            epoch: batch,
            atCommit: commit,
            ended: false,
            emigrants: [individual(island, batch, draw), individual(island, batch + 1, draw)],
          },
        ]
      : []
  return {
    mail,
    confirmations: [
      {
        island,
        evaluation: commit,
        worker: 'host-9/1/p1',
        host: 'host-9',
        by: batch % 3 === 0 ? 'host' : 'process',
        digest: digestOf('confirmation', batch),
        agrees: batch % 4 !== 0,
      },
    ],
    events:
      batch % 3 === 0
        ? [
            {
              kind: 'note',
              island,
              atCommit: commit,
              epoch: 0,
              changesSearch: batch % 2 === 0,
              sentence: `Batch ${batch} – ünïcode “fine”.`,
              data: { batch, exact: 0.1 + 0.2 },
            },
          ]
        : [],
    snapshots: [{ island, commit, digest: digestOf('commit', island, commit), state: madeUpState(batch) }],
  }
}

export function madeUpState(batch: number): unknown {
  return {
    batch,
    numbers: Float64Array.from({ length: 40 }, (_, i) =>
      i === 0 ? -0 : i === 1 ? Number.NEGATIVE_INFINITY : batch / i,
    ),
    map: new Map([[batch, 'x']]),
    nothing: undefined,
  }
}

/** Everything a reader tells, as one plain value. `evaluations` and `ids` are asked for one by one as well. */
export function contentOf(reader: StoredReader, islands: number, evaluations: number): unknown {
  const plain = (row: ArrivalRow) => ({ ...row, digest: row.digest, result: { ...row.result } })
  const numbers = Array.from({ length: evaluations }, (_, i) => i + 1)
  const all = Array.from({ length: islands }, (_, i) => i + 1).map((island) => ({
    arrivals: [...reader.arrivals(island)].map(plain),
    oneByOne: numbers.map((n) => reader.arrival(island, n)).map((row) => row && plain(row)),
    commits: [...reader.commits(island, 0)],
    last: reader.lastCommit(island),
    mail: numbers.map((epoch) => reader.mail(island, epoch)).filter((mail) => mail !== undefined),
    lastMail: reader.lastMail(island),
    confirmations: numbers.flatMap((n) => reader.confirmations(island, n)),
    confirmed: numbers.filter((n) => reader.isConfirmed(island, n)),
    births: numbers.map((n) => reader.birth(idOf(island, n))),
  }))
  const { arrivals, cpuSeconds } = reader.totals()
  return { all, events: [...reader.events()], arrivals, cpuSeconds, islands: reader.islands() }
}

// ------------------------------------------------------------------------------------- real records

export const pluginCode = new TextEncoder().encode('export default { name: "fixture" }\n// ünïcode\n')
export function pinned(changes: Partial<SearchPlan> = {}): Pinned {
  const plan = mixedPlan(changes)
  const digest = createHash('sha256').update(pluginCode).digest('hex')
  return {
    plan: { ...plan, problem: { ...plan.problem, digest } },
    searchText: 'name: fixture\nseed: 20261201\n',
    pluginCode,
  }
}

/** Memory where there is some: no test pulls the plug, so none needs to wait for a disk. */
export const scratch = existsSync('/dev/shm') ? '/dev/shm' : tmpdir()

/** A folder for one test, or on the real disk for a benchmark; call the second to remove it. */
export function temporaryFolder(base = scratch): { readonly folder: string; readonly remove: () => void } {
  const parent = mkdtempSync(join(base, 'skerry-record-'))
  return { folder: join(parent, 'record'), remove: () => rmSync(parent, { recursive: true, force: true }) }
}

export function openAt(folder: string, options: Partial<OpenOptions> = {}): OpenRecord {
  return openRecord(folder, {
    create: pinned(),
    holder: thisProcess(),
    nonce: randomBytes(16).toString('hex'),
    clock: () => Date.now(),
    ...options,
  })
}
