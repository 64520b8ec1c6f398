// Damaged, foreign and older files: each is refused in words that a stranger can act on, and nothing wrong is
// ever read as if it were right.

import {
  copyFileSync,
  cpSync,
  existsSync,
  readFileSync,
  rmSync,
  statSync,
  truncateSync,
  writeFileSync,
} from 'node:fs'
import { join } from 'node:path'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { isSafeSqlite } from '../../coordinator/record/database.js'
import { type OpenOptions, readRecord, recordFolder, verifyRecord } from '../../coordinator/record/index.js'
import { judgePlace } from '../../coordinator/record/place.js'
import { sqliteStorage } from '../../coordinator/record/storage.js'
import { renderRefusal } from '../../shared/refusals.js'
import { refusalOf } from './record.js'
import { arrival, good, madeUpSearch, openAt, pinned, rows, temporaryFolder } from './record-fixture.js'

const source = temporaryFolder()
const batches = 60
const shape = { batches, perBatch: 4, islands: 3 }
const evaluations = batches * 4

beforeAll(() => {
  const record = openAt(source.folder)
  for (const append of madeUpSearch(31, shape)) record.journal.append(append)
  record.close()
})
afterAll(source.remove)

/** Runs `action` on a fresh copy of the record. */
function onCopy<T>(action: (folder: string) => T): T {
  const { folder, remove } = temporaryFolder()
  try {
    cpSync(source.folder, folder, { recursive: true })
    return action(folder)
  } finally {
    remove()
  }
}
const openRefused = (folder: string, options: Partial<OpenOptions> = {}) =>
  refusalOf(() => openAt(folder, options).close())

function sql(folder: string, statement: string, ...values: (number | string | Uint8Array | null)[]): void {
  const database = sqliteStorage.open(recordFolder(folder).database, 'write')
  database.prepare(statement).run(...values)
  database.close()
}

describe('a whole record', () => {
  test('is verified as whole, with its counts', () => {
    expect(verifyRecord(source.folder)).toMatchObject({
      intact: true,
      appends: batches,
      firstBad: undefined,
      intactBefore: { appends: batches, arrivals: 3 * evaluations },
      damagedSnapshots: 0,
    })
  })

  test('with overruled results is verified as whole, and a change of an overruled result is found', () => {
    onCopy((folder) => {
      const record = openAt(folder)
      record.journal.append(rows({ arrivals: [arrival(1, 700, good(1)), arrival(1, 701, good(1))] }))
      record.journal.append(rows({ arrivals: [arrival(1, 700, good(2)), arrival(1, 702, good(3))] }))
      const many = [
        arrival(1, 700, good(3)),
        arrival(1, 700, good(4)),
        arrival(1, 703, good(5)),
        arrival(1, 703, good(6)),
      ]
      record.journal.append(rows({ arrivals: many }))
      record.journal.append(rows({ arrivals: [arrival(1, 703, good(7))] }))
      record.close()
      expect(verifyRecord(folder).sentences).toEqual([
        `All ${batches + 4} appends with ${3 * evaluations + 9} results hold.`,
      ])
      openAt(folder, { verify: 'all' }).close()
      sql(folder, 'UPDATE overruled SET attempt = 9 WHERE evaluation = 703 AND number = 2')
      expect(verifyRecord(folder).firstBad?.append).toBe(batches + 3)
    })
  })
})

