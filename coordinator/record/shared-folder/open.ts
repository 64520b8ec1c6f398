// A record in a folder that several machines share, over a file system that SQLite's log cannot live on:
//
//   RECORD/journal/            bases, journal files and claims (segments.ts, claims.ts): the truth
//   SCRATCH/<name>/record.db   work copy on this machine's own disk, put together from there
//
// Every append is written and synced there before its transaction in the work copy ends, so that what was acknowledged
// is never only on a disk that may vanish with its node. A node that is gone costs its successor the time to put the
// work copy together. Two coordinators that do not see each other cost time, not truth: the appends of the earlier one
// beyond what the later one found do not count, and the simulations in them run again with the same results. What an
// operator or a convicted worker changed in such appends is lost with them; it must be said again.

import {
  closeSync,
  copyFileSync,
  existsSync,
  fsyncSync,
  mkdirSync,
  openSync,
  renameSync,
  rmSync,
} from 'node:fs'
import { hostname } from 'node:os'
import { basename, join, resolve } from 'node:path'
import { check } from '../../../shared/check.js'
import { refuse } from '../../../shared/refusals.js'
import { makeDatabase } from '../create.js'
import { connect, transact } from '../database.js'
import { fileTrouble } from '../files.js'
import { isRunning } from '../holder.js'
import { type OpenOptions, type OpenRecord, openRecord, recordFolder } from '../open.js'
import { sqliteStorage } from '../storage.js'
import { beatsOf, Claim, type Claimed, claimOf, forgetClaims, lastEpoch } from './claims.js'
import { pointOf, removeDatabase, restore } from './restore.js'
import {
  basePath,
  forgetBases,
  forgetSegments,
  newestBase,
  type Point,
  SegmentWriter,
  segmentBytes,
  syncFolder,
} from './segments.js'

/** Journal files beyond this are replaced by a new base when a record is opened. */
const journalBytesMost = 64 * 2 ** 20
/** Claims that stay, for whoever is still working under one. */
const claimsKept = 8

export interface SharedPlace {
  /** The record as people know it, on the shared file system. */
  readonly folder: string
  /** Folder on this machine's own disk for work copies. */
  readonly scratch: string
}

export const journalFolder = (folder: string): string => join(folder, 'journal')

/** True when the record of this folder is kept as a journal for several machines. */
export function isShared(folder: string): boolean {
  return existsSync(journalFolder(folder))
}

/** Where this machine's work copy of the record lies. */
export function workCopyOf({ folder, scratch }: SharedPlace): string {
  return join(scratch, `skerry-${basename(resolve(folder))}`)
}

/** What was seen of a holder on another machine, for a takeover that relies on its silence. */
export interface SharedHolderSeen {
  readonly epoch: number
  readonly nonce: string
  readonly beats: number
}

/** Opens the record for writing, alone. @throws Refusal as openRecord */
export function openShared(place: SharedPlace, options: OpenOptions): OpenRecord {
  const journal = journalFolder(place.folder)
  makeFolder(journal)
  const previous = lastEpoch(journal)
  const tookOver = assertFree(journal, previous, options)
  const claim = Claim.make(journal, previous, options.holder, options.nonce, options.clock)
  try {
    const copy = workCopyOf(place)
    mkdirSync(copy, { recursive: true })
    const created = putTogether(journal, copy, options)
    const at = prepare(journal, copy, claim.epoch)
    const segments = new SegmentWriter(journal, claim.epoch, at)
    const record = openRecord(copy, {
      ...withoutCreate(options),
      takeover: 'force',
      acceptLoss: true,
      mirror: (entry) => {
        claim.assertHeld()
        segments.write(entry)
      },
    })
    check(record.epoch === claim.epoch, 'the hold on the work copy has the number of the claim')
    forgetClaims(journal, claim.epoch - claimsKept)
    return {
      ...record,
      created,
      loss: undefined,
      notices: [
        ...(tookOver === undefined ? [] : [`The record was ${tookOver}.`]),
        `Work copy on ${hostname()}: ${copy}.`,
      ],
      beat: () => {
        try {
          claim.beat()
        } catch (error) {
          return fileTrouble(error, journal)
        }
        return record.beat()
      },
      close: () => {
        record.close()
        segments.close()
        claim.release()
      },
    }
  } catch (error) {
    claim.release()
    throw error
  }
}

function withoutCreate({ create, ...rest }: OpenOptions): OpenOptions {
  return create ? { ...rest, expect: rest.expect ?? create.plan } : rest
}

function makeFolder(folder: string): void {
  try {
    mkdirSync(folder, { recursive: true })
  } catch (error) {
    throw fileTrouble(error, folder)
  }
}

