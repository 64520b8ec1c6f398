// A record is a folder:
//
//   record.db (-wal, -shm)  the database, the only truth
//   record.tail             witness of the last append (witness.ts)
//   plugin.mjs              copy of the pinned plug-in for the workers; the database's copy counts
//   search.yaml             copy of the search file, for people
//
// openRecord makes or continues one and holds it alone; readRecord looks on while somebody else holds it.

import { existsSync, mkdirSync, statSync } from 'node:fs'
import { join } from 'node:path'
import { check } from '../../shared/check.js'
import { equalBytes, hex } from '../../shared/digests.js'
import { Refusal, refuse } from '../../shared/refusals.js'
import type { Journal } from '../engine/ports.js'
import { makeDatabase, removeLeftovers } from './create.js'
import { connect, examineFile } from './database.js'
import type { GuardedDatabase } from './guard.js'
import {
  Hold,
  type Holder,
  isRunning,
  type ProcessIdentity,
  readHolder,
  renderTime,
  type Takeover,
} from './holder.js'
import { type Mirror, SqliteJournal } from './journal.js'
import { differences, type Pinned, readPinned, type SearchIdentity, writeCopies } from './pinned.js'
import { fileSystemOf, judgePlace } from './place.js'
import { SqliteReader, type StoredReader } from './reader.js'
import { formatVersion } from './schema.js'
import { type Storage, sqliteStorage } from './storage.js'
import { assertTail, type Verification, verifyChain } from './verify.js'
import { readWitness, Witness } from './witness.js'

/** Appends at the end that every start checks; the rest is checked by verifyRecord. */
const tailAppends = 64

/** Format of records that this version writes. */
export const recordVersion = formatVersion

export interface OpenOptions {
  /** What a new record is made of; without it only an existing record is opened. */
  readonly create?: Pinned
  /** What an existing record must be of; by default name and seed of `create`. */
  readonly expect?: SearchIdentity
  readonly holder: ProcessIdentity
  /** Unique to this opening, e.g. 16 random bytes in hexadecimal. */
  readonly nonce: string
  /** Milliseconds since 1970: told to people, never compared between machines. */
  readonly clock: () => number
  readonly takeover?: Takeover
  /** Goes on although the end of the record is missing (an older copy was put back). */
  readonly acceptLoss?: boolean
  readonly allowNetworkFileSystem?: boolean
  /** 'all' checks the whole chain before anything else. */
  readonly verify?: 'tail' | 'all'
  readonly storage?: Storage
  readonly isRunning?: (holder: ProcessIdentity) => boolean
  readonly fileSystem?: (folder: string) => number
  /** Keeps every append in a second place before it counts (shared-folder/). */
  readonly mirror?: Mirror
}

/** Appends that the record once had and has no more. */
export interface Loss {
  readonly appends: number
  readonly arrivals: number
}

export interface OpenRecord extends Pinned {
  readonly journal: Journal
  readonly reader: StoredReader
  readonly created: boolean
  /** Unlike that of any other record: hexadecimal digest of everything it was begun with, the moment among it. */
  readonly identity: string
  /** Counts the openings of this record; every append carries it. */
  readonly epoch: number
  /** What was found and done while opening, in sentences for people. */
  readonly notices: readonly string[]
  /** Present when `acceptLoss` was needed: worth an event. */
  readonly loss: Loss | undefined
  /**
   * A sign of life for coordinators on other machines; every two seconds or so. Gives the refusal that kept it from
   * being written instead of throwing it, because it is called by a timer; the next append meets the same.
   */
  beat(): Refusal | undefined
  /** Lets the record go. The journal and the reader are of no use after it. */
  close(): void
}

export interface RecordFolder {
  readonly database: string
  readonly witness: string
  readonly plugin: string
  readonly search: string
}
export function recordFolder(folder: string): RecordFolder {
  const at = (name: string) => join(folder, name)
  return {
    database: at('record.db'),
    witness: at('record.tail'),
    plugin: at('plugin.mjs'),
    search: at('search.yaml'),
  }
}

/**
 * Opens a record for writing, alone. Refuses at once, and names the holder, when another coordinator has it.
 * @throws Refusal record-missing, record-in-use, record-of-another-search, record-newer, record-corrupted,
 * network-file-system, disk-full, disk-read-only, disk-error
 */
