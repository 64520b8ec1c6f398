// The folder where records shall lie: is it a place where locks hold, new files are exclusive and a sync is a sync?
// Everything is tried, in a file of its own that is removed again.

import { execFileSync } from 'node:child_process'
import {
  closeSync,
  existsSync,
  fsyncSync,
  mkdtempSync,
  openSync,
  renameSync,
  rmSync,
  statfsSync,
  writeSync,
} from 'node:fs'
import { dirname, join, resolve } from 'node:path'
import { fileURLToPath } from 'node:url'
import { Refusal } from '../../../shared/refusals.js'
import { fileSystemOf, judgePlace } from '../../record/place.js'
import { bad, doubtful, good, type Line } from './line.js'

const syncs = 32
const pageBytes = 4096
const freeBytesLeast = 2 ** 30
/** A search waits for a sync a few times a second. */
const slowSyncMs = 50

/** Looks at `folder`, or the nearest one above it that exists. */
export function judgeFolder(folder: string): Line[] {
  const place = nearest(resolve(folder))
  const kind = fileSystem(place)
  let scratch: string
  try {
    scratch = mkdtempSync(join(place, '.skerry-preflight-'))
  } catch (error) {
    return [kind, bad('writable', `${place}: ${messageOf(error)}`, 'name a folder that you may write')]
  }
  try {
    return [kind, room(place), exclusive(scratch), locks(scratch), sync(scratch)]
  } finally {
    rmSync(scratch, { recursive: true, force: true })
  }
}

function nearest(folder: string): string {
  return existsSync(folder) || dirname(folder) === folder ? folder : nearest(dirname(folder))
}

function fileSystem(place: string): Line {
  try {
    const warning = judgePlace(place, fileSystemOf(place), false)
    return warning === undefined
      ? good('file system', `${place} is on a local file system`)
      : doubtful('file system', warning, 'prefer a local disk')
  } catch (error) {
    if (!(error instanceof Refusal)) throw error
    const cure =
      'run with --scratch DIR on a local disk: the record then lies here in a form that network folders can hold'
    return doubtful('file system', error.detail, cure)
  }
}

function room(place: string): Line {
  const { bavail, bsize } = statfsSync(place)
  const bytes = bavail * bsize
  const found = `${(bytes / 2 ** 30).toFixed(1)} GB free`
  return bytes >= freeBytesLeast
    ? good('room', found)
    : doubtful('room', found, 'make room: about 100 bytes an evaluation, and the genomes')
}

/** Creating a file that must not exist, and renaming over one that does. */
function exclusive(scratch: string): Line {
  const path = join(scratch, 'exclusive')
  closeSync(openSync(path, 'wx'))
  try {
    closeSync(openSync(path, 'wx'))
    return bad('exclusive files', 'a file could be created twice', 'use another file system')
  } catch {
    renameSync(path, join(scratch, 'renamed'))
    return good('exclusive files', 'a second creator is refused, renaming works')
  }
}

/** A second process must be refused the write lock that the first one holds. */
function locks(scratch: string): Line {
  const probe = fileURLToPath(new URL('./lock-child.js', import.meta.url))
  try {
    const answer = execFileSync(process.execPath, [probe, join(scratch, 'locks.db')], {
      encoding: 'utf8',
      timeout: 20_000,
    }).trim()
    if (answer === 'refused') return good('locks', 'a second writer of a database is refused')
    const cure = 'do not put a record here; use a local disk'
    return bad('locks', 'two processes could write the same database at once', cure)
  } catch (error) {
    return bad('locks', `they could not be tried: ${messageOf(error)}`, 'use a local disk')
  }
}

/** How long it takes until 4 kB are on the disk. */
function sync(scratch: string): Line {
  const page = new Uint8Array(pageBytes)
  const file = openSync(join(scratch, 'sync'), 'w')
  try {
    const times: number[] = []
    for (let n = 0; n < syncs; n++) {
      const startMs = performance.now()
      writeSync(file, page)
      fsyncSync(file)
      times.push(performance.now() - startMs)
    }
    times.sort((a, b) => a - b)
    const median = times[Math.floor(syncs / 2)]!
    const found = `${median.toFixed(2)} ms for 4 kB (median of ${syncs}), the slowest ${times.at(-1)!.toFixed(2)} ms`
    if (median > slowSyncMs)
      return doubtful('sync', found, 'a faster disk: every step of a search waits for it')
    return good('sync', found)
  } finally {
    closeSync(file)
  }
}

function messageOf(error: unknown): string {
  return error instanceof Error ? error.message.split('\n')[0]! : String(error)
}
