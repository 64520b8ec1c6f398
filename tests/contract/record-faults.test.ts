// A disk that fails: every storage call in turn on a double, then a real disk that is full or read-only.

import { execFileSync } from 'node:child_process'
import { cpSync, mkdirSync, rmSync, writeFileSync } from 'node:fs'
import { join } from 'node:path'
import { isDeepStrictEqual } from 'node:util'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import type { Append } from '../../coordinator/engine/ports.js'
import { type Fault, FaultyStorage } from '../../coordinator/record/faulty.js'
import { mayTryAgain, type OpenRecord, recordFolder, verifyRecord } from '../../coordinator/record/index.js'
import { sqliteStorage } from '../../coordinator/record/storage.js'
import { Refusal } from '../../shared/refusals.js'
import { refusalOf } from './record.js'
import { arrival, contentOf, good, madeUpSearch, openAt, rows, temporaryFolder } from './record-fixture.js'

const fresh = temporaryFolder()
const work = temporaryFolder()
const appends = [...madeUpSearch(51, { batches: 2, islands: 1, perBatch: 2 })]
let expected: unknown
let callsOfOpening = 0
let callsOfRun = 0

beforeAll(() => {
  openAt(fresh.folder).close()
  const storage = new FaultyStorage(sqliteStorage)
  inCopy((folder) => {
    const record = openAt(folder, { storage })
    callsOfOpening = storage.calls
    for (const append of appends) record.journal.append(append)
    callsOfRun = storage.calls
    expected = contentOf(record.reader, 2, 10)
    record.close()
  })
})
afterAll(() => {
  fresh.remove()
  work.remove()
})

function inCopy(action: (folder: string) => void): void {
  rmSync(work.folder, { recursive: true, force: true })
  cpSync(fresh.folder, work.folder, { recursive: true })
  action(work.folder)
}

/** Appends until the disk refuses for good; returns how many were acknowledged. */
function runUntilRefused(folder: string, storage: FaultyStorage, todo: readonly Append[]): number {
  let record: OpenRecord
  try {
    record = openAt(folder, { storage })
  } catch (error) {
    expect(error).toBeInstanceOf(Refusal)
    return 0
  }
  let acknowledged = 0
  try {
    for (const append of todo) {
      try {
        record.journal.append(append)
      } catch (error) {
        expect(error).toBeInstanceOf(Refusal)
        if (!mayTryAgain(error as Refusal)) {
          // Nothing may go through this connection any more, also when the disk is well again.
          storage.mend()
          expect(refusalOf(() => record.journal.append(append))).toBe(error)
          expect(refusalOf(() => record.reader.lastCommit(1))).toBe(error)
          return acknowledged
        }
        storage.mend()
        record.journal.append(append)
      }
      acknowledged += 1
    }
  } finally {
    storage.mend()
    record.close()
  }
  return acknowledged
}

/** With the disk mended: nothing acknowledged is lost, nothing is there twice, and the rest can be appended. */
function assertNothingLost(folder: string, acknowledged: number, what: string): void {
  const record = openAt(folder, { isRunning: () => false })
  const there = record.reader.totals().appends
  expect(there, what).toBeGreaterThanOrEqual(acknowledged)
  expect(there, what).toBeLessThanOrEqual(acknowledged + 1)
  for (const append of appends.slice(there)) record.journal.append(append)
  expect(isDeepStrictEqual(contentOf(record.reader, 2, 10), expected), what).toBe(true)
  record.close()
}

const faults: readonly Omit<Fault, 'at'>[] = [
  { lasting: false, when: 'before', code: 'SQLITE_FULL' },
  { lasting: false, when: 'after', code: 'SQLITE_FULL' },
  { lasting: false, when: 'after', code: 'SQLITE_IOERR_FSYNC' },
  { lasting: true, when: 'before', code: 'SQLITE_IOERR_WRITE' },
]

