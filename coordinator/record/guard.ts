// Between the record and the database: turns what SQLite reports into refusals, and lets nobody go on with a
// connection after an I/O error or damage. After those the outcome of the last write is unknown; only a new
// start, which reads what is really there, can tell.

import { accessSync, constants } from 'node:fs'
import { dirname } from 'node:path'
import { BrokenPromise } from '../../shared/check.js'
import { Refusal, type RefusalCode, refuse } from '../../shared/refusals.js'
import type { Column, Database, Statement } from './storage.js'

interface FaultRow {
  /** Start of the SQLite result code; the first row that fits counts. */
  readonly prefix: string
  readonly code: RefusalCode
  /** The connection may not be used any more. */
  readonly final: boolean
  readonly says: string
}

const faults: readonly FaultRow[] = [
  {
    prefix: 'SQLITE_FULL',
    code: 'disk-full',
    final: false,
    says: 'there was no room for the last write, which was undone',
  },
  // The shared-memory file could not grow: in SQLite's sources that is what a full disk gives there.
  {
    prefix: 'SQLITE_IOERR_SHMSIZE',
    code: 'disk-full',
    final: false,
    says: 'there was no room for the last write, which was undone',
  },
  {
    prefix: 'SQLITE_READONLY',
    code: 'disk-read-only',
    final: false,
    says: 'the database file or its folder is read-only',
  },
  {
    prefix: 'SQLITE_BUSY',
    code: 'record-in-use',
    final: false,
    says: 'another process is writing in the database and does not finish',
  },
  {
    prefix: 'SQLITE_CANTOPEN',
    code: 'disk-error',
    final: true,
    says: 'the database or a file beside it could not be opened',
  },
  {
    prefix: 'SQLITE_PERM',
    code: 'disk-read-only',
    final: true,
    says: 'the database, or the log beside it, cannot be opened for writing',
  },
  { prefix: 'SQLITE_IOERR', code: 'disk-error', final: true, says: 'reading or writing the database failed' },
  {
    prefix: 'SQLITE_NOLFS',
    code: 'disk-error',
    final: true,
    says: 'the file system cannot hold a file this large',
  },
  {
    prefix: 'SQLITE_PROTOCOL',
    code: 'disk-error',
    final: true,
    says: 'the file locks of this file system do not work',
  },
  {
    prefix: 'SQLITE_CORRUPT',
    code: 'record-corrupted',
    final: true,
    says: 'the database contradicts itself',
  },
  { prefix: 'SQLITE_NOTADB', code: 'record-corrupted', final: true, says: 'the file is not a database' },
]

/** The SQLite result code of an error, if it has one. */
function codeOf(error: unknown): string | undefined {
  if (!(error instanceof Error) || !('code' in error)) return undefined
  return typeof error.code === 'string' && error.code.startsWith('SQLITE_') ? error.code : undefined
}

/** Can the same append be tried again on the same journal, once the world has been mended? */
export function mayTryAgain(refusal: Refusal): boolean {
  return faults.some((row) => row.code === refusal.code && !row.final)
}

/** A database whose every call throws refusals only, and which stays broken after an error that is final. */
export class GuardedDatabase implements Database {
  readonly #inner: Database
  readonly #path: string
  #broken: Refusal | undefined

  constructor(inner: Database, path: string) {
    this.#inner = inner
    this.#path = path
  }

  /** Opens behind the guard. @throws Refusal when the file cannot be opened. */
  static open(open: () => Database, path: string): GuardedDatabase {
    try {
      return new GuardedDatabase(open(), path)
    } catch (error) {
      throw asRefusal(error, path).refusal
    }
  }

  prepare(sql: string): Statement {
    const statement = this.#try(() => this.#inner.prepare(sql))
    return {
      run: (...values: readonly Column[]) => this.#try(() => statement.run(...values)),
      get: (...values: readonly Column[]) => this.#try(() => statement.get(...values)),
      all: (...values: readonly Column[]) => this.#try(() => statement.all(...values)),
    }
  }
  exec(sql: string): void {
    this.#try(() => this.#inner.exec(sql))
  }
  inTransaction(): boolean {
    return this.#inner.inTransaction()
  }
  /** The refusal that ended the use of this connection. */
  get broken(): Refusal | undefined {
    return this.#broken
  }
  /** From now on every call throws this refusal. */
  breakWith(refusal: Refusal): void {
    this.#broken ??= refusal
  }
  close(): void {
    try {
      this.#inner.close()
    } catch (error) {
      // A broken connection is only let go; what it could not do has been said already.
      if (!this.#broken) throw asRefusal(error, this.#path).refusal
    }
  }

  #try<T>(action: () => T): T {
    if (this.#broken) throw this.#broken
    try {
      return action()
    } catch (error) {
      const { refusal, final } = asRefusal(error, this.#path)
      if (final) this.#broken = refusal
      throw refusal
    }
  }
}

function rowFor(code: string, path: string): FaultRow | undefined {
  // On a read-only disk the log beside the database cannot be made, which SQLite reports as not opening it.
  const said = code.startsWith('SQLITE_CANTOPEN') && !isWritable(dirname(path)) ? 'SQLITE_PERM' : code
  return faults.find(({ prefix }) => said.startsWith(prefix))
}

function isWritable(folder: string): boolean {
  try {
    accessSync(folder, constants.W_OK)
    return true
  } catch {
    return false
  }
}

function asRefusal(error: unknown, path: string): { readonly refusal: Refusal; readonly final: boolean } {
  if (error instanceof Refusal) return { refusal: error, final: false }
  const code = codeOf(error)
  // Ours: a row that is there already, a column of the wrong type, a connection used after close().
  if (code === undefined || code.startsWith('SQLITE_CONSTRAINT')) {
    const said = error instanceof Error ? error.message : String(error)
    throw error instanceof BrokenPromise
      ? error
      : new BrokenPromise(`the record is used as designed: ${said}`)
  }
  const row = rowFor(code, path)
  const detail = `${row?.says ?? 'the database reported an error'} (${code})`
  return {
    refusal: refuse(row?.code ?? 'disk-error', { detail, where: { file: path }, cause: error }),
    final: row?.final ?? true,
  }
}
