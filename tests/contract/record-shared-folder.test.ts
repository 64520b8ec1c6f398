// The contract of the record over its form for shared folders, and what that form is for: a node that vanishes with its
// disk loses nothing that was acknowledged, and of two coordinators that do not see each other only one counts.

import { execFileSync } from 'node:child_process'
import {
  appendFileSync,
  mkdtempSync,
  readdirSync,
  readFileSync,
  rmSync,
  truncateSync,
  writeFileSync,
} from 'node:fs'
import { join } from 'node:path'
import { isDeepStrictEqual } from 'node:util'
import { afterEach, describe, expect, test } from 'vitest'
import { FaultyStorage } from '../../coordinator/record/faulty.js'
import {
  copyShared,
  type OpenRecord,
  openShared,
  type ProcessIdentity,
  readRecord,
  recordFolder,
  sharedHolder,
  thisProcess,
  watchSharedHolder,
  workCopyOf,
} from '../../coordinator/record/index.js'
import { journalFolder } from '../../coordinator/record/shared-folder/open.js'
import { sqliteStorage } from '../../coordinator/record/storage.js'
import { recordContract, refusalOf } from './record.js'
import { contentOf, madeUpSearch, pinned, scratch } from './record-fixture.js'

const folders: string[] = []
const temporary = (): string => {
  const folder = mkdtempSync(join(scratch, 'skerry-shared-'))
  folders.push(folder)
  return folder
}
afterEach(() => {
  for (const folder of folders.splice(0)) rmSync(folder, { recursive: true, force: true })
})

let openings = 0
const onHost = (host: string, pid = process.pid): ProcessIdentity => ({
  ...thisProcess(),
  host,
  machine: host,
  pid,
})

interface Site {
  readonly folder: string
  readonly scratch: string
}
const newSite = (): Site => ({ folder: join(temporary(), 'record'), scratch: temporary() })
const onNewNode = ({ folder }: Site): Site => ({ folder, scratch: temporary() })

function open(site: Site, options: Partial<Parameters<typeof openShared>[1]> = {}): OpenRecord {
  return openShared(site, {
    create: pinned(),
    holder: thisProcess(),
    nonce: `opening-${++openings}`,
    clock: () => 1_764_579_600_000 + openings,
    ...options,
  })
}

recordContract('in a shared folder', () => {
  const site = newSite()
  return {
    open: ({ force = false } = {}) => open(site, force ? { takeover: 'force' } : {}),
    damageSnapshot: (island, commit) => {
      const database = sqliteStorage.open(recordFolder(workCopyOf(site)).database, 'write')
      const where = 'WHERE island = ? AND number = ?'
      const state = database.prepare(`SELECT state FROM snapshots ${where}`).get(island, commit)
      const bytes = Uint8Array.from(state![0] as Uint8Array)
      bytes[bytes.length >> 1]! ^= 1
      database.prepare(`UPDATE snapshots SET state = ? ${where}`).run(bytes, island, commit)
      database.close()
    },
    remove: () => {},
  }
})

const appends = [...madeUpSearch(33, { batches: 14, perBatch: 5 })]
const content = (record: OpenRecord) => contentOf(record.reader, 3, 100)

/** What a record holds after the first `count` appends, kept without any fault. */
function whole(count: number): unknown {
  const record = open(newSite())
  for (const append of appends.slice(0, count)) record.journal.append(append)
  const kept = content(record)
  record.close()
  return kept
}
const wholes = new Map<number, unknown>()
function same(record: OpenRecord, count: number): boolean {
  if (!wholes.has(count)) wholes.set(count, whole(count))
  return isDeepStrictEqual(content(record), wholes.get(count))
}

