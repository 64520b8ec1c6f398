// One coordinator at a time, with real processes: who is refused, who takes over, and that nobody who was taken
// over ever appends again.

import { type ChildProcess, spawn } from 'node:child_process'
import { mkdirSync, readdirSync, rmSync } from 'node:fs'
import { dirname, join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { buildSync } from 'esbuild'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import {
  type ProcessIdentity,
  readRecord,
  recordFolder,
  thisProcess,
  verifyRecord,
  watchHolder,
} from '../../coordinator/record/index.js'
import { sqliteStorage } from '../../coordinator/record/storage.js'
import { refusalOf } from './record.js'
import { arrival, good, openAt, rows, temporaryFolder } from './record-fixture.js'

const root = join(dirname(fileURLToPath(import.meta.url)), '..', '..')
/** Below node_modules, so that the bundle finds the packages it does not contain. */
const bundles = join(root, 'node_modules', `.skerry-record-${process.pid}`)
const writer = join(bundles, 'record-writer.mjs')

beforeAll(() => {
  mkdirSync(bundles, { recursive: true })
  buildSync({
    entryPoints: [join(root, 'tests', 'contract', 'record-writer.ts')],
    bundle: true,
    platform: 'node',
    format: 'esm',
    packages: 'external',
    outfile: writer,
    logLevel: 'error',
  })
})
afterAll(() => rmSync(bundles, { recursive: true, force: true }))

interface Said {
  readonly epoch?: number
  readonly notices?: readonly string[]
  readonly code?: string
  readonly detail?: string
}
class Writer {
  readonly process: ChildProcess
  acknowledged = 0
  opened: Said | undefined
  refused: Said | undefined
  exitCode: number | null | undefined
  #text = ''

  constructor(folder: string, takeover = 'if-dead') {
    this.process = spawn(process.execPath, [writer, folder, takeover], {
      stdio: ['ignore', 'pipe', 'inherit'],
    })
    this.process.stdout!.on('data', (chunk: Buffer) => this.#hear(String(chunk)))
    this.process.on('exit', (code) => {
      this.exitCode = code
    })
  }
  #hear(chunk: string): void {
    const lines = (this.#text + chunk).split('\n')
    this.#text = lines.pop()!
    for (const line of lines) {
      const [, word, value] = /^(\w+) (.*)$/.exec(line)!
      const said = JSON.parse(value!) as Said & number
      if (word === 'acknowledged') this.acknowledged = said
      if (word === 'open') this.opened = said
      if (word === 'refused') this.refused = said
    }
  }
  async until(what: string, condition: () => boolean): Promise<void> {
    for (let waited = 0; !condition(); waited += 5) {
      if (waited > 60_000) throw new Error(`waited in vain: ${what}`)
      await sleep(5)
    }
  }
  async ended(): Promise<void> {
    await this.until('end of the process', () => this.exitCode !== undefined)
  }
  async kill(): Promise<void> {
    if (this.exitCode === undefined) this.process.kill('SIGKILL')
    await this.ended()
  }
}
const sleep = (ms: number) => new Promise<void>((resolve) => setTimeout(resolve, ms))

/** Results of each epoch in the record: writer of epoch n appends to island n. */
function resultsByEpoch(folder: string, epochs: number): number[] {
  const record = readRecord(folder)
  const counts = Array.from({ length: epochs }, (_, i) => [...record.reader.arrivals(i + 1)].length)
  record.close()
  return counts
}

describe('real processes', () => {
  test('a second coordinator is refused and told who holds the record; a killed one is taken over', async () => {
    const { folder, remove } = temporaryFolder()
    openAt(folder).close()
    const first = new Writer(folder)
    await first.until('first writes', () => first.acknowledged > 3)
    const refusal = refusalOf(() => openAt(folder))
    const { host } = thisProcess()
    expect(refusal?.code).toBe('record-in-use')
    expect(refusal?.detail).toMatch(
      new RegExp(
        `^process ${first.process.pid} on ${host}, since \\d{4}-\\d\\d-\\d\\d \\d\\d:\\d\\d:\\d\\d UTC$`,
      ),
    )
    expect(refusal?.cure).toContain(`kill ${first.process.pid}`)
    const second = new Writer(folder)
    await second.ended()
    expect(second.refused?.code).toBe('record-in-use')
    expect(second.exitCode).toBe(77)
    const before = first.acknowledged
    await first.kill()
    const third = new Writer(folder)
    await third.until('third writes', () => third.acknowledged > 3)
    expect(third.opened?.notices?.join(' ')).toContain(`process ${first.process.pid} on ${host}`)
    expect(third.opened?.notices?.join(' ')).toContain('no longer running')
    await third.kill()
    const counts = resultsByEpoch(folder, 3)
    expect(counts[1]).toBeGreaterThanOrEqual(before)
    expect(counts[1]).toBeLessThanOrEqual(first.acknowledged + 1)
    remove()
  })

  test('stopped, taken over by force, woken: not one stale append, in 3 takeovers', async () => {
    const { folder, remove } = temporaryFolder()
    openAt(folder).close()
    let asleep = new Writer(folder)
    await asleep.until('writes', () => asleep.acknowledged > 2)
    for (let round = 1; round <= 3; round++) {
      const before = await takeOverWhileAsleep(folder, asleep)
      const next = before.next
      asleep.process.kill('SIGCONT')
      await asleep.ended()
      expect(asleep.refused?.code).toBe('record-fenced')
      expect(asleep.refused?.detail).toContain(`process ${next.process.pid} on`)
      expect(asleep.exitCode).toBe(77)
      expect(resultsByEpoch(folder, asleep.opened!.epoch!).at(-1)).toBe(before.results)
      asleep = next
    }
    await asleep.kill()
    expect(verifyRecord(folder).intact).toBe(true)
    remove()
  })

  /** A process may be stopped in the middle of a write; then even force must wait, and says so. */
  async function takeOverWhileAsleep(
    folder: string,
    asleep: Writer,
  ): Promise<{ next: Writer; results: number }> {
    for (let tries = 0; tries < 20; tries++) {
      asleep.process.kill('SIGSTOP')
      const next = new Writer(folder, 'force')
      await next.until('opened or refused', () => next.opened !== undefined || next.exitCode !== undefined)
      if (next.opened) {
        const results = resultsByEpoch(folder, asleep.opened!.epoch!).at(-1)!
        await next.until('writes', () => next.acknowledged > 2)
        return { next, results }
      }
      expect(next.refused?.code).toBe('record-in-use')
      expect(next.refused?.detail).toContain('writing in the database and does not finish')
      asleep.process.kill('SIGCONT')
      const seen = asleep.acknowledged
      await asleep.until('goes on', () => asleep.acknowledged > seen)
    }
    throw new Error('the writer was stopped in the middle of a write 20 times')
  }

  test('of six that make the same record at once, one makes and holds it, the others are told', async () => {
    for (let round = 1; round <= 2; round++) {
      const { folder, remove } = temporaryFolder()
      const all = Array.from({ length: 6 }, () => new Writer(folder, 'create'))
      for (const one of all)
        await one.until('decided', () => one.acknowledged > 0 || one.exitCode !== undefined)
      const holders = all.filter((one) => one.exitCode === undefined)
      expect(holders.length).toBe(1)
      for (const one of all) if (one !== holders[0]) expect(one.refused?.code).toBe('record-in-use')
      await holders[0]!.kill()
      expect(verifyRecord(folder).intact).toBe(true)
      openAt(folder).close()
      expect(readdirSync(folder).filter((name) => name.includes('.new-'))).toEqual([])
      remove()
    }
  })

  test('killed at random times: nothing acknowledged is lost, and the chain holds', async () => {
    const { folder, remove } = temporaryFolder()
    openAt(folder).close()
    const acknowledged: number[] = []
    for (let round = 1; round <= 6; round++) {
      const one = new Writer(folder)
      if (round % 2 === 0) await one.until('writes', () => one.acknowledged > round)
      else await sleep(150 + 37 * round)
      await one.kill()
      if (one.opened) acknowledged[one.opened.epoch!] = one.acknowledged
    }
    const record = openAt(folder, { verify: 'all' })
    for (const [epoch, count] of acknowledged.entries()) {
      if (count === undefined) continue
      const there = [...record.reader.arrivals(epoch)].map((row) => row.evaluation)
      expect(there.length).toBeGreaterThanOrEqual(count)
      expect(there).toEqual(there.map((_, i) => i + 1))
    }
    record.close()
    remove()
  })
})

describe('whether a holder lives', () => {
  const me = thisProcess()
  const other: ProcessIdentity = {
    host: 'node17',
    machine: 'node17 another boot',
    pid: me.pid,
    processStart: '1',
  }

  test('a process number that was given out again does not keep the record', () => {
    const { folder, remove } = temporaryFolder()
    openAt(folder, { holder: { ...me, processStart: 'long ago' } })
    const record = openAt(folder)
    expect(record.epoch).toBe(2)
    record.close()
    remove()
  })

  test('a second one waits for nothing: it is refused by name while the first is in the middle of a write', () => {
    const { folder, remove } = temporaryFolder()
    const record = openAt(folder)
    const database = sqliteStorage.open(recordFolder(folder).database, 'write')
    database.exec('BEGIN IMMEDIATE')
    const refusal = refusalOf(() => openAt(folder))
    expect(refusal?.detail).toContain(`process ${me.pid} on ${me.host}`)
    // Somebody who may take it over does wait for the write, but not for ever.
    const forced = refusalOf(() => openAt(folder, { takeover: 'force' }))
    expect(forced?.detail).toContain('writing in the database and does not finish')
    database.exec('ROLLBACK')
    database.close()
    record.close()
    remove()
  })

  test('opening twice in one process is refused', () => {
    const { folder, remove } = temporaryFolder()
    const record = openAt(folder)
    expect(refusalOf(() => openAt(folder))?.code).toBe('record-in-use')
    record.close()
    remove()
  })

  test('a holder on another machine is never judged by a process number or a clock', () => {
    const { folder, remove } = temporaryFolder()
    openAt(folder, { holder: other, clock: () => 0 })
    const refusal = refusalOf(() => openAt(folder))
    expect(refusal?.code).toBe('record-in-use')
    expect(refusal?.detail).toBe(`process ${me.pid} on node17, since 1970-01-01 00:00:00 UTC`)
    expect(refusal?.cure).toContain('node17')
    remove()
  })

  test('silence while it is watched lets it be taken over; a beat or an append does not', async () => {
    const { folder, remove } = temporaryFolder()
    const far = openAt(folder, { holder: other })
    const watch = (during: () => void) => watchHolder(folder, 5, async () => during())
    expect(await watch(() => expect(far.beat()).toBeUndefined())).toBeUndefined()
    let n = 0
    expect(
      await watch(() => far.journal.append(rows({ arrivals: [arrival(1, ++n, good(1))] }))),
    ).toBeUndefined()
    let waits = 0
    const silent = await watch(() => {
      waits += 1
    })
    expect(waits).toBe(5)
    // It moves after all, between the watching and the takeover: void.
    far.beat()
    expect(refusalOf(() => openAt(folder, { takeover: silent! }))?.code).toBe('record-in-use')
    const again = await watch(() => {})
    const record = openAt(folder, { takeover: again! })
    expect(record.notices.join(' ')).toContain('gave no sign of life')
    expect(far.beat()?.code).toBe('record-fenced')
    expect(record.beat()).toBeUndefined()
    record.close()
    expect(await watch(() => {})).toBeUndefined()
    remove()
  })

  test('a reader sees who holds the record, and reads on while it writes', () => {
    const { folder, remove } = temporaryFolder()
    const record = openAt(folder)
    const looking = readRecord(folder, { me })
    expect(looking.holder()).toMatchObject({ pid: me.pid, host: me.host, running: true, epoch: 1 })
    for (let n = 1; n <= 3; n++) {
      record.journal.append(rows({ arrivals: [arrival(1, n, good(n))] }))
      expect(looking.reader.totals().arrivals).toBe(n)
    }
    record.close()
    expect(looking.holder()).toBeUndefined()
    looking.close()
    remove()
  })
})
