// Puts the work copy of a record together: from the newest base in the shared folder and every valid append after it.
// A work copy that is there already only gets what it lacks; one that is not of this history is made anew.

import { copyFileSync, existsSync, mkdirSync, rmSync } from 'node:fs'
import { dirname } from 'node:path'
import { equalBytes, hex } from '../../../shared/digests.js'
import { type Refusal, refuse } from '../../../shared/refusals.js'
import { headAfter } from '../chain.js'
import { connect, transact } from '../database.js'
import type { GuardedDatabase } from '../guard.js'
import { RowWriter } from '../row-writer.js'
import { type Storage, sqliteStorage } from '../storage.js'
import type { Entry } from './entries.js'
import { appendsAfter, newestBase, type Point } from './segments.js'

/** Appends put in with one transaction: a restart of a long search is mostly this. */
const appendsPerTransaction = 500

/** Brings the database at `path` to where the shared journal ends; undefined when there is no base yet. */
export function restore(journal: string, path: string, storage: Storage = sqliteStorage): Point | undefined {
  const base = newestBase(journal)
  if (!base) return undefined
  if (existsSync(path)) {
    const caughtUp = catchUp(journal, path, storage)
    if (caughtUp) return caughtUp
  }
  removeDatabase(path)
  mkdirSync(dirname(path), { recursive: true })
  copyFileSync(base.path, path)
  const made = catchUp(journal, path, storage)
  if (!made) throw damaged('the base and the journal are of two histories')
  return made
}

export function removeDatabase(path: string): void {
  for (const end of ['', '-wal', '-shm', '-journal']) rmSync(path + end, { force: true })
}

/** Undefined when the database is not a beginning of the shared history. */
function catchUp(journal: string, path: string, storage: Storage): Point | undefined {
  let database: GuardedDatabase
  try {
    database = connect(storage, path, 'write')
  } catch {
    return undefined
  }
  try {
    return goOn(journal, database)
  } finally {
    database.close()
  }
}

function goOn(journal: string, database: GuardedDatabase): Point | undefined {
  const own = pointOf(database)
  const base = newestBase(journal)!
  if (!own || own.sequence < base.sequence) return undefined
  const writer = new RowWriter(database)
  let head = headAt(database, base.sequence)
  if (!hex(head).startsWith(base.headStart)) return undefined
  let last = base.sequence
  let batch: Entry[] = []
  for (const entry of appendsAfter(journal, base.sequence)) {
    head = follow(head, entry)
    last = entry.header.sequence
    if (last < own.sequence) continue
    if (last === own.sequence) {
      if (hex(head) !== own.head) return undefined
      continue
    }
    batch.push(entry)
    if (batch.length < appendsPerTransaction) continue
    put(database, writer, batch)
    batch = []
  }
  // The work copy holds what the shared journal never had, or has no more.
  if (last < own.sequence) return undefined
  put(database, writer, batch)
  return { sequence: last, head: hex(head) }
}

function follow(head: Uint8Array, { header, rows, head: told }: Entry): Uint8Array {
  const next = headAfter(head, header, rows)
  if (equalBytes(next, told)) return next
  throw damaged(`append ${header.sequence} of epoch ${header.epoch} does not follow from the one before it`)
}

function put(database: GuardedDatabase, writer: RowWriter, entries: readonly Entry[]): void {
  if (entries.length === 0) return
  transact(database, () => {
    for (const { header, head, rows, snapshots } of entries) writer.write(header, head, rows, snapshots)
  })
}

/** Where a database stands; undefined when it has no beginning. */
export function pointOf(database: GuardedDatabase): Point | undefined {
  const row = database.prepare('SELECT sequence, head FROM appends ORDER BY sequence DESC LIMIT 1').get()
  const head = row?.[1]
  return row && head instanceof Uint8Array ? { sequence: Number(row[0]), head: hex(head) } : undefined
}

function headAt(database: GuardedDatabase, sequence: number): Uint8Array {
  const head = database.prepare('SELECT head FROM appends WHERE sequence = ?').get(sequence)?.[0]
  if (head instanceof Uint8Array) return head
  throw damaged(`the work copy lacks append ${sequence}`)
}

function damaged(detail: string): Refusal {
  return refuse('record-corrupted', { detail: `in the shared folder, ${detail}` })
}
