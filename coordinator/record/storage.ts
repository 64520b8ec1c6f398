// The few calls of a database that the record uses, so that a test can stand between (faulty.ts).
// The one adapter for real use is better-sqlite3; nothing else in the house imports it.
//
// Rows go in and come out as arrays of columns. Numbers are doubles: every integer of the record is below 2^53.

import SqliteDatabase from 'better-sqlite3'

export type Column = number | string | Uint8Array | null

export interface Statement {
  /** How many rows it changed. */
  run(...values: readonly Column[]): number
  get(...values: readonly Column[]): Column[] | undefined
  all(...values: readonly Column[]): Column[][]
}
export interface Database {
  /** A statement prepared once and used again. Statements that answer nothing are only run(). */
  prepare(sql: string): Statement
  /** Several statements at once, without answer. */
  exec(sql: string): void
  inTransaction(): boolean
  close(): void
}
export interface Storage {
  /** 'create' makes the file, 'write' and 'read' want it there. */
  open(path: string, mode: 'create' | 'write' | 'read'): Database
}

/** SQLite on the real disk. Errors are better-sqlite3's own, with a `code` such as SQLITE_FULL. */
export const sqliteStorage: Storage = {
  open(path, mode) {
    const database = new SqliteDatabase(path, { fileMustExist: mode !== 'create', readonly: mode === 'read' })
    return {
      prepare: (sql) => adaptStatement(database.prepare<Column[], Column[]>(sql)),
      exec: (sql) => {
        database.exec(sql)
      },
      inTransaction: () => database.inTransaction,
      close: () => {
        database.close()
      },
    }
  },
}

function adaptStatement(statement: SqliteDatabase.Statement<Column[], Column[]>): Statement {
  if (statement.reader) statement.raw(true)
  return {
    run: (...values) => statement.run(...values).changes,
    get: (...values) => statement.get(...values),
    all: (...values) => statement.all(...values),
  }
}
