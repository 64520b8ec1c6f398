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
import { type AppendedRows, contentsOf, headAfter } from './chain.js'
import { rollBack } from './database.js'
import type { GuardedDatabase } from './guard.js'
import { mayTryAgain } from './guard.js'
import type { Hold } from './holder.js'
import type { SqliteReader, Totals } from './reader.js'
import {
  bytesOfEvaluations,
  bytesOfNumbers,
  checkArrival,
  columnsOfBirth,
  columnsOfEvent,
  columnsOfMail,
  textOfFailures,
} from './rows.js'
import { type ChainedTable, chainedTables, insertSql } from './schema.js'
import { snapshotsKept, storeSnapshot } from './states.js'
import type { Column, Statement } from './storage.js'
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
  readonly #inserts: { readonly [table in ChainedTable]: Statement }
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
  }) {
    this.#database = parts.database
    this.#reader = parts.reader
    this.#hold = parts.hold
    this.#witness = parts.witness
    this.#clock = parts.clock
    const prepare = (table: ChainedTable) => [table, this.#database.prepare(insertSql(table))] as const
    this.#inserts = Object.fromEntries(chainedTables.map(prepare)) as { [table in ChainedTable]: Statement }
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
      contents,
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
    const number = (row: { readonly worker: string; readonly host: string }) =>
      this.#workerNumber(row, newWorkers)
    const results = rows.arrivals.map((row) => columnsOfArrival(row, number(row)))
    const confirmations = this.#columnsOfConfirmations(rows.confirmations, number)
    const workers = [...newWorkers].map(([key, value]) => [value, ...(JSON.parse(key) as [string, string])])
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

  #workerNumber(
    row: { readonly worker: string; readonly host: string },
    newWorkers: Map<string, number>,
  ): number {
    const key = JSON.stringify([row.worker, row.host])
    const known = this.#workers.get(key) ?? newWorkers.get(key)
    if (known !== undefined) return known
    const stored = this.#statements.worker.get(row.worker, row.host)?.[0]
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

  #write(added: AppendedRows, next: NextAppend, snapshots: readonly SnapshotRow[]): void {
    const { begin, append, commit } = this.#statements
    const { appends, lastMs, arrivals, cpuSeconds, head } = next.position
    try {
      begin.run()
      this.#hold.assertHeld()
      for (const table of chainedTables) {
        const insert = this.#inserts[table]
        for (const row of added[table]) {
          if (insert.run(...row) === 1) continue
          check(table === 'results', `a row of ${table} is appended once`)
          this.#overrule(row, appends)
        }
      }
      for (const snapshot of snapshots) this.#writeSnapshot(snapshot)
      append.run(appends, this.#hold.epoch, lastMs, arrivals, cpuSeconds, next.contents, head)
      commit.run()
    } catch (error) {
      rollBack(this.#database)
      if (!(error instanceof Refusal) || !mayTryAgain(error) || !this.#isThere(appends, head)) throw error
    }
  }

  /** Did a commit take effect although it reported trouble? Then trying again would add everything twice. */
  #isThere(sequence: number, head: Uint8Array): boolean {
    if (this.#database.broken) return false
    const found = this.#statements.head.get(sequence)?.[0]
    return found instanceof Uint8Array && equalBytes(found, head)
  }

  /** Another result of an evaluation: the former one is kept apart, as it was. */
  #overrule(row: readonly Column[], sequence: number): void {
    const [island, evaluation, ...rest] = row as [number, number, ...Column[]]
    this.#statements.setApart.run(sequence, island, evaluation)
    this.#statements.replace.run(...rest, island, evaluation)
    this.#reader.forgetAhead(island)
  }

  #writeSnapshot(row: SnapshotRow): void {
    const { island, commit, digest, checksum, state } = storeSnapshot(row)
    this.#statements.snapshot.run(island, commit, digest, checksum, state)
    this.#statements.forget.run(island, island, snapshotsKept - 1)
  }
}

interface NextAppend {
  readonly contents: Uint8Array
  readonly position: Position
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
    append: database.prepare(
      `INSERT INTO appends (sequence, epoch, at_ms, arrivals, cpu_seconds, contents, head)
       VALUES (?, ?, ?, ?, ?, ?, ?)`,
    ),
    head: database.prepare('SELECT head FROM appends WHERE sequence = ?'),
    worker: database.prepare('SELECT number FROM workers WHERE worker = ? AND host = ?'),
    confirmations: database.prepare(
      'SELECT max(number) FROM confirmations WHERE island = ? AND evaluation = ?',
    ),
    setApart: database.prepare(
      `INSERT INTO overruled (island, evaluation, number, replaced_in, worker, attempt, cpu_seconds, failures, numbers)
       SELECT island, evaluation, 1 + (SELECT count(*) FROM overruled AS o
         WHERE o.island = results.island AND o.evaluation = results.evaluation),
         ?, worker, attempt, cpu_seconds, failures, numbers FROM results WHERE island = ? AND evaluation = ?`,
    ),
    replace: database.prepare(
      `UPDATE results SET worker = ?, attempt = ?, cpu_seconds = ?, failures = ?, numbers = ?
       WHERE island = ? AND evaluation = ?`,
    ),
    birth: database.prepare('SELECT 1 FROM births WHERE id = ?'),
    snapshot: database.prepare(
      'INSERT OR REPLACE INTO snapshots (island, number, digest, checksum, state) VALUES (?, ?, ?, ?, ?)',
    ),
    forget: database.prepare(
      `DELETE FROM snapshots WHERE island = ? AND number <
       (SELECT number FROM snapshots WHERE island = ? ORDER BY number DESC LIMIT 1 OFFSET ?)`,
    ),
  }
}