describe('damage inside the chain', () => {
  const changes: readonly (readonly [string, string, number])[] = [
    ['a number of a result', 'UPDATE results SET cpu_seconds = 1 WHERE island = 2 AND evaluation = 37', 10],
    [
      'a result moved to another worker',
      'UPDATE results SET worker = worker % 7 + 1 WHERE island = 1 AND evaluation = 80',
      20,
    ],
    ['a missing result', 'DELETE FROM results WHERE island = 3 AND evaluation = 121', 31],
    [
      'a commit of another evaluation',
      'UPDATE commits SET evaluations = NULL WHERE island = 2 AND first = 45',
      12,
    ],
    ['a digest of a commit', 'UPDATE commits SET digest = zeroblob(32) WHERE island = 1 AND first = 5', 2],
    ['a sentence of an event', "UPDATE events SET sentence = 'all is well' WHERE sequence = 5", 15],
    ['a confirmation turned', 'UPDATE confirmations SET agrees = 1 WHERE agrees = 0 AND evaluation = 16', 4],
    ['a genome', 'UPDATE births SET genome = zeroblob(16) WHERE id % 4096 = 77', 20],
    ['mail', 'UPDATE mail SET ended = 1 WHERE epoch = 8', 8],
    ['a worker renamed', "UPDATE workers SET host = 'elsewhere' WHERE number = 1", 1],
    ['a missing append', 'DELETE FROM appends WHERE sequence = 50', 50],
    ['an append dated otherwise', 'UPDATE appends SET at_ms = at_ms + 1 WHERE sequence = 51', 51],
  ]
  test.each(changes)('%s: the first bad append is told, and what is intact', (_what, statement, first) => {
    onCopy((folder) => {
      sql(folder, statement)
      const found = verifyRecord(folder)
      expect(found.intact).toBe(false)
      expect(found.firstBad?.append).toBe(first)
      expect(found.intactBefore).toEqual({ appends: first - 1, arrivals: (first - 1) * 12 })
      expect(found.intactAfter).toBeGreaterThanOrEqual(batches - first - 2)
      expect(found.sentences.join(' ')).toMatch(
        new RegExp(`first damaged append is ${first} of ${batches}, written 2`),
      )
      const refusal = openRefused(folder, { verify: 'all' })
      expect(refusal?.code).toBe('record-corrupted')
      expect(refusal?.exitCode).toBe(65)
    })
  })

  test('a row that nobody appended is told', () => {
    onCopy((folder) => {
      sql(folder, 'INSERT INTO results VALUES (1, 9999, 1, 1, 0, NULL, zeroblob(24))')
      const found = verifyRecord(folder)
      expect(found.intact).toBe(false)
      expect(found.sentences.join(' ')).toContain('The table results has 721 rows, and 720 were appended.')
    })
  })

  test('damage near the end is found by every start, not only by a full check', () => {
    onCopy((folder) => {
      sql(
        folder,
        'UPDATE results SET attempt = attempt + 1 WHERE island = 1 AND evaluation = ?',
        evaluations - 9,
      )
      const refusal = openRefused(folder)
      expect(refusal?.code).toBe('record-corrupted')
      expect(refusal?.detail).toMatch(
        /append 58 of 60: its digest does not match its rows; it holds evaluations i1: 229-232/,
      )
    })
  })

  test('a changed plan, search file or plug-in is found by every start and every reader', () => {
    for (const key of ['plan', 'search', 'plugin']) {
      onCopy((folder) => {
        const value = key === 'plugin' ? Uint8Array.of(1) : '{"seed": 2}'
        sql(folder, 'UPDATE meta SET value = ? WHERE key = ?', value, key)
        for (const open of [openRefused, (f: string) => refusalOf(() => readRecord(f))]) {
          expect(open(folder)?.detail).toMatch(/append 0.*plan, the search file or the plug-in/)
        }
      })
    }
  })
})

