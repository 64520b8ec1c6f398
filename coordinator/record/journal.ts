// The write side of a record: one transaction an append, durable when append() returns, under the fence of the
// coordinator's hold. An append that was refused has changed nothing, neither on disk nor here.

import { check } from '../../shared/check.js'
import { equalBytes } from '../../shared/digests.js'
import { Refusal } from '../../shared/refusals.js'
import type {
  Append,
  ArrivalRow,
  BirthRow,
  CommitRow,
  ConfirmationRow,
  Journal,
  SnapshotRow,
} from '../engine/ports.js'
import { type AppendedRows, type AppendHeader, contentsOf, headAfter } from './chain.js'
import { rollBack } from './database.js'
import type { GuardedDatabase } from './guard.js'
import { mayTryAgain } from './guard.js'
import type { Hold } from './holder.js'
import type { SqliteReader, Totals } from './reader.js'
import { RowWriter } from './row-writer.js'
import {
  bytesOfEvaluations,
  bytesOfNumbers,
  checkArrival,
  columnsOfBirth,
  columnsOfEvent,
  columnsOfMail,
  textOfFailures,
} from './rows.js'
import { storeSnapshot } from './states.js'
import type { Column } from './storage.js'
import type { Witness } from './witness.js'

/** Numbers of workers held in memory; beyond that they are looked up again. */
const workersKept = 4_096

/** What the next append goes on from. Replaced as a whole once an append is durable. */
interface Position extends Totals {
  readonly workers: number
  readonly events: number
}

export class SqliteJournal implements Journal {
  readonly #database: GuardedDatabase
  readonly #reader: SqliteReader
  readonly #hold: Hold
  readonly #witness: Witness
  readonly #clock: () => number
  readonly #writer: RowWriter
  readonly #mirror: Mirror
  readonly #statements: ReturnType<typeof prepareStatements>
  readonly #workers = new Map<string, number>()
  readonly #commits = new Map<number, number>()
  #position: Position

  constructor(parts: {
    readonly database: GuardedDatabase
    readonly reader: SqliteReader
    readonly hold: Hold
    readonly witness: Witness
    readonly clock: () => number
    readonly mirror?: Mirror
  }) {
    this.#database = parts.database
    this.#reader = parts.reader
    this.#hold = parts.hold
    this.#witness = parts.witness
    this.#clock = parts.clock
    this.#mirror = parts.mirror ?? (() => {})
    this.#writer = new RowWriter(this.#database, (island) => this.#reader.forgetAhead(island))
    this.#statements = prepareStatements(this.#database)
    const highest = (sql: string) => (this.#database.prepare(sql).get()?.[0] as number | null) ?? 0
    this.#position = {
      ...this.#reader.totals(),
      workers: highest('SELECT max(number) FROM workers'),
      events: highest('SELECT max(sequence) FROM events'),
    }
  }

