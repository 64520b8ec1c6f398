// Reading a record: for recovery, rederive, reports and the live view. Every method reads a bounded number of
// rows at a time, so memory does not grow with the record, no read transaction stays open (the write-ahead log
// would grow behind it), and the journal may append while somebody iterates.

import type {
  ArrivalRow,
  BirthRow,
  ConfirmationRow,
  EventRow,
  MailRow,
  RecordReader,
  SnapshotRow,
} from '../engine/ports.js'
import type { GuardedDatabase } from './guard.js'
import {
  birthOf,
  bytesAt,
  damaged,
  digestAt,
  evaluationsOfBytes,
  eventOf,
  failuresOfText,
  mailOf,
  numberAt,
  numbersOfBytes,
  StoredArrival,
  textAt,
} from './rows.js'
import { chained, selectSql } from './schema.js'
import { openSnapshot } from './states.js'
import type { Column, Statement } from './storage.js'

/** What a record holds, in figures. */
export interface Totals {
  readonly appends: number
  /** Everything that arrived, also what was overruled later, and the CPU time it took. */
  readonly arrivals: number
  readonly cpuSeconds: number
  /** Chain head after the last append. */
  readonly head: Uint8Array
  /** Time of the last append by the coordinator's clock, milliseconds since 1970; 0 when there is none. */
  readonly lastMs: number
}
export type CommitRead = {
  readonly commit: number
  readonly evaluation: number
  readonly digest?: Uint8Array
}

/** What records offer beyond the engine's port. */
export interface StoredReader extends RecordReader {
  /** Arrivals of an island in order of evaluation: several times faster than asking one by one. */
  arrivals(island: number, fromEvaluation?: number): Iterable<ArrivalRow>
  /** Islands that have a commit, ascending. */
  islands(): readonly number[]
  totals(): Totals
}

/** Rows read at a time by an iteration. */
const chunkRows = 1_000
/** Rows read ahead when evaluations are asked for one after the other. */
const aheadRows = 128
/** Rows held by all read-ahead together. */
const aheadRowsMost = 16_384
/** Names of workers held in memory. */
const workersKept = 4_096

const resultColumns = chained.results.columns.join(', ')
const eventColumns = chained.events.columns.join(', ')

type WorkerNames = Pick<ArrivalRow, 'worker' | 'host' | 'processor'>

export class SqliteReader implements StoredReader {
  readonly #database: GuardedDatabase
  readonly #statements = new Map<string, Statement>()
  readonly #workers = new Map<number, WorkerNames>()
  readonly #ahead = new Map<number, ReadAhead>()
  #aheadRows = 0

  constructor(database: GuardedDatabase) {
    this.#database = database
  }

