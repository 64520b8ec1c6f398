// The contract of the record over both of its adapters.

import { isDeepStrictEqual } from 'node:util'
import { describe, expect, test } from 'vitest'
import { recordFolder } from '../../coordinator/record/index.js'
import { MemoryDisk } from '../../coordinator/record/memory.js'
import { sqliteStorage } from '../../coordinator/record/storage.js'
import { stream } from '../../shared/streams.js'
import { recordContract, refusalOf } from './record.js'
import { contentOf, madeUpSearch, openAt, temporaryFolder } from './record-fixture.js'

recordContract('in SQLite', () => {
  const { folder, remove } = temporaryFolder()
  return {
    open: ({ force = false } = {}) => openAt(folder, force ? { takeover: 'force' } : {}),
    damageSnapshot: (island, commit) => {
      const database = sqliteStorage.open(recordFolder(folder).database, 'write')
      const state = database
        .prepare('SELECT state FROM snapshots WHERE island = ? AND number = ?')
        .get(island, commit)
      const bytes = Uint8Array.from(state![0] as Uint8Array)
      bytes[bytes.length >> 1]! ^= 1
      database
        .prepare('UPDATE snapshots SET state = ? WHERE island = ? AND number = ?')
        .run(bytes, island, commit)
      database.close()
    },
    remove,
  }
})

const inMemory = (disk: MemoryDisk) => ({
  open: (options?: { readonly force?: boolean }) => disk.open(options),
  damageSnapshot: (island: number, commit: number) => disk.damageSnapshot(island, commit),
  remove: () => {},
})
recordContract('in memory', () => inMemory(new MemoryDisk()))
recordContract('in memory, on a disk that loses what is not synced', () =>
  inMemory(new MemoryDisk({ losing: { stream: stream(5, 'spare', 0, 0, 0), syncs: 'every-append' } })),
)

describe('the simulated disk', () => {
  const appends = [...madeUpSearch(21, { batches: 12, perBatch: 4 })]

  test('a crash keeps everything synced and a first part of the rest, never half an append', () => {
    const lost = new Set<number>()
    for (let seed = 1; seed <= 40; seed++) {
      const disk = new MemoryDisk({ losing: { stream: stream(seed, 'spare', 1, 0, 0), syncs: 'when-told' } })
      const { journal } = disk.open()
      for (const append of appends.slice(0, 5)) journal.append(append)
      disk.sync()
      for (const append of appends.slice(5)) journal.append(append)
      const gone = disk.crash()
      lost.add(gone)
      expect(gone).toBeLessThanOrEqual(7)
      const whole = new MemoryDisk().open()
      for (const append of appends.slice(0, appends.length - gone)) whole.journal.append(append)
      const [left, right] = [disk.open(), whole].map(({ reader }) => contentOf(reader, 3, 100))
      expect(isDeepStrictEqual(left, right), `seed ${seed}`).toBe(true)
      expect(refusalOf(() => journal.append(appends[0]!))?.code).toBe('record-fenced')
    }
    expect([...lost].sort((a, b) => a - b)).toEqual([0, 1, 2, 3, 4, 5, 6, 7])
  })

  test('a disk that syncs every append loses none', () => {
    for (let seed = 1; seed <= 20; seed++) {
      const disk = new MemoryDisk({
        losing: { stream: stream(seed, 'spare', 2, 0, 0), syncs: 'every-append' },
      })
      const { journal } = disk.open()
      for (const append of appends) journal.append(append)
      expect(disk.crash()).toBe(0)
    }
  })

  test('a full disk refuses and keeps nothing; with room the same append succeeds', () => {
    const disk = new MemoryDisk()
    const { journal, reader } = disk.open()
    disk.trouble = 'disk-full'
    expect(refusalOf(() => journal.append(appends[0]!))?.code).toBe('disk-full')
    expect(reader.totals().appends).toBe(0)
    disk.trouble = undefined
    journal.append(appends[0]!)
    expect(reader.totals().appends).toBe(1)
  })
})
