// The meeting place: a search file, a record, a pool of threads and the engine become a running search. Everything
// is decided elsewhere; here the parts are handed to one another.

import { randomBytes } from 'node:crypto'
import { availableParallelism } from 'node:os'
import { join } from 'node:path'
import { limits } from '../shared/limits.js'
import type { Needs } from '../shared/needs.js'
import type { AnyProblem } from '../shared/problem.js'
import { refuse } from '../shared/refusals.js'
import { readKey } from '../worker/cluster/index.js'
import { loadPlugin } from '../worker/plugin/load.js'
import { Alarms } from './cli/join/alarms.js'
import { openAlone, refuseIfHeldHere } from './cli/join/alone.js'
import { type BudgetEnds, finishedBecause, orderBudgetEnds, resumeEnds } from './cli/join/budget-ends.js'
import { acceptedText, judgeChanges, orderChanges } from './cli/join/changes.js'
import { clusterDispatcher } from './cli/join/cluster.js'
import { type Finish, retest, toRetest, write, writeFinish } from './cli/join/finish.js'
import { dispatcherHere } from './cli/join/here.js'
import { progressFile } from './cli/join/looking-on.js'
import { Meter, simulationsLeft } from './cli/join/meter.js'
import { type OwnRedisOptions, ownRedis } from './cli/join/own-redis.js'
import { pause } from './cli/join/pause.js'
import { placeOf } from './cli/join/place.js'
import { toolsOf } from './cli/join/tools.js'
import { progressView } from './cli/join/view.js'
import type { ProgressView } from './cli/progress-view.js'
import type { RunEnd, RunOptions } from './cli/run-options.js'
import { searchTables } from './cli/search-tables.js'
import { type OpenedSearch, openSearch, peekName } from './cli/searchfile/open.js'
import type { Engine } from './engine/engine.js'
import { type LoopEnd, type LoopState, runLoop } from './engine/loop.js'
import type { Dispatcher, RecordReader } from './engine/ports.js'
import { openEngine } from './engine/recover.js'
import { type OpenRecord, recordFolder } from './record/index.js'

/** Commits of an island between two snapshots: a restart replays at most as many. */
const snapshotCommits = 10_000
const beatSeconds = 2
const keyBytes = 32
const progressSeconds = 1

/** Starts the search of a file, or goes on where its record stands. */
export async function runSearch(options: RunOptions): Promise<RunEnd> {
  if ((options.cores ?? 1) > limits.threadsMost) {
    throw refuse('usage', {
      detail: `--cores ${options.cores}; expected at most ${limits.threadsMost}, usually the cores of this machine (${availableParallelism()})`,
    })
  }
  const name = peekName(options.file, searchTables())
  if (!options.force && !options.standby && name !== undefined)
    refuseIfHeldHere(placeOf(options.record ?? join('records', name), options.scratch))
  const opened = await openSearch(options.file, searchTables(), Date.now())
  if (opened.warnings.length > 0)
    options.tell({ kind: 'warned', file: options.file, findings: opened.warnings })
  for (const warning of opened.bundle.warnings) options.tell({ kind: 'said', sentence: warning })
  const folder = options.record ?? join('records', opened.plan.name)
  const place = placeOf(folder, options.scratch)
  const record = await openAlone(options, opened, place)
  try {
    return await runRecord(options, opened, record, { folder, here: place.here })
  } finally {
    record.close()
  }
}

async function runRecord(
  options: RunOptions,
  opened: OpenedSearch,
  record: OpenRecord,
  folders: Pick<Driven, 'folder' | 'here'>,
): Promise<RunEnd> {
  for (const sentence of record.notices) options.tell({ kind: 'said', sentence })
  const changes = record.created
    ? []
    : judgeChanges(
        options.file,
        acceptedText(record.reader, record.searchText),
        opened.text,
        options.acceptChanges,
        (found) => options.tell({ kind: 'changed', file: options.file, changes: found }),
      )
  if (record.plan.problem.digest !== opened.bundle.digest) {
    options.tell({
      kind: 'said',
      sentence: `${opened.fields.problem} was edited since the record was begun. The search goes on with its pinned copy; for the new one, begin another record.`,
    })
  }
  const problem = await loadPlugin({ code: new TextDecoder().decode(record.pluginCode) })
  const { engine, replay } = openEngine(toolsOf(record.plan, problem), record.reader, {
    // The pool of this machine answers for everything it was given.
    leaseMs: Number.POSITIVE_INFINITY,
    snapshotCommits,
    ...(options.stopAfter === undefined ? {} : { stopAfter: options.stopAfter }),
  })
  noteStart(engine, record, replay.commits, options)
  orderChanges(engine, changes, opened)
  const ends = resumeEnds(engine, record.reader, changes, opened.fields.budget)
  const cores = options.cores ?? opened.fields.cores ?? availableParallelism()
  return await drive({
    options,
    record,
    ...folders,
    engine,
    problem,
    cores,
    tokens: opened.fields.tokens,
    ends,
  })
}

