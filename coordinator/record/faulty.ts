// A storage that fails on purpose: the k-th call, once or for ever, before or after it took effect. For tests
// of everything that stands on the record.

import type { Column, Database, Statement, Storage } from './storage.js'

/** An error as the database would throw it. */
export class StorageError extends Error {
  override readonly name = 'StorageError'
  readonly code: string
  constructor(code: string) {
    super(`made on purpose: ${code}`)
    this.code = code
  }
}

export interface Fault {
  /** Which call fails, from 1. Every open, exec, run, get and all counts. */
  readonly at: number
  /** True: every call from the k-th on fails, as on a disk that has died. */
  readonly lasting: boolean
  /** 'after': the call took effect and only its answer is lost. */
  readonly when: 'before' | 'after'
  /** An SQLite result code, e.g. SQLITE_FULL, SQLITE_IOERR_FSYNC. */
  readonly code: string
}

/** Wraps a storage. Without a fault it only counts, so that a first run tells how many calls there are. */
export class FaultyStorage implements Storage {
  readonly #inner: Storage
  #fault: Fault | undefined
  calls = 0
  /** How often it has failed. */
  failures = 0

  constructor(inner: Storage, fault?: Fault) {
    this.#inner = inner
    this.#fault = fault
  }

  /** The disk is mended: no call fails any more. */
  mend(): void {
    this.#fault = undefined
  }
  /** Sets the next fault; `at` counts on from all calls so far. */
  breakAt(fault: Fault): void {
    this.#fault = fault
  }

  open(path: string, mode: 'create' | 'write' | 'read'): Database {
    const database = this.#call(() => this.#inner.open(path, mode))
    return {
      prepare: (sql) => this.#wrap(database.prepare(sql)),
      exec: (sql) => this.#call(() => database.exec(sql)),
      inTransaction: () => database.inTransaction(),
      close: () => database.close(),
    }
  }

  #wrap(statement: Statement): Statement {
    return {
      run: (...values: readonly Column[]) => this.#call(() => statement.run(...values)),
      get: (...values: readonly Column[]) => this.#call(() => statement.get(...values)),
      all: (...values: readonly Column[]) => this.#call(() => statement.all(...values)),
    }
  }

  #call<T>(action: () => T): T {
    this.calls += 1
    const fault = this.#fault
    const due = fault !== undefined && (fault.lasting ? this.calls >= fault.at : this.calls === fault.at)
    if (!due) return action()
    this.failures += 1
    if (fault.when === 'after') action()
    throw new StorageError(fault.code)
  }
}