describe('a node that vanishes with its disk', () => {
  test('its successor has everything that was acknowledged, after every append', () => {
    const site = newSite()
    let node = site
    for (const [n, append] of appends.entries()) {
      const record = open(node, { holder: onHost(`node-${n}`), takeover: 'force' })
      expect(record.created, `append ${n}`).toBe(n === 0)
      record.journal.append(append)
      // Never closed, its disk erased: the next node has only the shared folder.
      if (n % 2 === 0) record.close()
      rmSync(node.scratch, { recursive: true, force: true })
      node = onNewNode(site)
    }
    const record = open(node, { takeover: 'force' })
    expect(same(record, appends.length)).toBe(true)
    expect(record.epoch).toBe(appends.length + 1)
    record.close()
  })

  test('the same node, its work copy an append behind or ahead, ends where the shared folder does', () => {
    for (const lag of [-1, 1]) {
      const site = newSite()
      const record = open(site)
      for (const append of appends.slice(0, 6)) record.journal.append(append)
      record.close()
      const journal = journalFolder(site.folder)
      const log = join(journal, readdirSync(journal).find((name) => name.endsWith('.log'))!)
      if (lag > 0) {
        // The shared folder lost its last append (it was written by nobody else): the work copy has one too many.
        truncateSync(log, readFileSync(log).length - 1)
      } else {
        const database = sqliteStorage.open(recordFolder(workCopyOf(site)).database, 'write')
        expect(database.prepare('SELECT max(sequence) FROM appends').get()).toEqual([6])
        database.close()
        const more = open(site)
        more.journal.append(appends[6]!)
        more.close()
        const behind = open({ folder: site.folder, scratch: temporary() })
        behind.close()
      }
      const again = open(site)
      expect(same(again, lag > 0 ? 5 : 7), `lag ${lag}`).toBe(true)
      again.close()
    }
  })
})

describe('two coordinators that do not see each other', () => {
  test('what the earlier one still writes does not count, and it is told at its next append', () => {
    const site = newSite()
    const first = open(site, { holder: onHost('node-a') })
    for (const append of appends.slice(0, 4)) first.journal.append(append)
    const second = open(onNewNode(site), { holder: onHost('node-b'), takeover: 'force' })
    expect(refusalOf(() => first.journal.append(appends[4]!))?.code).toBe('record-fenced')
    for (const append of appends.slice(4, 9)) second.journal.append(append)
    second.close()
    const third = open(onNewNode(site), { holder: onHost('node-c') })
    expect(same(third, 9)).toBe(true)
    third.close()
  })

  test('appends that slip into the old journal after the takeover are never read', () => {
    const site = newSite()
    const first = open(site, { holder: onHost('node-a') })
    for (const append of appends.slice(0, 4)) first.journal.append(append)
    const journal = journalFolder(site.folder)
    const log = join(journal, readdirSync(journal).find((name) => name.endsWith('.log'))!)
    const before = readFileSync(log).length
    first.journal.append(appends[4]!)
    const slipped = readFileSync(log).subarray(before)
    truncateSync(log, before)
    const second = open(onNewNode(site), { holder: onHost('node-b'), takeover: 'force' })
    second.journal.append(appends[4]!)
    // The old node's write reaches the disk only now.
    appendFileSync(log, slipped)
    second.journal.append(appends[5]!)
    second.close()
    const third = open(onNewNode(site), { holder: onHost('node-c') })
    expect(same(third, 6)).toBe(true)
    third.close()
  })

  test('a living holder on another machine is named, and its silence must be watched', async () => {
    const site = newSite()
    const first = open(site, { holder: onHost('node-a', 4711) })
    const refused = refusalOf(() => open(onNewNode(site), { holder: onHost('node-b') }))
    expect(refused?.code).toBe('record-in-use')
    expect(refused?.detail).toContain('process 4711 on node-a')
    expect(sharedHolder(site.folder)).toMatchObject({ host: 'node-a', pid: 4711 })
    let waits = 0
    const alive = await watchSharedHolder(site.folder, 3, async () => {
      if (++waits === 2) first.beat()
    })
    expect(alive).toBeUndefined()
    const silent = await watchSharedHolder(site.folder, 3, async () => {})
    expect(silent).toMatchObject({ epoch: 1 })
    // It gives a sign of life after all: the takeover is void.
    first.beat()
    const late = refusalOf(() => open(onNewNode(site), { holder: onHost('node-b'), takeover: silent! }))
    expect(late?.code).toBe('record-in-use')
    const again = await watchSharedHolder(site.folder, 3, async () => {})
    open(onNewNode(site), { holder: onHost('node-b'), takeover: again! }).close()
  })

  test('of two that claim at once one is refused', () => {
    const site = newSite()
    open(site).close()
    const journal = journalFolder(site.folder)
    writeFileSync(join(journal, 'claim-000000000003'), '{"half": ')
    // A claim whose maker died while writing it holds nobody up.
    const next = open(onNewNode(site))
    expect(next.epoch).toBe(4)
    next.close()
  })
})