/** How the former holder was passed over; undefined when there is none. @throws Refusal 'record-in-use' */
function assertFree(journal: string, epoch: number, options: OpenOptions): string | undefined {
  const claimed = claimOf(journal, epoch)
  if (!claimed) return undefined
  const name = `process ${claimed.pid} on ${claimed.host}`
  const { takeover = 'if-dead', holder } = options
  if (takeover === 'force') return `taken over by force from ${name}`
  const here = claimed.machine === holder.machine
  if (here && !(options.isRunning ?? isRunning)(claimed))
    return `taken over from ${name}, which is no longer running`
  if (!here && takeover !== 'if-dead') {
    const silent =
      takeover.epoch === epoch &&
      takeover.nonce === claimed.nonce &&
      takeover.beats === beatsOf(journal, epoch)
    if (silent) return `taken over from ${name}, which gave no sign of life while it was watched`
  }
  throw refuse('record-in-use', {
    detail: name,
    cure: here
      ? `Wait for it to end, or stop it: kill ${claimed.pid}`
      : `Stop it on ${claimed.host}; if that machine is gone, take the record over once its silence is certain.`,
  })
}

/** Makes the work copy. True when the record itself was made here. */
function putTogether(journal: string, copy: string, options: OpenOptions): boolean {
  const { database, witness } = recordFolder(copy)
  // It speaks of the work copy only; the journal tells what there was.
  rmSync(witness, { force: true })
  if (restore(journal, database)) return false
  if (!options.create) throw refuse('record-missing', { detail: journal, where: { file: journal } })
  removeDatabase(database)
  makeDatabase({ database }, options.create, options.storage ?? sqliteStorage, options)
  const made = connect(sqliteStorage, database, 'write')
  const at = pointOf(made)
  made.prepare('PRAGMA wal_checkpoint(TRUNCATE)').all()
  made.close()
  check(at !== undefined, 'a new database has a beginning')
  writeBase(journal, database, at)
  return true
}

/** Gives the work copy the epoch of the claim and the shared folder a new base where the journal has grown long. */
function prepare(journal: string, copy: string, epoch: number): Point {
  const { database: path } = recordFolder(copy)
  const database = connect(sqliteStorage, path, 'write')
  try {
    transact(database, () => {
      database.prepare("UPDATE holder SET epoch = ?, nonce = '' WHERE one = 1").run(epoch - 1)
    })
    const at = pointOf(database)
    check(at !== undefined, 'a work copy has a beginning')
    if (segmentBytes(journal) > journalBytesMost && newestBase(journal)!.sequence < at.sequence) {
      database.prepare('PRAGMA wal_checkpoint(TRUNCATE)').all()
      writeBase(journal, path, at)
      forgetSegments(journal, at.sequence)
      forgetBases(journal, at.sequence)
    }
    return at
  } finally {
    database.close()
  }
}

/** Copies a database that nobody writes at this moment; there as a whole or not at all. */
function writeBase(journal: string, database: string, at: Point): void {
  const path = basePath(journal, at)
  const temporary = `${path}.new`
  try {
    copyFileSync(database, temporary)
    const file = openSync(temporary, 'r')
    try {
      fsyncSync(file)
    } finally {
      closeSync(file)
    }
    renameSync(temporary, path)
    syncFolder(journal)
  } catch (error) {
    throw fileTrouble(error, path)
  }
}

// ----------------------------------------------------------------------------------------- looking on

/** Who holds the record. */
export function sharedHolder(folder: string): (Claimed & { readonly beats: number }) | undefined {
  const journal = journalFolder(folder)
  const epoch = lastEpoch(journal)
  const claimed = claimOf(journal, epoch)
  return claimed && { ...claimed, beats: beatsOf(journal, epoch) }
}

/** Watches a holder on another machine; what was seen when it gave no sign of life, undefined when it did. */
export async function watchSharedHolder(
  folder: string,
  seconds: number,
  wait: (milliseconds: number) => Promise<void>,
): Promise<SharedHolderSeen | undefined> {
  const first = sharedHolder(folder)
  if (!first) return undefined
  for (let left = seconds; left > 0; left -= 1) {
    await wait(1000 * Math.min(1, left))
    const now = sharedHolder(folder)
    if (!now || now.epoch !== first.epoch || now.beats !== first.beats) return undefined
  }
  return { epoch: first.epoch, nonce: first.nonce, beats: first.beats }
}

/** Puts a copy of the record together in `into`, for somebody who only wants to read it. @throws Refusal */
export function copyShared(folder: string, into: string): void {
  const journal = journalFolder(folder)
  mkdirSync(into, { recursive: true })
  if (restore(journal, recordFolder(into).database)) return
  throw refuse('record-missing', { detail: folder, where: { file: folder } })
}
