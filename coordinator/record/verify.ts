// Checking the chain: every append's head is computed again from the rows it names. Finds any changed, missing
// or added row, tells the first append that does not hold, and goes on to count what is intact behind it.

import { equalBytes } from '../../shared/digests.js'
import { islandName } from '../../shared/ids.js'
import { Refusal } from '../../shared/refusals.js'
import {
  type AppendedKeys,
  type AppendedRows,
  type AppendHeader,
  genesisOf,
  headAfter,
  keysOf,
} from './chain.js'
import type { GuardedDatabase } from './guard.js'
import { renderTime } from './holder.js'
import { bytesAt, damaged, digestAt, numberAt } from './rows.js'
import { type ChainedTable, chained, chainedTables, selectSql } from './schema.js'
import { openSnapshot } from './states.js'
import type { Column, Statement } from './storage.js'

/** Appends read at a time. */
const chunkAppends = 256

export interface DamagedAppend {
  readonly append: number
  /** When it was written, 0 when that is lost too. */
  readonly atMs: number
  readonly reason: string
  /** What the append holds, in words. */
  readonly holds: string
}
export interface Verification {
  readonly intact: boolean
  /** Appends found. */
  readonly appends: number
  readonly firstBad: DamagedAppend | undefined
  /** Appends and arrivals before the first bad one. */
  readonly intactBefore: { readonly appends: number; readonly arrivals: number }
  /** Appends after the first bad one that hold by themselves. */
  readonly intactAfter: number
  /** Snapshots that cannot be used; they are a cache and no damage to the record. */
  readonly damagedSnapshots: number
  readonly sentences: readonly string[]
}

interface AppendRead extends AppendHeader {
  readonly head: Uint8Array
}

const appendColumns = 'sequence, epoch, at_ms, arrivals, cpu_seconds, contents, head'
function appendOf(row: readonly Column[]): AppendRead {
  return {
    sequence: numberAt(row, 0),
    epoch: numberAt(row, 1),
    atMs: numberAt(row, 2),
    arrivals: numberAt(row, 3),
    cpuSeconds: numberAt(row, 4),
    contents: bytesAt(row, 5),
    head: digestAt(row, 6),
  }
}

/** Looks at single appends; holds the prepared statements. */
export class ChainChecker {
  readonly #selects: { readonly [table in ChainedTable]: Statement }
  readonly #chunk: Statement
  readonly #meta: Statement
  readonly #selectOverruled: Statement
  readonly #range: Statement
  readonly #anyOverruled: boolean
  /** Rows that appends have named so far. */
  readonly counts = new Map<ChainedTable, number>(chainedTables.map((table) => [table, 0]))