function noteStart(engine: Engine, record: OpenRecord, replayed: number, options: RunOptions): void {
  if (record.created) {
    engine.note('begun', 'The search was begun.')
    return
  }
  const { submitted, waiting } = engine.inHand
  const sentence = `Continued: ${replayed} commits were derived again behind the snapshots, ${submitted + waiting} evaluations are sent out again.`
  options.tell({ kind: 'said', sentence })
  engine.note('continued', sentence)
  if (record.loss) {
    engine.note(
      'end-of-record-lost',
      `The last ${record.loss.appends} appends were missing and are simulated again.`,
    )
  }
}

interface Driven {
  readonly options: RunOptions
  readonly record: OpenRecord
  readonly folder: string
  /** Where this machine has the database and the pinned plug-in. */
  readonly here: string
  readonly engine: Engine
  readonly problem: AnyProblem
  readonly cores: number
  /** Of each licence, how many the search file says there are. */
  readonly tokens: Needs['tokens']
  readonly ends: BudgetEnds
}

async function drive(driven: Driven): Promise<RunEnd> {
  const { options, record, folder, engine, cores } = driven
  const key = keyOf(options)
  const own = key && options.ownRedis ? await ownRedis({ ...ownRedisOptions(driven), key }) : undefined
  const redis = own?.coordinatorUrl ?? options.redis
  const dispatcher = dispatcherOf(driven, redis, key)
  const slots = () => (redis === undefined ? cores : dispatcher.status().slots)
  const meter = new Meter(slots, () => performance.now())
  const alarms = new Alarms(engine.search, record.reader, () => performance.now())
  const beat = setInterval(() => record.beat(), beatSeconds * 1000)
  try {
    await dispatcher.start()
    const end = await runLoop(engine, {
      journal: record.journal,
      dispatcher,
      nowMs: () => performance.now(),
      pause: (ms) => pause(ms, options.signal),
      signal: options.signal,
      onStep: (state) => {
        orderBudgetEnds(engine, record.reader, driven.ends, Date.now())
        if (meter.isDue(progressSeconds)) tellProgress(driven, meter, alarms, state)
      },
    })
    const finish = await finishRun(driven, end, dispatcher)
    const view = progressView({
      search: engine.search,
      reader: record.reader,
      folder,
      ...stateOf(end, record.reader),
    })
    write(folder, progressFile, 'progress', JSON.stringify(view))
    return { ended: endWord[end], view, ...finish }
  } finally {
    clearInterval(beat)
    await dispatcher.close()
    await own?.close()
  }
}

/** Of the site, or made for this run of a coordinator with a Redis of its own. */
function keyOf({ keyFile, ownRedis: own }: RunOptions): Uint8Array | undefined {
  if (keyFile !== undefined) return readKey(keyFile)
  return own ? Uint8Array.from(randomBytes(keyBytes)) : undefined
}

function ownRedisOptions({ options, record, folder }: Driven): Omit<OwnRedisOptions, 'key'> {
  const { address, tell } = options
  return { address, tell, folder, holder: record.epoch }
}

function dispatcherOf(
  { options, record, folder, here, cores, tokens, engine }: Driven,
  redis: string | undefined,
  key: Uint8Array | undefined,
): Dispatcher {
  if (redis !== undefined) {
    const tell = (sentence: string) => options.tell({ kind: 'said', sentence })
    const { redisUnprotected, ownRedis: own } = options
    const found = own ? { workerCommand: `skerry work --record ${folder}` } : {}
    return clusterDispatcher({ redisUnprotected, redis, key, tokens, tell, ...found }, record, engine)
  }
  return dispatcherHere({ pluginFile: recordFolder(here).plugin, plan: record.plan, cores, tokens })
}

const endWord: { readonly [end in LoopEnd]: RunEnd['ended'] } = {
  finished: 'finished',
  rested: 'stop-after',
  interrupted: 'interrupted',
}

type Stated = { readonly state: ProgressView['state']; readonly because?: string }

function stateOf(end: LoopEnd, reader: RecordReader): Stated {
  if (end === 'finished') return { state: 'finished', ...finishedBecause(reader) }
  return { state: 'stopped', because: end === 'rested' ? 'because --stop-after asked for it' : 'by a signal' }
}

async function finishRun(driven: Driven, end: LoopEnd, dispatcher: Dispatcher): Promise<Finish> {
  const { engine, options, folder, problem, record } = driven
  if (end === 'interrupted') return { summary: [], brief: [], files: [] }
  const tests = await retest(engine.search, toRetest(engine.search), dispatcher, options.signal)
  return writeFinish(folder, engine.search, problem, tests, record.reader)
}

function tellProgress(
  { options, record, folder, engine }: Driven,
  meter: Meter,
  alarms: Alarms,
  state: LoopState,
): void {
  const simulations = engine.search.islands.reduce((sum, one) => sum + one.counters.committedSimulations, 0)
  const left = simulationsLeft(engine.search.islands)
  const rate = meter.rate(simulations, record.reader.totals().cpuSeconds, left)
  const view = progressView({
    search: engine.search,
    reader: record.reader,
    folder,
    state: state.kind,
    ...(state.kind === 'paused' ? { because: state.refusal.message } : {}),
    standing: (island) => engine.standing(island),
    rate,
  })
  options.tell({ kind: 'progress', view })
  for (const sentence of alarms.look(view)) options.tell({ kind: 'said', sentence })
  if (state.kind === 'searching') write(folder, progressFile, 'progress', JSON.stringify(view))
}

export { readProgress, rederive } from './cli/join/looking-on.js'
