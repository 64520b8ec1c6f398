// Promise: the k-th storage call failing, once and for ever, for every k of a 200-event run loses nothing. Each k is
// tried while a record is made, during the whole run from an empty record, and while a killed run is continued;
// before and after the call took effect. Then the disk is well again and the search must end as if nothing had been.

import { cpSync, rmSync } from 'node:fs'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { FaultyStorage } from '../../coordinator/record/faulty.js'
import { sqliteStorage } from '../../coordinator/record/storage.js'
import { exitCodes, Refusal, type RefusalCode } from '../../shared/refusals.js'
import { openAt, temporaryFolder } from '../contract/record-fixture.js'
import {
  Acknowledged,
  FullDisk,
  type Run,
  type RunOptions,
  rederived,
  runOn,
  small,
} from './storage-world.js'

const emptyRecord = temporaryFolder()
const killedRun = temporaryFolder()
const work = temporaryFolder()

/** Where runs begin, and the last storage call that is made to fail. */
interface Scenario {
  readonly title: string
  readonly begin: () => void
  /** Appends that are there when a run begins. */
  readonly appends: number
  callsTried: number
}
const appendsBeforeKill = 14
const copyOf = (folder: string) => cpSync(folder, work.folder, { recursive: true })
const scenarios: Record<'making' | 'whole' | 'continuing', Scenario> = {
  making: { title: 'while the record is made', begin: () => {}, appends: 0, callsTried: 0 },
  whole: {
    title: 'during the whole search',
    begin: () => copyOf(emptyRecord.folder),
    appends: 0,
    callsTried: 0,
  },
  continuing: {
    title: 'while a killed search is continued',
    begin: () => copyOf(killedRun.folder),
    appends: appendsBeforeKill,
    callsTried: 0,
  },
}

function beginIn({ begin }: Scenario): void {
  rmSync(work.folder, { recursive: true, force: true })
  begin()
}

let calm: Run
let calmCommits = 0

/** A run without a fault; `watch` sees the calls so far after every durable step. */
async function calmRun(scenario: Scenario, watch: (calls: number, appends: number) => void): Promise<number> {
  beginIn(scenario)
  const storage = new FaultyStorage(sqliteStorage)
  const acknowledged = new Acknowledged(scenario.appends)
  calm = await runOn(work.folder, {
    storage,
    acknowledged,
    onOpen: () => watch(storage.calls, acknowledged.appends),
    onStep: () => watch(storage.calls, acknowledged.appends),
  })
  expect(acknowledged.rows).toBeGreaterThan(scenario === scenarios.continuing ? 60 : 190)
  return storage.calls
}

beforeAll(async () => {
  openAt(emptyRecord.folder, { create: small }).close()
  const { making, whole, continuing } = scenarios
  await calmRun(making, (calls) => {
    if (making.callsTried === 0) making.callsTried = calls
  })
  const reference = calm
  whole.callsTried = await calmRun(whole, (_calls, appends) => {
    // What a kill leaves: the files as they are, with nobody closing them.
    if (appends === appendsBeforeKill) cpSync(work.folder, killedRun.folder, { recursive: true })
  })
  calmCommits = rederived(work.folder).commits
  await calmRun(continuing, (calls, appends) => {
    if (appends <= appendsBeforeKill + 1) continuing.callsTried = calls
  })
  expect(calm).toEqual(reference)
  expect(calm).toMatchObject({ end: 'finished', impurities: [], pauses: 0 })
})
afterAll(() => {
  for (const folder of [emptyRecord, killedRun, work]) folder.remove()
})

/** Runs into the fault; what it ended with. Only refusals may come out. */
async function runInto(options: RunOptions): Promise<Run | Refusal> {
  try {
    return await runOn(work.folder, options)
  } catch (error) {
    if (error instanceof Refusal) return error
    throw error
  }
}

/** With a disk that is well: what was acknowledged is there, and the search ends as on a calm day. */
async function assertNothingLost(
  acknowledged: Acknowledged,
  rederives: boolean,
  what: string,
): Promise<void> {
  const run = await runOn(work.folder, {
    acknowledged,
    onOpen: ({ reader }) => expect(acknowledged.missing(reader), what).toEqual([]),
  })
  expect(run, what).toEqual(calm)
  if (!rederives) return
  expect(rederived(work.folder), what).toEqual({ digest: calm.digest, commits: calmCommits })
}

function assertRefused(ending: Run | Refusal, code: RefusalCode, what: string): void {
  // The very last calls let the record go; trouble there cannot harm any more and is not worth a refusal.
  if (!(ending instanceof Refusal)) {
    expect(ending, what).toEqual(calm)
    return
  }
  expect({ code: ending.code, exitCode: ending.exitCode }, what).toEqual({
    code,
    exitCode: exitCodes.inputOutput,
  })
}