describe('the k-th storage call fails', () => {
  test.each(faults)('%o: for every k, nothing acknowledged is lost or doubled', (fault) => {
    expect(callsOfRun).toBeGreaterThan(callsOfOpening + 2 * 10)
    for (let at = 1; at <= callsOfRun; at++) {
      const what = `call ${at} of ${callsOfRun}`
      inCopy((folder) => {
        const storage = new FaultyStorage(sqliteStorage, { ...fault, at })
        const acknowledged = runUntilRefused(folder, storage, appends)
        expect(storage.failures, what).toBeGreaterThan(0)
        assertNothingLost(folder, acknowledged, what)
      })
    }
    expect(verifyRecord(work.folder).intact).toBe(true)
  })

  test('while a record is made: there is none, or a whole one', () => {
    const counting = new FaultyStorage(sqliteStorage)
    const { folder, remove } = temporaryFolder()
    openAt(folder, { storage: counting }).close()
    for (let at = 1; at <= counting.calls; at += 2) {
      rmSync(folder, { recursive: true, force: true })
      const storage = new FaultyStorage(sqliteStorage, {
        at,
        lasting: true,
        when: 'before',
        code: 'SQLITE_IOERR_WRITE',
      })
      const refusal = refusalOf(() => openAt(folder, { storage }).close())
      if (refusal) expect(refusal.code).toBe('disk-error')
      openAt(folder, { isRunning: () => false }).close()
      expect(verifyRecord(folder).intact, `call ${at}`).toBe(true)
    }
    remove()
  })

  test('the refusals carry the exit code of input and output and name the file', () => {
    const codes = [
      ['SQLITE_FULL', 'disk-full', 74],
      ['SQLITE_READONLY_DBMOVED', 'disk-read-only', 74],
      ['SQLITE_IOERR_FSYNC', 'disk-error', 74],
      ['SQLITE_CORRUPT', 'record-corrupted', 65],
      ['SQLITE_BUSY', 'record-in-use', 77],
      ['SQLITE_SOMETHING_NEW', 'disk-error', 74],
    ] as const
    inCopy((folder) => {
      for (const [code, refused, exitCode] of codes) {
        const storage = new FaultyStorage(sqliteStorage)
        const record = openAt(folder, { storage, takeover: 'force' })
        storage.breakAt({ at: storage.calls + 1, lasting: false, when: 'before', code })
        const refusal = refusalOf(() => record.journal.append(rows({ arrivals: [arrival(5, 1, good(1))] })))
        expect(refusal).toMatchObject({ code: refused, exitCode })
        expect(refusal?.where?.file).toBe(recordFolder(folder).database)
        expect(refusal?.detail).toContain(code)
        record.close()
      }
    })
  })
})

const mayMount = process.platform === 'linux' && process.getuid?.() === 0 && canMount()
function canMount(): boolean {
  const { folder, remove } = temporaryFolder()
  try {
    mkdirSync(folder, { recursive: true })
    execFileSync('mount', ['-t', 'tmpfs', '-o', 'size=64k', 'tmpfs', folder], { stdio: 'ignore' })
    execFileSync('umount', [folder], { stdio: 'ignore' })
    return true
  } catch {
    return false
  } finally {
    remove()
  }
}

/** Runs `action` in a file system of one MiB. */
function onSmallDisk(action: (folder: string, base: string) => void): void {
  const { folder: base, remove } = temporaryFolder()
  mkdirSync(base, { recursive: true })
  execFileSync('mount', ['-t', 'tmpfs', '-o', 'size=1m', 'tmpfs', base])
  try {
    action(join(base, 'record'), base)
  } finally {
    execFileSync('umount', ['-l', base])
    remove()
  }
}

describe('a real disk', () => {
  const needs = mayMount ? '' : ' (not run: needs root on Linux and the right to mount)'

  test.skipIf(!mayMount)(
    `that is full: refused, nothing half done, goes on when there is room${needs}`,
    () => {
      onSmallDisk((folder, base) => {
        const ballast = join(base, 'ballast')
        const record = openAt(folder)
        writeFileSync(ballast, Buffer.alloc(450 * 1024))
        const appended: Append[] = []
        let refusal: Refusal | undefined
        let refused: Append | undefined
        for (const append of madeUpSearch(61, { batches: 400, islands: 2, perBatch: 10 })) {
          refused = append
          refusal = refusalOf(() => record.journal.append(append))
          if (refusal) break
          appended.push(append)
        }
        expect(refusal?.code).toBe('disk-full')
        expect(refusal?.exitCode).toBe(74)
        // It stays refused as long as the disk is full, and nothing of it is there.
        expect(refusalOf(() => record.journal.append(refused!))?.code).toBe('disk-full')
        expect(record.reader.totals().appends).toBe(appended.length)
        rmSync(ballast)
        record.journal.append(refused!)
        record.close()
        const again = openAt(folder)
        const { arrivals } = again.reader.totals()
        expect(arrivals).toBe(20 * (appended.length + 1))
        expect([...again.reader.arrivals(1)].length).toBe(10 * (appended.length + 1))
        again.close()
        expect(verifyRecord(folder).intact).toBe(true)
      })
    },
  )

  test.skipIf(!mayMount)(`that is read-only is refused as such${needs}`, () => {
    onSmallDisk((folder, base) => {
      openAt(folder).close()
      execFileSync('mount', ['-o', 'remount,ro', base])
      const refusal = refusalOf(() => openAt(folder))
      expect(refusal?.code).toBe('disk-read-only')
      expect(refusal?.exitCode).toBe(74)
      expect(refusalOf(() => openAt(join(base, 'other')))?.code).toBe('disk-read-only')
    })
  })
})