  /** @throws Refusal; after 'disk-full' and 'record-in-use' the same append may be tried again. */
  append(rows: Append): void {
    if (Object.values(rows).every((list: readonly unknown[]) => list.length === 0)) return
    if (this.#database.broken) throw this.#database.broken
    const newWorkers = new Map<string, number>()
    const added = this.#columnsOf(rows, newWorkers)
    const next = this.#nextPosition(rows, added, newWorkers.size)
    this.#write(added, next, rows.snapshots)
    this.#position = next.position
    for (const { island, commit } of rows.commits) this.#commits.set(island, commit)
    if (this.#workers.size + newWorkers.size > workersKept) this.#workers.clear()
    for (const [key, number] of newWorkers) this.#workers.set(key, number)
    this.#witness.say(next.position)
  }

  #nextPosition(rows: Append, added: AppendedRows, newWorkers: number): NextAppend {
    const last = this.#position
    const sequence = last.appends + 1
    const arrivals = last.arrivals + rows.arrivals.length
    const cpuSeconds = rows.arrivals.reduce((sum, row) => sum + row.cpuSeconds, last.cpuSeconds)
    const atMs = Math.trunc(this.#clock())
    const contents = contentsOf(added)
    const header = { sequence, epoch: this.#hold.epoch, atMs, arrivals, cpuSeconds, contents }
    return {
      header,
      position: {
        appends: sequence,
        arrivals,
        cpuSeconds,
        head: headAfter(last.head, header, added),
        lastMs: atMs,
        workers: last.workers + newWorkers,
        events: last.events + rows.events.length,
      },
    }
  }

  #columnsOf(rows: Append, newWorkers: Map<string, number>): AppendedRows {
    const number = (row: WorkerNames) => this.#workerNumber(row, newWorkers)
    const results = rows.arrivals.map((row) => columnsOfArrival(row, number(row)))
    const confirmations = this.#columnsOfConfirmations(rows.confirmations, number)
    const workers = [...newWorkers].map(([key, value]) => [
      value,
      ...(JSON.parse(key) as [string, string, string]),
    ])
    return {
      workers,
      results,
      confirmations,
      births: this.#newBirths(rows.births).map(columnsOfBirth),
      commits: this.#columnsOfCommits(rows.commits),
      mail: rows.mail.map(columnsOfMail),
      events: rows.events.map((row, i) => columnsOfEvent(this.#position.events + 1 + i, row)),
    }
  }

  #workerNumber(row: WorkerNames, newWorkers: Map<string, number>): number {
    const { worker, host, processor = '' } = row
    const key = JSON.stringify([worker, host, processor])
    const known = this.#workers.get(key) ?? newWorkers.get(key)
    if (known !== undefined) return known
    const stored = this.#statements.worker.get(worker, host, processor)?.[0]
    if (typeof stored === 'number') {
      if (this.#workers.size >= workersKept) this.#workers.clear()
      this.#workers.set(key, stored)
      return stored
    }
    const number = this.#position.workers + newWorkers.size + 1
    newWorkers.set(key, number)
    return number
  }

  #columnsOfConfirmations(
    rows: readonly ConfirmationRow[],
    number: (row: ConfirmationRow) => number,
  ): readonly Column[][] {
    const counted = new Map<string, number>()
    return rows.map((row) => {
      const { island, evaluation } = row
      const key = `${island}-${evaluation}`
      const before =
        counted.get(key) ?? Number(this.#statements.confirmations.get(island, evaluation)?.[0] ?? 0)
      counted.set(key, before + 1)
      return [island, evaluation, before + 1, number(row), row.by, row.agrees ? 1 : 0, row.digest]
    })
  }

  /** A birth may be told again after a restart; it is kept once. */
  #newBirths(rows: readonly BirthRow[]): readonly BirthRow[] {
    const told = new Set<number>()
    return rows.filter(({ id }) => {
      if (told.has(id) || this.#statements.birth.get(id)) return false
      told.add(id)
      return true
    })
  }

  /** One row an island: its commits of this append, which must go on from its last one without a gap. */
  #columnsOfCommits(rows: readonly CommitRow[]): readonly Column[][] {
    const segments = new Map<number, CommitRow[]>()
    for (const row of rows) {
      const segment = segments.get(row.island)
      if (segment) segment.push(row)
      else segments.set(row.island, [row])
    }
    return [...segments].map(([island, segment]) => {
      const first = this.#lastCommit(island) + 1
      segment.forEach(({ commit }, i) => {
        check(commit === first + i, `commits of island ${island} go on from ${first - 1} without a gap`)
      })
      const evaluations = segment.map(({ evaluation }) => evaluation)
      const coded = bytesOfEvaluations(first, evaluations)
      const { digest } = segment[segment.length - 1]!
      check(digest !== undefined, 'the last commit of an append carries its digest')
      return [island, first, segment.length, coded, digest]
    })
  }

  #lastCommit(island: number): number {
    const known = this.#commits.get(island)
    if (known !== undefined) return known
    const last = this.#reader.lastCommit(island)?.commit ?? 0
    this.#commits.set(island, last)
    return last
  }

  #write(added: AppendedRows, { header, position }: NextAppend, snapshots: readonly SnapshotRow[]): void {
    const { begin, commit } = this.#statements
    const stored = snapshots.map(columnsOfSnapshot)
    try {
      begin.run()
      this.#hold.assertHeld()
      this.#writer.write(header, position.head, added, stored)
      this.#mirror({ header, head: position.head, rows: added, snapshots: stored })
      commit.run()
    } catch (error) {
      rollBack(this.#database)
      if (
        !(error instanceof Refusal) ||
        !mayTryAgain(error) ||
        !this.#isThere(position.appends, position.head)
      )
        throw error
    }
  }

  /** Did a commit take effect although it reported trouble? Then trying again would add everything twice. */
  #isThere(sequence: number, head: Uint8Array): boolean {
    if (this.#database.broken) return false
    const found = this.#statements.head.get(sequence)?.[0]
    return found instanceof Uint8Array && equalBytes(found, head)
  }
}

interface NextAppend {
  readonly header: AppendHeader
  readonly position: Position
}

/** Keeps what a transaction wrote in a second place, before the transaction counts. May throw a Refusal. */
export type Mirror = (entry: {
  readonly header: AppendHeader
  readonly head: Uint8Array
  readonly rows: AppendedRows
  readonly snapshots: readonly (readonly Column[])[]
}) => void

type WorkerNames = Pick<ArrivalRow, 'worker' | 'host' | 'processor'>

function columnsOfSnapshot(row: SnapshotRow): Column[] {
  const { island, commit, digest, checksum, state } = storeSnapshot(row)
  return [island, commit, digest, checksum, state]
}

function columnsOfArrival(row: ArrivalRow, worker: number): Column[] {
  checkArrival(row)
  const { island, evaluation, attempt, cpuSeconds, result } = row
  return [
    island,
    evaluation,
    worker,
    attempt,
    cpuSeconds + 0, // -0 becomes 0, as in the database
    textOfFailures(result.failures),
    bytesOfNumbers(result.values),
  ]
}

function prepareStatements(database: GuardedDatabase) {
  return {
    begin: database.prepare('BEGIN IMMEDIATE'),
    commit: database.prepare('COMMIT'),
    head: database.prepare('SELECT head FROM appends WHERE sequence = ?'),
    worker: database.prepare('SELECT number FROM workers WHERE worker = ? AND host = ? AND processor = ?'),
    confirmations: database.prepare(
      'SELECT max(number) FROM confirmations WHERE island = ? AND evaluation = ?',
    ),
    birth: database.prepare('SELECT 1 FROM births WHERE id = ?'),
  }
}