describe('a missing end', () => {
  /** A folder in which the database is older than the witness. */
  function withLostEnd(action: (folder: string) => void): void {
    onCopy((folder) => {
      const older = join(folder, '..', 'older.db')
      copyFileSync(recordFolder(folder).database, older)
      const record = openAt(folder)
      for (let n = 1; n <= 5; n++) record.journal.append(rows({ arrivals: [arrival(9, n, good(n))] }))
      record.close()
      copyFileSync(older, recordFolder(folder).database)
      action(folder)
    })
  }

  test('an older copy put back is refused, with how much is missing and since when', () => {
    withLostEnd((folder) => {
      const refusal = openRefused(folder)
      expect(refusal?.code).toBe('record-corrupted')
      expect(refusal?.detail).toMatch(
        /ends at append 60 of 2\d\d\d-.* UTC, but 5 more \(the last at 2\d\d\d-.*\) with 5 results/,
      )
      expect(renderRefusal(refusal!)).toMatch(/next: {2}Put back the newest copy.*accept the loss/)
      // Refusing has not changed its mind: it is refused again, and not taken as a new start.
      expect(openRefused(folder)?.code).toBe('record-corrupted')
    })
  })

  test('the loss can be accepted; the search goes on from what is there', () => {
    withLostEnd((folder) => {
      const record = openAt(folder, { acceptLoss: true })
      expect(record.loss).toEqual({ appends: 5, arrivals: 5 })
      expect(record.reader.arrival(9, 1)).toBeUndefined()
      record.journal.append(rows({ arrivals: [arrival(9, 1, good(1))] }))
      record.close()
      openAt(folder).close()
      expect(verifyRecord(folder).intact).toBe(true)
    })
  })

  test('a deleted write-ahead log is noticed', () => {
    onCopy((folder) => {
      const record = openAt(folder)
      for (let n = 1; n <= 5; n++) record.journal.append(rows({ arrivals: [arrival(9, n, good(n))] }))
      // As after a kill: the log is still there, then somebody cleans up.
      const killed = temporaryFolder()
      cpSync(folder, killed.folder, { recursive: true })
      record.close()
      const { database } = recordFolder(killed.folder)
      expect(statSync(`${database}-wal`).size).toBeGreaterThan(0)
      for (const end of ['-wal', '-shm']) rmSync(database + end)
      const refusal = refusalOf(() => openAt(killed.folder, { isRunning: () => false }))
      expect(refusal?.detail).toMatch(/its end is missing.*5 more/)
      killed.remove()
    })
  })

  test('a copy taken at any moment, with its log, continues without loss', () => {
    onCopy((folder) => {
      const record = openAt(folder)
      for (let n = 1; n <= 5; n++) record.journal.append(rows({ arrivals: [arrival(9, n, good(n))] }))
      const killed = temporaryFolder()
      cpSync(folder, killed.folder, { recursive: true })
      record.close()
      const again = openAt(killed.folder, { isRunning: () => false })
      expect(again.notices.join(' ')).toMatch(/taken over from process \d+ on .*no longer running/)
      expect([...again.reader.arrivals(9)].length).toBe(5)
      again.close()
      killed.remove()
    })
  })

  test('a missing or damaged witness is said and made again', () => {
    for (const mischief of [
      (path: string) => rmSync(path),
      (path: string) => writeFileSync(path, 'append 1\n'),
    ]) {
      onCopy((folder) => {
        mischief(recordFolder(folder).witness)
        const record = openAt(folder)
        expect(record.notices.join(' ')).toMatch(/record\.tail is (missing|damaged) and was written again/)
        record.close()
        const again = openAt(folder)
        expect(again.notices).toEqual([])
        again.close()
      })
    }
  })

  test('a database that is gone is never begun anew', () => {
    onCopy((folder) => {
      rmSync(recordFolder(folder).database)
      for (const refusal of [openRefused(folder), refusalOf(() => readRecord(folder))]) {
        expect(refusal?.code).toBe('record-corrupted')
        expect(refusal?.detail).toContain(
          'record.db is missing, but there was one with 60 appends, 720 results',
        )
      }
      expect(existsSync(recordFolder(folder).database)).toBe(false)
    })
  })
})

