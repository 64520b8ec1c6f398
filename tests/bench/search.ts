// A real search for the stopwatch: search file, record on the disk, pool of threads and engine, joined as
// coordinator/main.ts joins them, with a look inside after every durable step.

import { randomBytes } from 'node:crypto'
import { mkdirSync, writeFileSync } from 'node:fs'
import { join, resolve } from 'node:path'
import { searchTables } from '../../coordinator/cli/search-tables.js'
import { openSearch } from '../../coordinator/cli/searchfile/open.js'
import { localDispatcher } from '../../coordinator/dispatch/local.js'
import type { Engine } from '../../coordinator/engine/engine.js'
import { type LoopEnd, runLoop } from '../../coordinator/engine/loop.js'
import type { Dispatcher } from '../../coordinator/engine/ports.js'
import { openEngine } from '../../coordinator/engine/recover.js'
import { searchTools } from '../../coordinator/evolution/build.js'
import { type OpenRecord, openRecord, recordFolder, thisProcess } from '../../coordinator/record/index.js'
import type { AnyProblem } from '../../shared/problem.js'
import { loadPlugin } from '../../worker/plugin/load.js'
import { createPool } from '../../worker/pool.js'

export interface SearchText {
  readonly search: string
  readonly problem: string
}

export interface SearchParts {
  readonly engine: Engine
  readonly record: OpenRecord
  readonly problem: AnyProblem
  readonly dispatcher: Dispatcher
  /** Commits that were derived again from the journal. */
  readonly replayed: number
  /** Runs until the search rests or has finished, or the signal is aborted. */
  readonly run: (onStep?: () => void, signal?: AbortSignal) => Promise<LoopEnd>
  readonly close: () => Promise<void>
}

/** The same as in coordinator/main.ts. */
export const snapshotCommits = 10_000

/** Writes the files and opens or continues the record `folder`/record; the pool has not been started. */
export async function openBenchSearch(
  folder: string,
  text: SearchText,
  options: { readonly threads: number; readonly stopAfter?: number },
): Promise<SearchParts> {
  const file = writeSearch(folder, text)
  const opened = await openSearch(file, searchTables(), Date.now())
  const record = openRecord(join(folder, 'record'), {
    create: {
      plan: opened.plan,
      searchText: opened.text,
      pluginCode: new TextEncoder().encode(opened.bundle.code),
    },
    holder: thisProcess(),
    nonce: randomBytes(16).toString('hex'),
    clock: Date.now,
  })
  const problem = await loadPlugin({ code: new TextDecoder().decode(record.pluginCode) })
  const tools = searchTools(record.plan, {
    expectedCost: problem.expectedCost as never,
    repair: problem.repair as never,
  })
  const { engine, replay } = openEngine(tools, record.reader, {
    leaseMs: Number.POSITIVE_INFINITY,
    snapshotCommits,
    ...(options.stopAfter === undefined ? {} : { stopAfter: options.stopAfter }),
  })
  const pluginFile = resolve(recordFolder(join(folder, 'record')).plugin)
  const { seed, replicates } = record.plan
  const { threads } = options
  const dispatcher = localDispatcher((events) =>
    createPool({ pluginFile, seed, sharedConditions: replicates.shared, threads }, events),
  )
  return partsOf(engine, record, problem, dispatcher, replay.commits)
}

export function writeSearch(folder: string, text: SearchText): string {
  mkdirSync(folder, { recursive: true })
  writeFileSync(join(folder, 'problem.js'), text.problem)
  const file = join(folder, 'search.yaml')
  writeFileSync(file, text.search)
  return file
}

function partsOf(
  engine: Engine,
  record: OpenRecord,
  problem: AnyProblem,
  dispatcher: Dispatcher,
  replayed: number,
): SearchParts {
  const beat = setInterval(() => record.beat(), 2000)
  return {
    engine,
    record,
    problem,
    dispatcher,
    replayed,
    run: (onStep = () => undefined, signal = new AbortController().signal) =>
      runLoop(engine, {
        journal: record.journal,
        dispatcher,
        nowMs: () => performance.now(),
        pause: (ms) => new Promise((done) => setTimeout(done, ms)),
        signal,
        onStep,
      }),
    close: async () => {
      clearInterval(beat)
      await dispatcher.close()
      record.close()
    },
  }
}

export function committedSimulations(engine: Engine): number {
  return engine.search.islands.reduce((sum, island) => sum + island.counters.committedSimulations, 0)
}
