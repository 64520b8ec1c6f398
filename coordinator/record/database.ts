// Opening record.db: what the file must be before SQLite touches it, and how every connection is set.

import { closeSync, existsSync, openSync, readSync, statSync } from 'node:fs'
import { refuse } from '../../shared/refusals.js'
import { GuardedDatabase } from './guard.js'
import { applicationId, formatVersion, oldestSafeSqlite } from './schema.js'
import type { Column, Storage } from './storage.js'

const headerBytes = 100
const headerText = 'SQLite format 3\0'

/**
 * Looks at the first bytes of the file (SQLite file format, section 1.3): ours, of a format we know, and as long
 * as it says. @throws Refusal that says what the file is instead.
 */
export function examineFile(path: string): void {
  const where = { file: path }
  const { size } = statSync(path)
  const corrupted = (detail: string) => refuse('record-corrupted', { detail, where })
  if (size === 0) throw corrupted('the database file is empty (0 bytes); a record is never empty')
  const header = Buffer.alloc(headerBytes)
  const file = openSync(path, 'r')
  try {
    readSync(file, header, 0, headerBytes, 0)
  } finally {
    closeSync(file)
  }
  if (header.toString('latin1', 0, 16) !== headerText) {
    throw corrupted(
      'the file does not begin as an SQLite database does: it is another file or its start is lost',
    )
  }
  if (size < headerBytes) throw corrupted(`only ${size} bytes of the database file are left`)
  if (header.readUInt32BE(68) !== applicationId) {
    throw refuse('record-of-another-search', {
      detail: 'the file is an SQLite database of another program, not a record',
      cure: 'Name the folder of a record, or an empty folder for a new one.',
      where,
    })
  }
  const version = header.readUInt32BE(60)
  if (version > formatVersion) {
    const detail = `it has format ${version}, this version reads formats up to ${formatVersion}`
    throw refuse('record-newer', { detail, where })
  }
  examineLength(path, size, header)
}

function examineLength(path: string, size: number, header: Buffer): void {
  // With a write-ahead log beside it the header may run ahead of the file: a checkpoint was cut short.
  const log = `${path}-wal`
  if (existsSync(log) && statSync(log).size > 0) return
  const pageBytes = header.readUInt16BE(16) === 1 ? 65536 : header.readUInt16BE(16)
  const expected = pageBytes * header.readUInt32BE(28)
  if (size >= expected) return
  const detail = `the database file has ${size} bytes and should have ${expected}: its end is cut off`
  throw refuse('record-corrupted', { detail, where: { file: path } })
}

/** A connection with the settings that durability rests on. Nothing of the file is changed. */
export function connect(storage: Storage, path: string, mode: 'create' | 'write' | 'read'): GuardedDatabase {
  const database = GuardedDatabase.open(() => storage.open(path, mode), path)
  try {
    assertSqlite(database)
    // A second coordinator must be refused within a second, whatever the first one is doing.
    database.exec('PRAGMA busy_timeout = 900')
    database.exec('PRAGMA trusted_schema = OFF; PRAGMA cell_size_check = ON')
    if (mode === 'read') {
      database.exec('PRAGMA query_only = ON; PRAGMA cache_size = -8000')
    } else {
      settle(database, 'PRAGMA journal_mode = WAL', 'wal')
      // better-sqlite3 compiles SQLite with NORMAL as the default in WAL mode, which loses acknowledged commits
      // when the power fails.
      database.exec('PRAGMA synchronous = FULL; PRAGMA fullfsync = ON; PRAGMA checkpoint_fullfsync = ON')
      settle(database, 'PRAGMA synchronous', 2)
      database.exec('PRAGMA cache_size = -8000; PRAGMA wal_autocheckpoint = 1000')
      settle(database, 'PRAGMA journal_size_limit = 67108864', 67108864)
    }
  } catch (error) {
    database.close()
    throw error
  }
  return database
}

function settle(database: GuardedDatabase, pragma: string, expected: Column): void {
  const found = database.prepare(pragma).get()?.[0]
  if (found === expected) return
  const detail = `\`${pragma}\` gave ${String(found)} and should give ${String(expected)}`
  throw refuse('disk-error', { detail, cure: 'Put the record on a local file system.' })
}

function assertSqlite(database: GuardedDatabase): void {
  const version = String(database.prepare('SELECT sqlite_version()').get()?.[0])
  if (isSafeSqlite(version)) return
  throw refuse('sqlite-unsafe', {
    detail: `found SQLite ${version}, expected ${oldestSafeSqlite.join('.')} or newer`,
  })
}

/** At least the version in which the race of checkpoints was mended. */
export function isSafeSqlite(version: string): boolean {
  const found = version.split('.').map(Number)
  for (let i = 0; i < 3; i++) {
    const difference = (found[i] ?? 0) - oldestSafeSqlite[i]!
    if (difference !== 0) return difference > 0
  }
  return true
}

/** Runs `action` in one write transaction: all of it or nothing. */
export function transact<T>(database: GuardedDatabase, action: () => T): T {
  database.exec('BEGIN IMMEDIATE')
  try {
    const result = action()
    database.exec('COMMIT')
    return result
  } catch (error) {
    rollBack(database)
    throw error
  }
}

/** Ends a transaction that failed. A connection that cannot even do that is of no more use. */
export function rollBack(database: GuardedDatabase): void {
  if (database.broken || !database.inTransaction()) return
  try {
    database.exec('ROLLBACK')
  } catch (error) {
    const detail = `a failed write could not be undone (${error instanceof Error ? error.message : String(error)})`
    database.breakWith(refuse('disk-error', { detail, cause: error }))
  }
}