  snapshot(island: number, atMost = Number.MAX_SAFE_INTEGER): SnapshotRow | undefined {
    const select = this.#prepare(
      'SELECT number, digest, checksum, state FROM snapshots WHERE island = ? AND number <= ? ORDER BY number DESC LIMIT 1',
    )
    // A snapshot ahead of the commits would be of a history that is lost.
    let below = Math.min(atMost, this.lastCommit(island)?.commit ?? 0)
    for (;;) {
      const row = select.get(island, below)
      if (!row) return undefined
      const commit = numberAt(row, 0)
      const [digest, checksum, state] = [bytesAt(row, 1), bytesAt(row, 2), bytesAt(row, 3)]
      const snapshot = openSnapshot({ island, commit, digest, checksum, state })
      if (snapshot) return snapshot
      below = commit - 1
    }
  }

  *commits(island: number, after: number): Iterable<CommitRead> {
    const select = this.#prepare(
      'SELECT first, count, evaluations, digest FROM commits WHERE island = ? AND first >= ? ORDER BY first LIMIT 256',
    )
    const start = this.#prepare('SELECT max(first) FROM commits WHERE island = ? AND first <= ?').get(
      island,
      after + 1,
    )?.[0]
    let next = typeof start === 'number' ? start : 1
    for (;;) {
      const segments = select.all(island, next)
      // A result may be overruled until it is committed: what was read ahead before may be the old one.
      this.forgetAhead(island)
      if (segments.length === 0) return
      for (const segment of segments) {
        yield* commitsOf(segment, island, next, after)
        next = numberAt(segment, 0) + numberAt(segment, 1)
      }
    }
  }

  lastCommit(island: number): { readonly commit: number; readonly digest: Uint8Array } | undefined {
    const row = this.#prepare(
      'SELECT first + count - 1, digest FROM commits WHERE island = ? ORDER BY first DESC LIMIT 1',
    ).get(island)
    return row && { commit: numberAt(row, 0), digest: digestAt(row, 1) }
  }

  arrival(island: number, evaluation: number): ArrivalRow | undefined {
    const ahead = this.#ahead.get(island)
    const found = ahead?.rows.get(evaluation)
    if (found) {
      ahead!.last = evaluation
      return this.#arrivalOf(found)
    }
    // Recovery asks for neighbours, one after the other: then a stretch of rows is read at once.
    const sequential = ahead !== undefined && evaluation > ahead.last && evaluation <= ahead.last + aheadRows
    if (!sequential) {
      const row = this.#prepare(selectSql('results')).get(island, evaluation)
      this.#remember(island, evaluation, [])
      return row && this.#arrivalOf(row)
    }
    const rows = this.#prepare(
      `SELECT ${resultColumns} FROM results WHERE island = ? AND evaluation >= ? ORDER BY evaluation LIMIT ${aheadRows}`,
    ).all(island, evaluation)
    this.#remember(island, evaluation, rows)
    const row = rows[0]
    return row && numberAt(row, 1) === evaluation ? this.#arrivalOf(row) : undefined
  }

  *arrivals(island: number, fromEvaluation = 1): Iterable<ArrivalRow> {
    const select = this.#prepare(
      `SELECT ${resultColumns} FROM results WHERE island = ? AND evaluation >= ? ORDER BY evaluation LIMIT ${chunkRows}`,
    )
    let next = fromEvaluation
    for (;;) {
      const rows = select.all(island, next)
      for (const row of rows) {
        const evaluation = numberAt(row, 1)
        if (evaluation < next) throw damaged(`results of island ${island}`, 'rows are out of order')
        next = evaluation + 1
        yield this.#arrivalOf(row)
      }
      if (rows.length < chunkRows) return
    }
  }

  confirmations(island: number, evaluation: number): readonly ConfirmationRow[] {
    const rows = this.#prepare(
      'SELECT worker, by, agrees, digest FROM confirmations WHERE island = ? AND evaluation = ? ORDER BY number',
    ).all(island, evaluation)
    return rows.map((row) => ({
      island,
      evaluation,
      ...this.#worker(numberAt(row, 0)),
      by: textAt(row, 1) === 'host' ? 'host' : 'process',
      digest: digestAt(row, 3),
      agrees: numberAt(row, 2) === 1,
    }))
  }

  isConfirmed(island: number, evaluation: number): boolean {
    const select = this.#prepare(
      'SELECT 1 FROM confirmations WHERE island = ? AND evaluation = ? AND agrees = 1 LIMIT 1',
    )
    return select.get(island, evaluation) !== undefined
  }

  mail(island: number, epoch: number): MailRow | undefined {
    const row = this.#prepare(selectSql('mail')).get(island, epoch)
    return row && mailOf(row)
  }

  lastMail(island: number): MailRow | undefined {
    const epoch = this.#prepare('SELECT max(epoch) FROM mail WHERE island = ?').get(island)?.[0]
    return typeof epoch === 'number' ? this.mail(island, epoch) : undefined
  }

  *events(): Iterable<EventRow & { readonly sequence: number }> {
    const select = this.#prepare(
      `SELECT ${eventColumns} FROM events WHERE sequence > ? ORDER BY sequence LIMIT ${chunkRows}`,
    )
    let last = 0
    for (;;) {
      const rows = select.all(last)
      for (const row of rows) {
        const event = eventOf(row)
        last = event.sequence
        yield event
      }
      if (rows.length < chunkRows) return
    }
  }

  /** Reads through all results: for the rare case that a worker is convicted. */
  *arrivalsOf(worker: string): Iterable<{ readonly island: number; readonly evaluation: number }> {
    const numbers = this.#prepare('SELECT number FROM workers WHERE worker = ? ORDER BY number').all(worker)
    const select = this.#prepare(
      `SELECT island, evaluation FROM results WHERE (island, evaluation) > (?, ?)
       AND worker IN (SELECT number FROM workers WHERE worker = ?) ORDER BY island, evaluation LIMIT ${chunkRows}`,
    )
    if (numbers.length === 0) return
    let last: readonly [number, number] = [0, 0]
    for (;;) {
      const rows = select.all(...last, worker)
      for (const row of rows) {
        last = [numberAt(row, 0), numberAt(row, 1)]
        yield { island: last[0], evaluation: last[1] }
      }
      if (rows.length < chunkRows) return
    }
  }

  birth(id: number): BirthRow | undefined {
    const row = this.#prepare(selectSql('births')).get(id)
    return row && birthOf(row)
  }

  islands(): readonly number[] {
    return this.#prepare('SELECT DISTINCT island FROM commits ORDER BY island')
      .all()
      .map((row) => numberAt(row, 0))
  }

  totals(): Totals {
    const row = this.#prepare(
      'SELECT sequence, arrivals, cpu_seconds, head, at_ms FROM appends ORDER BY sequence DESC LIMIT 1',
    ).get()
    if (!row) throw damaged('appends', 'the first entry of the chain is missing')
    return {
      appends: numberAt(row, 0),
      arrivals: numberAt(row, 1),
      cpuSeconds: numberAt(row, 2),
      head: digestAt(row, 3),
      lastMs: numberAt(row, 4),
    }
  }

  #prepare(sql: string): Statement {
    let statement = this.#statements.get(sql)
    if (!statement) {
      statement = this.#database.prepare(sql)
      this.#statements.set(sql, statement)
    }
    return statement
  }

  /** A result of the island was overruled, or may have been: what was read ahead counts no more. */
  forgetAhead(island: number): void {
    this.#aheadRows -= this.#ahead.get(island)?.rows.size ?? 0
    this.#ahead.delete(island)
  }

  #remember(island: number, last: number, rows: readonly Column[][]): void {
    this.#aheadRows += rows.length - (this.#ahead.get(island)?.rows.size ?? 0)
    if (this.#aheadRows > aheadRowsMost) {
      this.#ahead.clear()
      this.#aheadRows = rows.length
    }
    this.#ahead.set(island, { last, rows: new Map(rows.map((row) => [numberAt(row, 1), row])) })
  }

  #worker(number: number): WorkerNames {
    const known = this.#workers.get(number)
    if (known) return known
    const row = this.#prepare(selectSql('workers')).get(number)
    if (!row) throw damaged(`worker ${number}`, 'its name is missing')
    if (this.#workers.size >= workersKept) this.#workers.clear()
    const processor = textAt(row, 3)
    const named = {
      worker: textAt(row, 1),
      host: textAt(row, 2),
      ...(processor === '' ? {} : { processor }),
    }
    this.#workers.set(number, named)
    return named
  }

  #arrivalOf(row: readonly Column[]): ArrivalRow {
    const [island, evaluation] = [numberAt(row, 0), numberAt(row, 1)]
    const what = () => `result ${evaluation} of island ${island}`
    return new StoredArrival({
      island,
      evaluation,
      ...this.#worker(numberAt(row, 2)),
      attempt: numberAt(row, 3),
      cpuSeconds: numberAt(row, 4),
      result: { values: numbersOfBytes(bytesAt(row, 6), what), failures: failuresOfText(row[5], what) },
    })
  }
}

/** Rows that were read before they were asked for. */
interface ReadAhead {
  /** The evaluation that was asked for last. */
  last: number
  readonly rows: ReadonlyMap<number, Column[]>
}

function* commitsOf(
  segment: readonly Column[],
  island: number,
  expectedFirst: number,
  after: number,
): Iterable<CommitRead> {
  const [first, count] = [numberAt(segment, 0), numberAt(segment, 1)]
  const what = `commits of island ${island} from ${first}`
  if (first !== expectedFirst || count < 1) throw damaged(what, `commit ${expectedFirst} was expected`)
  const evaluations = evaluationsOfBytes(first, count, segment[2], what)
  for (let i = Math.max(0, after + 1 - first); i < count; i++) {
    const read = { commit: first + i, evaluation: evaluations[i]! }
    yield i === count - 1 ? { ...read, digest: digestAt(segment, 3) } : read
  }
}
