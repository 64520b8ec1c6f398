// Inserts the rows of one append. Used by the journal that makes them, and by whoever puts a database together again
// from a journal in a shared folder: both must leave the same database.

import { check } from '../../shared/check.js'
import type { AppendedRows, AppendHeader } from './chain.js'
import type { GuardedDatabase } from './guard.js'
import { type ChainedTable, chainedTables, insertSql } from './schema.js'
import { snapshotsKept } from './states.js'
import type { Column, Statement } from './storage.js'

export class RowWriter {
  readonly #inserts: { readonly [table in ChainedTable]: Statement }
  readonly #statements: ReturnType<typeof prepareStatements>
  /** A result took the place of another on this island. */
  readonly #overruled: (island: number) => void

  constructor(database: GuardedDatabase, overruled: (island: number) => void = () => {}) {
    const prepare = (table: ChainedTable) => [table, database.prepare(insertSql(table))] as const
    this.#inserts = Object.fromEntries(chainedTables.map(prepare)) as { [table in ChainedTable]: Statement }
    this.#statements = prepareStatements(database)
    this.#overruled = overruled
  }

  /** Inside a transaction of the caller's. */
  write(
    header: AppendHeader,
    head: Uint8Array,
    rows: AppendedRows,
    snapshots: readonly (readonly Column[])[],
  ): void {
    const { sequence, epoch, atMs, arrivals, cpuSeconds, contents } = header
    for (const table of chainedTables) {
      const insert = this.#inserts[table]
      for (const row of rows[table]) {
        if (insert.run(...row) === 1) continue
        check(table === 'results', `a row of ${table} is appended once`)
        this.#overrule(row, sequence)
      }
    }
    for (const snapshot of snapshots) this.#snapshot(snapshot)
    this.#statements.append.run(sequence, epoch, atMs, arrivals, cpuSeconds, contents, head)
  }

  /** Another result of an evaluation: the former one is kept apart, as it was. */
  #overrule(row: readonly Column[], sequence: number): void {
    const [island, evaluation, ...rest] = row as [number, number, ...Column[]]
    this.#statements.setApart.run(sequence, island, evaluation)
    this.#statements.replace.run(...rest, island, evaluation)
    this.#overruled(island)
  }

  #snapshot(columns: readonly Column[]): void {
    const island = columns[0] as number
    this.#statements.snapshot.run(...columns)
    this.#statements.forget.run(island, island, snapshotsKept - 1)
  }
}

function prepareStatements(database: GuardedDatabase) {
  return {
    append: database.prepare(
      `INSERT INTO appends (sequence, epoch, at_ms, arrivals, cpu_seconds, contents, head)
       VALUES (?, ?, ?, ?, ?, ?, ?)`,
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
    snapshot: database.prepare(
      'INSERT OR REPLACE INTO snapshots (island, number, digest, checksum, state) VALUES (?, ?, ?, ?, ?)',
    ),
    forget: database.prepare(
      `DELETE FROM snapshots WHERE island = ? AND number <
       (SELECT number FROM snapshots WHERE island = ? ORDER BY number DESC LIMIT 1 OFFSET ?)`,
    ),
  }
}