describe('damage in the shared folder', () => {
  test('a last append that is cut off anywhere is left out, and the search goes on there', () => {
    const site = newSite()
    const record = open(site)
    for (const append of appends.slice(0, 3)) record.journal.append(append)
    record.close()
    const journal = journalFolder(site.folder)
    const log = join(journal, readdirSync(journal).find((name) => name.endsWith('.log'))!)
    const bytes = readFileSync(log)
    for (const cut of [1, 7, 40, 200]) {
      writeFileSync(log, bytes.subarray(0, bytes.length - cut))
      const copy = temporary()
      copyShared(site.folder, copy)
      const read = readRecord(copy)
      expect(read.reader.totals().appends, `cut ${cut}`).toBe(2)
      expect(read.verify().intact).toBe(true)
      read.close()
    }
    const again = open(onNewNode(site))
    again.journal.append(appends[2]!)
    expect(same(again, 3)).toBe(true)
    again.close()
  })

  test('a flipped bit is never read as something else', () => {
    const site = newSite()
    const record = open(site)
    for (const append of appends.slice(0, 6)) record.journal.append(append)
    record.close()
    const journal = journalFolder(site.folder)
    const log = join(journal, readdirSync(journal).find((name) => name.endsWith('.log'))!)
    const bytes = readFileSync(log)
    for (let at = 5; at < bytes.length; at += Math.floor(bytes.length / 60)) {
      const flipped = Uint8Array.from(bytes)
      flipped[at]! ^= 4
      writeFileSync(log, flipped)
      const copy = temporary()
      copyShared(site.folder, copy)
      const read = readRecord(copy)
      expect(read.verify().intact, `byte ${at}`).toBe(true)
      expect(read.reader.totals().appends).toBeLessThan(6)
      read.close()
    }
  })

  test('an append whose transaction failed on the work copy is tried again, at every call', () => {
    // How many calls an append makes of the database.
    const counting = new FaultyStorage(sqliteStorage)
    const trial = open(newSite(), { storage: counting })
    trial.journal.append(appends[0]!)
    const before = counting.calls
    trial.journal.append(appends[1]!)
    const calls = counting.calls - before
    trial.close()
    for (let k = 1; k <= calls; k++) {
      for (const when of ['before', 'after'] as const) {
        const site = newSite()
        const storage = new FaultyStorage(sqliteStorage)
        const record = open(site, { storage })
        record.journal.append(appends[0]!)
        storage.breakAt({ at: storage.calls + k, lasting: false, when, code: 'SQLITE_FULL' })
        const refused = refusalOf(() => record.journal.append(appends[1]!))
        storage.mend()
        if (refused) {
          expect(refused.code, `call ${k}, ${when}`).toBe('disk-full')
          record.journal.append(appends[1]!)
        }
        record.journal.append(appends[2]!)
        expect(same(record, 3), `call ${k}, ${when}`).toBe(true)
        record.close()
        const other = open(onNewNode(site))
        expect(same(other, 3), `call ${k}, ${when}, elsewhere`).toBe(true)
        other.close()
        rmSync(site.scratch, { recursive: true, force: true })
      }
    }
  })

  test.runIf(process.getuid?.() === 0)(
    'a full shared folder refuses, acknowledges nothing, and goes on when there is room',
    () => {
      const base = temporary()
      execFileSync('mount', ['-t', 'tmpfs', '-o', 'size=2m', 'tmpfs', base])
      try {
        const site = { folder: join(base, 'record'), scratch: temporary() }
        const record = open(site)
        record.journal.append(appends[0]!)
        fill(join(base, 'ballast'))
        expect(refusalOf(() => record.journal.append(appends[1]!))?.code).toBe('disk-full')
        expect(same(record, 1)).toBe(true)
        rmSync(join(base, 'ballast'))
        record.journal.append(appends[1]!)
        record.close()
        const other = open(onNewNode(site))
        expect(same(other, 2)).toBe(true)
        other.close()
      } finally {
        execFileSync('umount', [base])
      }
    },
  )
})

/** Writes until there is no room left. */
function fill(path: string): void {
  const page = new Uint8Array(4096)
  try {
    for (;;) appendFileSync(path, page)
  } catch {
    // Full, as wanted.
  }
}
