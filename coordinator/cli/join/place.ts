// Where a record lies: a database in a folder of this machine, or a journal in a folder that several machines share,
// with a work copy here. Everything else need not know which.

import { existsSync, mkdtempSync, rmSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { refuse } from '../../../shared/refusals.js'
import {
  copyShared,
  isRunning,
  isShared,
  type OpenOptions,
  type OpenRecord,
  openRecord,
  openShared,
  type ReadOnlyRecord,
  readRecord,
  recordFolder,
  sharedHolder,
  type Takeover,
  thisProcess,
  watchHolder,
  watchSharedHolder,
  workCopyOf,
} from '../../record/index.js'

/** Who holds a record; `running` is undefined for a holder on another machine. */
export interface SeenHolder {
  readonly host: string
  readonly pid: number
  readonly sinceMs: number
  readonly running: boolean | undefined
}

export interface RecordPlace {
  /** Where the pinned plug-in and the database of this machine lie. */
  readonly here: string
  exists(): boolean
  open(options: OpenOptions): OpenRecord
  holder(): SeenHolder | undefined
  /** Watches a holder on another machine; undefined when it gave a sign of life. */
  watch(
    seconds: number,
    wait: (milliseconds: number) => Promise<void>,
  ): Promise<Exclude<Takeover, string> | undefined>
  /** Opens it to look at it; changes nothing. */
  read(): ReadOnlyRecord
}

/** Folder for work copies where none is named: that of the job, where there is one. */
export function usualScratch(): string {
  return process.env.SLURM_TMPDIR ?? process.env.TMPDIR ?? tmpdir()
}

/**
 * The record of `folder`; with `scratch`, or where it is one already, in the form for shared folders.
 * @throws Refusal 'usage' for `scratch` with a record that is a database already
 */
export function placeOf(folder: string, scratch?: string): RecordPlace {
  if (isShared(folder)) return sharedPlace(folder, scratch ?? usualScratch())
  if (scratch === undefined) return ownPlace(folder)
  if (existsSync(recordFolder(folder).database)) {
    throw refuse('usage', {
      detail: `--scratch, but the record in ${folder} is a database of one machine already`,
      cure: 'Leave --scratch out, or begin a record in another folder.',
    })
  }
  return sharedPlace(folder, scratch)
}

function ownPlace(folder: string): RecordPlace {
  return {
    here: folder,
    exists: () => existsSync(recordFolder(folder).database),
    open: (options) => openRecord(folder, options),
    holder: () => {
      const record = readRecord(folder, { me: thisProcess() })
      try {
        return record.holder()
      } finally {
        record.close()
      }
    },
    watch: (seconds, wait) => watchHolder(folder, seconds, wait),
    read: () => readRecord(folder, { me: thisProcess() }),
  }
}

function sharedPlace(folder: string, scratch: string): RecordPlace {
  const place = { folder, scratch }
  const holder = (): SeenHolder | undefined => {
    const claimed = isShared(folder) ? sharedHolder(folder) : undefined
    if (!claimed) return undefined
    return { ...claimed, running: claimed.machine === thisProcess().machine ? isRunning(claimed) : undefined }
  }
  return {
    here: workCopyOf(place),
    exists: () => isShared(folder),
    open: (options) => openShared(place, options),
    holder,
    watch: (seconds, wait) => watchSharedHolder(folder, seconds, wait),
    read: () => readCopy(folder),
  }
}

/** A copy for this one reader, removed with it. */
function readCopy(folder: string): ReadOnlyRecord {
  const copy = mkdtempSync(join(tmpdir(), 'skerry-look-'))
  const remove = () => rmSync(copy, { recursive: true, force: true })
  try {
    copyShared(folder, copy)
    const record = readRecord(copy)
    return {
      ...record,
      close: () => {
        record.close()
        remove()
      },
    }
  } catch (error) {
    remove()
    throw error
  }
}
