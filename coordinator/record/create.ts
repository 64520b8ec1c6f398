// Making a record. The database is built under another name and linked to its own only when it is complete and
// on the disk: a record.db that exists is whole, whatever was killed, and of two makers only one succeeds.

import { closeSync, existsSync, fsyncSync, linkSync, openSync, readdirSync, rmSync } from 'node:fs'
import { basename, dirname, join } from 'node:path'
import { Refusal } from '../../shared/refusals.js'
import { emptyChainContents, genesisOf } from './chain.js'
import { connect, transact } from './database.js'
import { fileTrouble } from './files.js'
import { metaOf, type Pinned } from './pinned.js'
import { applicationId, createTables, formatVersion } from './schema.js'
import type { Storage } from './storage.js'

const suffix = '.new-'

/** Makes the database. False when somebody else made it meanwhile. @throws Refusal when it cannot be written */
export function makeDatabase(
  files: { readonly database: string },
  pinned: Pinned,
  storage: Storage,
  { nonce, clock }: { readonly nonce: string; readonly clock: () => number },
): boolean {
  const temporary = `${files.database}${suffix}${nonce}`
  try {
    fill(storage, temporary, pinned, Math.trunc(clock()))
    syncPath(temporary)
    linkSync(temporary, files.database)
    syncPath(dirname(files.database))
    return true
  } catch (error) {
    // Whatever went wrong: if it is there now, another maker was faster (and may have cleared our half away).
    if (existsSync(files.database)) return false
    throw error instanceof Refusal ? error : fileTrouble(error, files.database)
  } finally {
    for (const end of ['', '-wal', '-shm', '-journal']) rmSync(temporary + end, { force: true })
  }
}

function fill(storage: Storage, path: string, pinned: Pinned, createdMs: number): void {
  const meta = metaOf(pinned, createdMs)
  const database = connect(storage, path, 'create')
  try {
    database.exec(`PRAGMA application_id = ${applicationId}; PRAGMA user_version = ${formatVersion}`)
    transact(database, () => {
      database.exec(createTables)
      const insert = database.prepare('INSERT INTO meta (key, value) VALUES (?, ?)')
      for (const row of meta) insert.run(...row)
      database.exec("INSERT INTO holder VALUES (1, 0, '', '', '', 0, '', 0, 0, 0)")
      database
        .prepare(
          `INSERT INTO appends (sequence, epoch, at_ms, arrivals, cpu_seconds, contents, head)
           VALUES (0, 0, ?, 0, 0, ?, ?)`,
        )
        .run(createdMs, emptyChainContents(), genesisOf(meta))
    })
    // Everything into the one file, which then stands alone.
    database.prepare('PRAGMA wal_checkpoint(TRUNCATE)').all()
  } finally {
    database.close()
  }
}

function syncPath(path: string): void {
  const file = openSync(path, 'r')
  try {
    fsyncSync(file)
  } finally {
    closeSync(file)
  }
}

/** Removes what a maker left behind that was killed. Only the holder of the record calls this. */
export function removeLeftovers(database: string): void {
  const folder = dirname(database)
  for (const name of readdirSync(folder)) {
    if (name.startsWith(basename(database) + suffix)) rmSync(join(folder, name), { force: true })
  }
}
