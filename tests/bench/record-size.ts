// What a record costs: bytes on the disk, time to append, to open, to read back, to check, and memory. Used by the
// benchmark with a million evaluations and, small, by a test that holds the limit of bytes.

import { readdirSync, statSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import type { Append, ArrivalRow, CommitRow } from '../../coordinator/engine/ports.js'
import { type OpenRecord, verifyRecord } from '../../coordinator/record/index.js'
import { type Stream, stream } from '../../shared/streams.js'
import { digestOf, openAt, temporaryFolder } from '../contract/record-fixture.js'

export interface RecordSizeOptions {
  readonly evaluations: number
  /** Numbers of each evaluation. */
  readonly numbers: number
  /** Evaluations of one transaction, over all islands. */
  readonly batch: number
  /** Divides `batch`. */
  readonly islands: number
  /** Where the folder is made; a real disk unless told otherwise. */
  readonly place?: string
  /** Told now and then how far it is, with the resident memory. */
  readonly progress?: (evaluations: number, residentBytes: number) => void
}
export interface RecordSize {
  readonly evaluations: number
  /** All files of the folder after closing, the pinned plug-in and the search file too. */
  readonly bytesPerEvaluation: number
  readonly appendCpuMicroseconds: number
  readonly appendWallMicroseconds: number
  readonly openCpuSeconds: number
  /** Evaluations a second of CPU: commits() and arrival() together, as recovery reads. */
  readonly recoveryRate: number
  /** Evaluations a second of CPU through arrivals(). */
  readonly scanRate: number
  readonly verifyCpuSeconds: number
  readonly residentBytes: {
    readonly quarter: number
    readonly afterAppending: number
    readonly afterReading: number
  }
}

/** Writes a record of made-up results in a temporary folder, reads it back and removes it. */
export function measureRecord(options: RecordSizeOptions): RecordSize {
  const { folder, remove } = temporaryFolder(options.place ?? tmpdir())
  try {
    const appended = appendAll(openAt(folder), options)
    const bytes = readdirSync(folder).reduce((sum, name) => sum + statSync(join(folder, name)).size, 0)
    const opening = process.cpuUsage()
    const record = openAt(folder)
    const openCpuSeconds = cpuSeconds(opening)
    const recoveryRate = rate(options.evaluations, () => readAsRecovery(record, options.islands))
    const scanRate = rate(options.evaluations, () => scan(record, options.islands))
    const afterReading = process.memoryUsage.rss()
    record.close()
    const checking = process.cpuUsage()
    if (!verifyRecord(folder).intact) throw new Error('the record of the benchmark is damaged')
    return {
      evaluations: options.evaluations,
      bytesPerEvaluation: bytes / options.evaluations,
      appendCpuMicroseconds: appended.cpuMicroseconds / options.evaluations,
      appendWallMicroseconds: appended.wallMicroseconds / options.evaluations,
      openCpuSeconds,
      recoveryRate,
      scanRate,
      verifyCpuSeconds: cpuSeconds(checking),
      residentBytes: { ...appended.residentBytes, afterReading },
    }
  } finally {
    remove()
  }
}

function appendAll(record: OpenRecord, options: RecordSizeOptions) {
  const { evaluations, batch, progress } = options
  let cpuMicroseconds = 0
  let wallMicroseconds = 0
  let quarter = 0
  for (let done = 0; done < evaluations; done += batch) {
    const rows = batchOf(done, options)
    const cpu = process.cpuUsage()
    const wall = performance.now()
    record.journal.append(rows)
    const used = process.cpuUsage(cpu)
    cpuMicroseconds += used.user + used.system
    wallMicroseconds += 1000 * (performance.now() - wall)
    if (done + batch >= evaluations / 4 && quarter === 0) quarter = process.memoryUsage.rss()
    if (progress && (done / batch) % 1000 === 0) progress(done, process.memoryUsage.rss())
  }
  const afterAppending = process.memoryUsage.rss()
  record.close()
  return { cpuMicroseconds, wallMicroseconds, residentBytes: { quarter, afterAppending } }
}

/** Results of all islands in a shuffled order, and the commits they allow. */
function batchOf(done: number, { numbers, batch, islands }: RecordSizeOptions): Append {
  const draw = stream(7, 'spare', done, 0, 0)
  const arrivals: ArrivalRow[] = []
  const commits: CommitRow[] = []
  for (let i = 0; i < batch; i++) {
    const island = 1 + (i % islands)
    const evaluation = Math.floor(done / islands) + Math.floor(i / islands) + 1
    arrivals.push(arrivalOf(island, evaluation, numbers, draw))
    commits.push({ island, commit: evaluation, evaluation, digest: someDigest })
  }
  const order = draw.permutation(batch)
  const shuffled = arrivals.map((_, i) => arrivals[order[i]!]!)
  return { arrivals: shuffled, commits, confirmations: [], births: [], mail: [], events: [], snapshots: [] }
}
const someDigest = digestOf('benchmark')

function arrivalOf(island: number, evaluation: number, numbers: number, draw: Stream): ArrivalRow {
  const thread = draw.below(40)
  return {
    island,
    evaluation,
    worker: `node${thread % 10}/4711/t${thread}`,
    host: `node${thread % 10}`,
    attempt: 1,
    cpuSeconds: draw.uniform(),
    result: { values: Float64Array.from({ length: numbers }, () => draw.uniform()), failures: [] },
    digest: someDigest,
  }
}

function cpuSeconds(since: NodeJS.CpuUsage): number {
  const { user, system } = process.cpuUsage(since)
  return (user + system) / 1e6
}

function rate(evaluations: number, action: () => number): number {
  const start = process.cpuUsage()
  const read = action()
  if (read !== evaluations) throw new Error(`${read} of ${evaluations} evaluations were read back`)
  return evaluations / cpuSeconds(start)
}

/** Islands by turns, as recovery does: a commit of each, then the result it took. */
function readAsRecovery({ reader }: OpenRecord, islands: number): number {
  const journals = Array.from({ length: islands }, (_, i) => reader.commits(i + 1, 0)[Symbol.iterator]())
  let read = 0
  for (let open = islands; open > 0; ) {
    open = 0
    for (const [index, journal] of journals.entries()) {
      const next = journal.next()
      if (next.done) continue
      open += 1
      if (reader.arrival(index + 1, next.value.evaluation)) read += 1
    }
  }
  return read
}

function scan({ reader }: OpenRecord, islands: number): number {
  let read = 0
  for (let island = 1; island <= islands; island++) for (const _row of reader.arrivals(island)) read += 1
  return read
}