export function openRecord(folder: string, options: OpenOptions): OpenRecord {
  const files = recordFolder(folder)
  const storage = options.storage ?? sqliteStorage
  const notices: string[] = []
  const created = prepareFolder(folder, files, storage, options, notices)
  examineFile(files.database)
  const database = connect(storage, files.database, 'write')
  try {
    const pinned = readPinned(database)
    assertExpected(folder, pinned, options.expect ?? options.create?.plan ?? {})
    const hold = Hold.take(database, {
      me: options.holder,
      nonce: options.nonce,
      clock: options.clock,
      takeover: options.takeover ?? 'if-dead',
      isRunning: options.isRunning ?? isRunning,
    })
    if (hold.tookOver) notices.push(`The record was ${hold.tookOver}.`)
    return settle({ database, hold, files, pinned, options, notices, created })
  } catch (error) {
    database.close()
    throw error
  }
}

/** Makes the database when there is none and may be one. True when it was made here. */
function prepareFolder(
  folder: string,
  files: RecordFolder,
  storage: Storage,
  options: OpenOptions,
  notices: string[],
): boolean {
  if (!existsSync(files.database)) {
    if (existsSync(files.witness) && readWitness(files.witness) !== undefined) throw lostDatabase(files)
    if (!options.create) throw refuse('record-missing', { detail: folder, where: { file: folder } })
    makeFolder(folder)
  }
  const warning = judgePlace(
    folder,
    (options.fileSystem ?? fileSystemOf)(folder),
    options.allowNetworkFileSystem ?? false,
  )
  if (warning) notices.push(warning)
  if (existsSync(files.database)) return false
  check(options.create !== undefined, 'a record is made from a plan')
  return makeDatabase(files, options.create, storage, { nonce: options.nonce, clock: options.clock })
}

function makeFolder(folder: string): void {
  try {
    mkdirSync(folder, { recursive: true })
  } catch (error) {
    const detail = `the folder could not be made (${error instanceof Error ? error.message : String(error)})`
    throw refuse('disk-read-only', { detail, where: { file: folder }, cause: error })
  }
}

function lostDatabase(files: RecordFolder): Error {
  const said = readWitness(files.witness)
  const kept =
    said === 'unreadable' || said === undefined
      ? ''
      : ` with ${said.appends} appends, ${said.arrivals} results`
  return refuse('record-corrupted', {
    detail: `record.db is missing, but there was one${kept}`,
    cure: 'Put record.db back from a backup; to begin anew, name another folder or remove record.tail as well.',
    where: { file: files.database },
  })
}

function assertExpected(folder: string, pinned: Pinned, expected: SearchIdentity): void {
  const found = differences(pinned.plan, expected)
  if (found.length === 0) return
  throw refuse('record-of-another-search', { detail: found.join('; '), where: { file: folder } })
}

interface Opening {
  readonly database: GuardedDatabase
  readonly hold: Hold
  readonly files: RecordFolder
  readonly pinned: Pinned
  readonly options: OpenOptions
  readonly notices: string[]
  readonly created: boolean
}

/** Everything after the hold: from here on nobody else changes the record. */
function settle(opening: Opening): OpenRecord {
  const { database, hold, files, pinned, options, notices, created } = opening
  const reader = new SqliteReader(database)
  const witness = new Witness(files.witness)
  let loss: Loss | undefined
  try {
    if (options.verify === 'all') assertWhole(database)
    else assertTail(database, reader.totals().appends, tailAppends)
    loss = compareWithWitness(database, reader, files, notices)
    if (loss && !options.acceptLoss) throw lossRefusal(files, reader, loss)
  } catch (error) {
    hold.release()
    throw error
  }
  removeLeftovers(files.database)
  notices.push(...writeCopies(files, pinned, created))
  witness.say(reader.totals())
  return {
    ...pinned,
    journal: new SqliteJournal({
      database,
      reader,
      hold,
      witness,
      clock: options.clock,
      ...(options.mirror ? { mirror: options.mirror } : {}),
    }),
    reader,
    created,
    identity: identityOf(database),
    epoch: hold.epoch,
    notices,
    loss,
    beat: () => beatOnce(hold),
    close: () => {
      hold.release()
      witness.close()
      database.close()
    },
  }
}

/** The head of append 0, from which the whole chain hangs. */
function identityOf(database: GuardedDatabase): string {
  const head = database.prepare('SELECT head FROM appends WHERE sequence = 0').get()?.[0]
  check(head instanceof Uint8Array, 'a record that was opened has its beginning')
  return hex(head)
}

function beatOnce(hold: Hold): Refusal | undefined {
  try {
    hold.beat()
    return undefined
  } catch (error) {
    if (error instanceof Refusal) return error
    throw error
  }
}

function assertWhole(database: GuardedDatabase): void {
  const { intact, sentences } = verifyChain(database)
  if (!intact) throw refuse('record-corrupted', { detail: sentences.join(' ') })
}