describe('files that are no record', () => {
  const cases: readonly (readonly [string, (path: string) => void, string, RegExp])[] = [
    ['empty', (path) => truncateSync(path, 0), 'record-corrupted', /empty \(0 bytes\)/],
    ['cut to 50 bytes', (path) => truncateSync(path, 50), 'record-corrupted', /only 50 bytes/],
    [
      'cut in the middle',
      (path) => truncateSync(path, 40_960),
      'record-corrupted',
      /has 40960 bytes and should have \d+: its end is cut off/,
    ],
    [
      'a text',
      (path) => writeFileSync(path, 'name: culvert\n'.repeat(20)),
      'record-corrupted',
      /does not begin as an SQLite database/,
    ],
    ['zeros', (path) => writeFileSync(path, Buffer.alloc(8192)), 'record-corrupted', /does not begin/],
  ]
  test.each(cases)('%s', (_what, mischief, code, words) => {
    onCopy((folder) => {
      mischief(recordFolder(folder).database)
      for (const refusal of [
        openRefused(folder),
        refusalOf(() => readRecord(folder)),
        refusalOf(() => verifyRecord(folder)),
      ]) {
        expect(refusal?.code).toBe(code)
        expect(refusal?.detail).toMatch(words)
        expect(refusal?.where?.file).toContain('record.db')
      }
    })
  })

  test("another program's database", () => {
    const { folder, remove } = temporaryFolder()
    openAt(folder).close()
    sql(folder, 'PRAGMA application_id = 7')
    expect(openRefused(folder)?.code).toBe('record-of-another-search')
    expect(refusalOf(() => readRecord(folder))?.detail).toContain('of another program')
    remove()
  })

  test('a record of a newer version is refused and left as it is', () => {
    onCopy((folder) => {
      sql(folder, 'PRAGMA user_version = 2')
      const before = readFileSync(recordFolder(folder).database)
      for (const refusal of [openRefused(folder), refusalOf(() => readRecord(folder))]) {
        expect(refusal?.code).toBe('record-newer')
        expect(refusal?.exitCode).toBe(76)
        expect(refusal?.detail).toBe('it has format 2, this version reads formats up to 1')
      }
      expect(readFileSync(recordFolder(folder).database).equals(before)).toBe(true)
    })
  })

  test('a folder without a record, and one that cannot be made', () => {
    const { folder, remove } = temporaryFolder()
    expect(refusalOf(() => readRecord(folder))?.code).toBe('record-missing')
    expect(refusalOf(() => openAt(folder, { create: undefined as never }))?.code).toBe('record-missing')
    expect(existsSync(folder)).toBe(false)
    writeFileSync(folder, 'a file')
    expect(openRefused(join(folder, 'inside'))?.exitCode).toBe(74)
    remove()
  })
})

describe('a record of another search', () => {
  test('is refused with what differs', () => {
    onCopy((folder) => {
      const other = pinned({ name: 'sluice', seed: 5 })
      expect(openRefused(folder, { create: other })?.detail).toBe(
        'name: the record has fixture, expected sluice; seed: the record has 20261201, expected 5',
      )
      const digest = openRefused(folder, { expect: { pluginDigest: '0'.repeat(64) } })
      expect(digest?.code).toBe('record-of-another-search')
      expect(digest?.detail).toMatch(/^SHA-256 of the plug-in: the record has [0-9a-f]{64}, expected 0{64}$/)
      openAt(folder).close()
    })
  })

  test('plan, search file and plug-in come back exactly; the copies beside are mended and it is said', () => {
    const given = pinned({ seed: 2 ** 53 - 1, confirm: { fraction: 0.1 + 0.2 } })
    const { folder, remove } = temporaryFolder()
    openAt(folder, { create: given }).close()
    const files = recordFolder(folder)
    writeFileSync(files.plugin, 'export default 0')
    rmSync(files.search)
    const record = openAt(folder, { create: given })
    expect(record.created).toBe(false)
    const { plan, searchText, pluginCode } = record
    expect({ plan, searchText, pluginCode }).toEqual(given)
    expect(record.notices).toEqual([
      "plugin.mjs was altered; it was written again from the record's copy of the pinned plug-in.",
      "search.yaml was missing; it was written again from the record's copy of the search file.",
    ])
    expect(new Uint8Array(readFileSync(files.plugin))).toEqual(given.pluginCode)
    record.close()
    remove()
  })
})

describe('where a record may lie', () => {
  test('a network file system is refused, unless it is allowed; a doubtful one is said', () => {
    const { folder, remove } = temporaryFolder()
    const refusal = openRefused(folder, { fileSystem: () => 0x6969 })
    expect(refusal?.code).toBe('network-file-system')
    expect(refusal?.detail).toContain('NFS')
    const record = openAt(folder, { fileSystem: () => 0x6969, allowNetworkFileSystem: true })
    expect(record.notices.join(' ')).toContain('NFS')
    record.close()
    expect(judgePlace(folder, 0x65735546, false)).toContain('FUSE')
    expect(judgePlace(folder, 0xef53, false)).toBeUndefined()
    remove()
  })

  // Source: SQLite, "Write-Ahead Logging", section on the WAL-reset bug, 2026 (from memory): 3.51.3 is mended.
  test('versions of SQLite with the race of checkpoints are told from safe ones', () => {
    const verdicts = ['3.51.2', '3.40.1', '2.99.9', '3.51.3', '3.53.2', '4.0.0'].map(isSafeSqlite)
    expect(verdicts).toEqual([false, false, false, true, true, true])
  })
})