  constructor(database: GuardedDatabase) {
    const prepare = (table: ChainedTable) => [table, database.prepare(selectSql(table))] as const
    this.#selects = Object.fromEntries(chainedTables.map(prepare)) as { [table in ChainedTable]: Statement }
    this.#chunk = database.prepare(
      `SELECT ${appendColumns} FROM appends WHERE sequence > ? ORDER BY sequence LIMIT ${chunkAppends}`,
    )
    this.#meta = database.prepare('SELECT key, value FROM meta ORDER BY key')
    this.#selectOverruled = database.prepare(
      `SELECT ${chained.results.columns.join(', ')}, replaced_in FROM overruled
       WHERE island = ? AND evaluation = ? AND replaced_in >= ? ORDER BY number`,
    )
    this.#range = database.prepare(
      `SELECT ${chained.results.columns.join(', ')} FROM results WHERE island = ? AND evaluation BETWEEN ? AND ?`,
    )
    this.#anyOverruled = database.prepare('SELECT 1 FROM overruled LIMIT 1').get() !== undefined
  }

  /** Why the beginning does not hold, or undefined. */
  checkGenesis(genesis: AppendRead | undefined): string | undefined {
    if (genesis?.sequence !== 0) return 'the first entry of the chain is missing'
    if (equalBytes(genesis.head, genesisOf(this.#meta.all()))) return undefined
    return 'the plan, the search file or the plug-in stored in it has been changed'
  }

  /** Why an append does not hold after the head `previous`, or undefined. */
  checkAppend(append: AppendRead, previous: AppendRead): string | undefined {
    if (append.sequence !== previous.sequence + 1) return `append ${previous.sequence + 1} is missing`
    try {
      const keys = keysOf(append.contents)
      const rows = this.#rowsOf(append.sequence, keys)
      if (typeof rows === 'string') return rows
      if (append.arrivals !== previous.arrivals + keys.results.length) return 'its count of arrivals is wrong'
      if (!equalBytes(headAfter(previous.head, append, rows), append.head))
        return 'its digest does not match its rows'
      return undefined
    } catch (error) {
      return damageIn(error)
    }
  }

  #rowsOf(sequence: number, keys: AppendedKeys): AppendedRows | string {
    const rows: { [table in ChainedTable]?: Column[][] } = {}
    for (const table of chainedTables) {
      const found: Column[][] = []
      this.counts.set(table, this.counts.get(table)! + keys[table].length)
      const ahead = table === 'results' ? this.#readRanges(keys.results) : noRows
      for (const [index, key] of keys[table].entries()) {
        const overruled = table === 'results' && this.#overruled(sequence, keys.results, index)
        const row = overruled || (ahead.get(key.join()) ?? this.#selects[table].get(...key))
        if (!row) return `a row of ${table} is missing (${key.join(', ')})`
        found.push(row)
      }
      rows[table] = found
    }
    return rows as AppendedRows
  }

  /** Results of an append mostly lie side by side: they are read in one go for each island. */
  #readRanges(keys: readonly (readonly number[])[]): ReadonlyMap<string, Column[]> {
    const found = new Map<string, Column[]>()
    for (const [island, { low, high, count }] of rangesOf(keys)) {
      if (high - low >= 2 * count) continue
      for (const row of this.#range.all(island, low, high)) found.set(`${row[0]},${row[1]}`, row)
    }
    return found
  }

  /**
   * The result that key `index` of append `sequence` named, when another has taken its place since. Those that
   * were replaced in the same append are its own earlier ones (and, before them, one of an earlier append).
   */
  #overruled(sequence: number, keys: readonly (readonly number[])[], index: number): Column[] | undefined {
    if (!this.#anyOverruled) return undefined
    const [island, evaluation] = keys[index]! as [number, number]
    const rows = this.#selectOverruled.all(island, evaluation, sequence)
    const later = keys.slice(index + 1).filter(([i, e]) => i === island && e === evaluation).length
    const own = rows.filter((row) => row[row.length - 1] === sequence)
    const row = later > 0 ? own[own.length - later] : rows[own.length]
    return row?.slice(0, -1)
  }

  /** Appends from `from` on, ascending. */
  *appends(from: number): Iterable<AppendRead> {
    let last = from - 1
    for (;;) {
      const rows = this.#chunk.all(last)
      for (const row of rows) {
        const append = appendOf(row)
        yield append
        last = append.sequence
      }
      if (rows.length < chunkAppends) return
    }
  }
}

/** Checks the last `count` appends and the beginning: what a start can afford. @throws Refusal 'record-corrupted' */
export function assertTail(database: GuardedDatabase, last: number, count: number): void {
  const checker = new ChainChecker(database)
  const [genesis] = checker.appends(0)
  const wrong = checker.checkGenesis(genesis)
  if (wrong) throw damaged('the beginning of the record', wrong)
  let previous: AppendRead | undefined
  for (const append of checker.appends(Math.max(0, last - count))) {
    const reason = previous && checker.checkAppend(append, previous)
    if (reason)
      throw damaged(
        `append ${previous!.sequence + 1} of ${last}`,
        `${reason}; it holds ${describe(append.contents)}`,
      )
    previous = append
  }
  if (previous?.sequence !== last) throw damaged(`append ${last}`, 'it is missing')
}

/** Checks everything. Reads each row once; memory does not grow with the record. */
export function verifyChain(database: GuardedDatabase, progress?: (appends: number) => void): Verification {
  const checker = new ChainChecker(database)
  const walk = walkChain(checker, progress)
  const extra = walk.firstBad ? [] : surplus(database, checker)
  const damagedSnapshots = countDamagedSnapshots(database)
  const found = { ...walk, damagedSnapshots, intact: walk.firstBad === undefined && extra.length === 0 }
  return { ...found, sentences: [...wordsFor(found), ...extra] }
}

type Walk = Pick<Verification, 'appends' | 'firstBad' | 'intactBefore' | 'intactAfter'>

function walkChain(checker: ChainChecker, progress: ((appends: number) => void) | undefined): Walk {
  let previous: AppendRead | undefined
  let firstBad: DamagedAppend | undefined
  let intactAfter = 0
  let before = { appends: 0, arrivals: 0 }
  try {
    for (const append of checker.appends(0)) {
      const reason = previous ? checker.checkAppend(append, previous) : checker.checkGenesis(append)
      const expected = previous ? previous.sequence + 1 : 0
      if (reason && !firstBad)
        firstBad = { append: expected, atMs: append.atMs, reason, holds: describe(append.contents) }
      if (!reason && firstBad) intactAfter += 1
      if (!firstBad) before = { appends: append.sequence, arrivals: append.arrivals }
      previous = append
      if (append.sequence % chunkAppends === 0) progress?.(append.sequence)
    }
  } catch (error) {
    const reason = damageIn(error)
    firstBad ??= {
      append: previous ? previous.sequence + 1 : 0,
      atMs: 0,
      reason,
      holds: 'what cannot be told',
    }
  }
  if (!previous && !firstBad) {
    firstBad = { append: 0, atMs: 0, reason: 'the first entry of the chain is missing', holds: 'the search' }
  }
  return { appends: previous?.sequence ?? 0, firstBad, intactBefore: before, intactAfter }
}

/** Rows that no append names. */
function surplus(database: GuardedDatabase, checker: ChainChecker): string[] {
  return chainedTables.flatMap((table) => {
    const count = (name: string) => Number(database.prepare(`SELECT count(*) FROM ${name}`).get()?.[0] ?? 0)
    const found = count(table) + (table === 'results' ? count('overruled') : 0)
    const named = checker.counts.get(table)!
    return found === named ? [] : [`The table ${table} has ${found} rows, and ${named} were appended.`]
  })
}

function countDamagedSnapshots(database: GuardedDatabase): number {
  try {
    const keys = database.prepare('SELECT island, number FROM snapshots').all()
    const select = database.prepare(
      'SELECT digest, checksum, state FROM snapshots WHERE island = ? AND number = ?',
    )
    return keys.filter(([island, commit]) => {
      const row = select.get(island!, commit!)
      if (!row) return true
      const [digest, checksum, state] = [bytesAt(row, 0), bytesAt(row, 1), bytesAt(row, 2)]
      return !openSnapshot({ island: Number(island), commit: Number(commit), digest, checksum, state })
    }).length
  } catch (error) {
    damageIn(error)
    return 1
  }
}

/** What is damaged, in words. A disk that cannot be read now says nothing about what it holds: that is thrown on. */
function damageIn(error: unknown): string {
  if (error instanceof Refusal && error.code !== 'record-corrupted' && error.code !== 'bytes-malformed')
    throw error
  return error instanceof Error ? error.message : String(error)
}

function wordsFor(found: Omit<Verification, 'sentences'>): string[] {
  const { firstBad, intactBefore, intactAfter, appends, damagedSnapshots } = found
  const words = firstBad
    ? [
        `The first damaged append is ${firstBad.append} of ${appends}` +
          `${firstBad.atMs > 0 ? `, written ${renderTime(firstBad.atMs)}` : ''}: ${firstBad.reason}.`,
        `It holds ${firstBad.holds}.`,
        `Intact before it: ${intactBefore.appends} appends with ${intactBefore.arrivals} results.`,
        `Intact after it: ${intactAfter} appends.`,
      ]
    : [`All ${appends} appends with ${intactBefore.arrivals} results hold.`]
  if (damagedSnapshots > 0) words.push('Some snapshots are damaged; they are passed over and made again.')
  return words
}

/** 'results i1: 401-450, i2: 12; 3 commits', from the keys alone. */
function describe(contents: Uint8Array): string {
  let keys: AppendedKeys
  try {
    keys = keysOf(contents)
  } catch {
    return 'what cannot be told: its list of contents is damaged'
  }
  const results = [...rangesOf(keys.results)]
    .sort(([a], [b]) => a - b)
    .map(([island, { low, high }]) => `${islandName(island)}: ${low === high ? low : `${low}-${high}`}`)
  const others = chainedTables
    .filter((table) => table !== 'results' && keys[table].length > 0)
    .map((table) => `${keys[table].length} rows of ${table}`)
  const all = results.length > 0 ? [`evaluations ${results.join(', ')}`, ...others] : others
  return all.length > 0 ? all.join('; ') : 'the description of the search'
}

interface Range {
  low: number
  high: number
  count: number
}
const noRows: ReadonlyMap<string, Column[]> = new Map()

/** Lowest and highest evaluation of each island. */
function rangesOf(keys: readonly (readonly number[])[]): Map<number, Range> {
  const ranges = new Map<number, Range>()
  for (const [island, evaluation] of keys as readonly (readonly [number, number])[]) {
    const range = ranges.get(island)
    if (!range) {
      ranges.set(island, { low: evaluation, high: evaluation, count: 1 })
      continue
    }
    range.low = Math.min(range.low, evaluation)
    range.high = Math.max(range.high, evaluation)
    range.count += 1
  }
  return ranges
}