const brokenDisks = [
  { lasting: false, when: 'before', code: 'SQLITE_IOERR_WRITE' },
  { lasting: false, when: 'after', code: 'SQLITE_IOERR_FSYNC' },
  { lasting: true, when: 'before', code: 'SQLITE_IOERR_READ' },
  { lasting: true, when: 'after', code: 'SQLITE_IOERR_FSYNC' },
] as const

describe.each(Object.values(scenarios))('storage calls fail $title', (scenario) => {
  it.each(brokenDisks)(
    '$code, lasting: $lasting, $when it took effect: exit 74, then the same search',
    async (fault) => {
      const turn = brokenDisks.indexOf(fault)
      for (let at = 1; at <= scenario.callsTried; at++) {
        const what = `call ${at} of ${scenario.callsTried}`
        beginIn(scenario)
        const storage = new FaultyStorage(sqliteStorage, { ...fault, at })
        const acknowledged = new Acknowledged(scenario.appends)
        const ending = await runInto({ storage, acknowledged })
        expect(storage.failures, `${what}, ended with ${String(ending)}`).toBeGreaterThan(0)
        assertRefused(ending, 'disk-error', what)
        await assertNothingLost(acknowledged, at % brokenDisks.length === turn, what)
      }
    },
  )

  it('once no room, before or after it took effect: the search pauses and goes on', async () => {
    let waited = 0
    for (let at = 1; at <= scenario.callsTried; at++) {
      // Before and after in turn: the test below has no room before every call.
      const when = at % 2 === 0 ? 'before' : 'after'
      const what = `${when} call ${at} of ${scenario.callsTried}`
      beginIn(scenario)
      const storage = new FaultyStorage(sqliteStorage, { at, lasting: false, when, code: 'SQLITE_FULL' })
      const acknowledged = new Acknowledged(scenario.appends)
      const ending = await runInto({ storage, acknowledged })
      if (ending instanceof Refusal) {
        // Opening and reading do not wait; an append does.
        expect(acknowledged.refused, what).toBe(undefined)
        assertRefused(ending, 'disk-full', what)
        await assertNothingLost(acknowledged, false, what)
        continue
      }
      waited += ending.pauses
      expect(ending, what).toEqual({ ...calm, pauses: acknowledged.refused ? 1 : 0 })
      expect(storage.failures, what).toBe(1)
      if (at % 8 === 0) expect(rederived(work.folder).digest, what).toBe(calm.digest)
    }
    if (scenario === scenarios.whole) expect(waited).toBeGreaterThan(scenario.callsTried / 4)
  })

  it('no room until somebody makes it: the search pauses and goes on, or stops when asked', async () => {
    const ends = new Set<string>()
    for (let at = 1; at <= scenario.callsTried; at++) {
      const what = `call ${at} of ${scenario.callsTried}`
      beginIn(scenario)
      const storage = new FullDisk(at)
      const acknowledged = new Acknowledged(scenario.appends)
      const isStopped = at % 4 === 0
      const onPause = (pauses: number, stop: () => void) => {
        if (isStopped) stop()
        else if (pauses === 3) storage.makeRoom()
      }
      const ending = await runInto({ storage, acknowledged, onPause })
      storage.makeRoom()
      if (ending instanceof Refusal) assertRefused(ending, 'disk-full', what)
      else if (ending.end === 'finished') expect({ ...ending, pauses: 0 }, what).toEqual(calm)
      else expect(ending.end, what).toBe('interrupted')
      if (ending instanceof Refusal || isStopped) await assertNothingLost(acknowledged, at % 8 === 0, what)
      ends.add(ending instanceof Refusal ? ending.code : ending.end)
    }
    if (scenario === scenarios.whole)
      expect([...ends].sort()).toEqual(['disk-full', 'finished', 'interrupted'])
  })
})

it('trouble of the disk while an opening checks the record is not taken for damage', async () => {
  const { continuing } = scenarios
  for (let at = 1; at <= continuing.callsTried; at++) {
    beginIn(continuing)
    const storage = new FaultyStorage(sqliteStorage, {
      at,
      lasting: false,
      when: 'before',
      code: 'SQLITE_IOERR_READ',
    })
    const ending = await runInto({ storage, acknowledged: new Acknowledged(continuing.appends) })
    if (ending instanceof Refusal) expect(ending.code, `call ${at}: ${ending.message}`).toBe('disk-error')
  }
})