/** What the witness saw and the database lacks. */
function compareWithWitness(
  database: GuardedDatabase,
  reader: StoredReader,
  files: RecordFolder,
  notices: string[],
): Loss | undefined {
  const said = readWitness(files.witness)
  const { appends, arrivals } = reader.totals()
  if (said === undefined || said === 'unreadable') {
    if (appends > 0) {
      const state = said === undefined ? 'missing' : 'damaged'
      notices.push(
        `record.tail is ${state} and was written again: whether the end of the record is missing cannot be told this time.`,
      )
    }
    return undefined
  }
  if (said.appends > appends) {
    return { appends: said.appends - appends, arrivals: said.arrivals - arrivals }
  }
  const head = database.prepare('SELECT head FROM appends WHERE sequence = ?').get(said.appends)?.[0]
  if (head instanceof Uint8Array && equalBytes(head, said.head)) return undefined
  // The same length, another history: a copy of another record, or one that went on from an older copy.
  return { appends: 0, arrivals: 0 }
}

function lossRefusal(files: RecordFolder, reader: StoredReader, loss: Loss): Error {
  const { appends, lastMs } = reader.totals()
  const said = readWitness(files.witness)
  const until = said === undefined || said === 'unreadable' ? '' : ` (the last at ${renderTime(said.lastMs)})`
  const ends = appends > 0 ? `ends at append ${appends} of ${renderTime(lastMs)}` : 'has no append'
  const detail =
    loss.appends > 0
      ? `its end is missing: the database ${ends}, but ${loss.appends} more${until} with ${loss.arrivals} results had been kept. An older copy may have been put back, or record.db-wal deleted`
      : 'record.tail tells of another history than the database holds; one of the two comes from another record'
  return refuse('record-corrupted', {
    detail,
    cure: 'Put back the newest copy of the whole folder, or accept the loss: the missing simulations are then run again, with the same results.',
    where: { file: files.database },
  })
}

export interface ReadOnlyRecord extends Pinned {
  readonly reader: StoredReader
  /** Who holds the record; undefined when it is free. `running` is undefined for a holder on another machine. */
  holder(): (Holder & { readonly running: boolean | undefined }) | undefined
  /** Checks the whole chain; takes seconds for a million evaluations. */
  verify(progress?: (appends: number) => void): Verification
  close(): void
}

/** Opens a record to look at it, also while a coordinator writes. Changes nothing. @throws Refusal as openRecord */
export function readRecord(
  folder: string,
  { storage = sqliteStorage, me }: { readonly storage?: Storage; readonly me?: ProcessIdentity } = {},
): ReadOnlyRecord {
  const files = recordFolder(folder)
  if (!existsSync(files.database) || !statSync(files.database).isFile()) {
    if (existsSync(files.witness)) throw lostDatabase(files)
    throw refuse('record-missing', { detail: folder, where: { file: folder } })
  }
  examineFile(files.database)
  const database = connect(storage, files.database, 'read')
  try {
    const pinned = readPinned(database)
    return {
      ...pinned,
      reader: new SqliteReader(database),
      holder: () => {
        const holder = readHolder(database)
        if (holder.nonce === '') return undefined
        return { ...holder, running: me && holder.machine === me.machine ? isRunning(holder) : undefined }
      },
      verify: (progress) => verifyChain(database, progress),
      close: () => database.close(),
    }
  } catch (error) {
    database.close()
    throw error
  }
}

/** Checks a record from end to end: the first bad append, and what is intact. @throws Refusal as readRecord */
export function verifyRecord(
  folder: string,
  options: { readonly storage?: Storage; readonly progress?: (appends: number) => void } = {},
): Verification {
  const record = readRecord(folder, options.storage ? { storage: options.storage } : {})
  try {
    return record.verify(options.progress)
  } finally {
    record.close()
  }
}

/**
 * Watches a holder on another machine: resolves with what was seen when it gave no sign of life for `seconds`
 * (for `takeover`), with undefined when it did or the record is free.
 */
export async function watchHolder(
  folder: string,
  seconds: number,
  wait: (milliseconds: number) => Promise<void>,
): Promise<{ readonly epoch: number; readonly nonce: string; readonly beats: number } | undefined> {
  const look = () => {
    const record = readRecord(folder)
    try {
      const holder = record.holder()
      return holder && { holder, appends: record.reader.totals().appends }
    } finally {
      record.close()
    }
  }
  const first = look()
  if (!first) return undefined
  for (let left = seconds; left > 0; left -= 1) {
    await wait(1000 * Math.min(1, left))
    const now = look()
    if (!now || now.appends !== first.appends || now.holder.epoch !== first.holder.epoch) return undefined
    if (now.holder.beats !== first.holder.beats || now.holder.nonce !== first.holder.nonce) return undefined
  }
  const { epoch, nonce, beats } = first.holder
  return { epoch, nonce, beats }
}
