// What may be edited in the search file of a running search. One row a field: `free` (nothing of the result depends
// on it), `next-epoch` (a journalled change that takes effect at the first epoch end no island has passed, and
// that the search's purity names), or `branch` (another search: it needs a record of its own).

import { describeValue, type Place } from './finding.js'
import { fields } from './schema.js'
import { type FieldPath, fieldName, type LocatedText, readText } from './text.js'

export type ChangeKind = 'free' | 'next-epoch' | 'branch'

interface ChangeRow {
  readonly kind: ChangeKind
  readonly because: string
}

/** By field; [] stands for any index, * for any name. The longest row that fits a path decides. */
export const changeTable: { readonly [field: string]: ChangeRow } = {
  name: { kind: 'branch', because: 'the name belongs to the record' },
  problem: { kind: 'branch', because: 'the record keeps using its pinned copy of the problem' },
  seed: { kind: 'branch', because: 'every random number follows from it' },
  workersExpected: { kind: 'free', because: 'only warnings depend on it' },
  budget: { kind: 'next-epoch', because: 'islands may end earlier or later' },
  'budget.target': { kind: 'branch', because: 'every island has judged its results by it from the start' },
  'budget.stagnation': { kind: 'branch', because: 'every island has counted rounds by it from the start' },
  replicates: { kind: 'branch', because: 'results so far were estimated under other rules' },
  'replicates.most': { kind: 'next-epoch', because: 'top-ups from then on follow it' },
  islands: { kind: 'branch', because: 'it changes how an island searches' },
  'islands[]': { kind: 'next-epoch', because: 'islands at the end of the list are added or paused' },
  'islands[].count': { kind: 'next-epoch', because: 'islands of the last group are added or paused' },
  'islands[].method': { kind: 'branch', because: 'it changes how an island searches' },
  'islands[].population': { kind: 'branch', because: 'it changes how an island searches' },
  'islands[].lookahead': { kind: 'branch', because: 'it changes the order of commits' },
  'islands[].order': { kind: 'branch', because: 'it changes the order of commits' },
  'islands[].share': { kind: 'branch', because: 'quotas of all islands follow from it' },
  'islands[].settings': { kind: 'branch', because: 'it changes how an island searches' },
  'islands[].operators': { kind: 'branch', because: 'it changes how an island searches' },
  migration: { kind: 'branch', because: 'it changes who meets whom' },
  control: { kind: 'branch', because: 'a control must spend the whole budget of the search' },
  confirm: { kind: 'free', because: 'confirmation delays a commit, it never changes one' },
  genomes: { kind: 'branch', because: 'genomes not kept so far cannot be brought back' },
  tokens: { kind: 'free', because: 'the result does not depend on how many run at once' },
  cores: { kind: 'free', because: 'the result does not depend on the machine' },
  port: { kind: 'free', because: 'the result does not depend on it' },
}

export interface ChangeRowFound {
  readonly field: string
  readonly old: string
  readonly new: string
  readonly kind: ChangeKind
  readonly because: string
  /** In the new file; of the enclosing field when the field was removed. */
  readonly place: Place
}

/**
 * Differences of meaning between two search files: layout, comments and defaults written out do not count. Both texts must
 * have been read without refusal; a text that is no YAML differs in nothing.
 */
export function diffSearchFiles(oldText: string, newText: string): ChangeRowFound[] {
  const located = readText(newText)
  const before = leaves(withDefaults(readText(oldText)))
  const after = leaves(withDefaults(located))
  const groups = Math.max(countGroups(before), countGroups(after))
  const rows: ChangeRowFound[] = []
  for (const field of new Set([...before.keys(), ...after.keys()])) {
    const one = before.get(field)
    const two = after.get(field)
    if (Object.is(one?.value, two?.value)) continue
    const path = (two ?? one)!.path
    const row = rowFor(
      path,
      groups,
      one === undefined || two === undefined,
      countGroups(before),
      countGroups(after),
    )
    rows.push({
      field,
      old: one === undefined ? 'absent' : shown(one.value),
      new: two === undefined ? 'absent' : shown(two.value),
      kind: row.kind,
      because: row.because,
      place: located.placeOf(path),
    })
  }
  return rows.sort((a, b) => a.place.line - b.place.line || a.place.column - b.place.column)
}

interface Leaf {
  readonly path: FieldPath
  readonly value: unknown
}

function shown(value: unknown): string {
  return describeValue(value).replace(/^the (text|number|truth value) /, '')
}

function withDefaults(located: LocatedText): unknown {
  const value = located.value
  if (typeof value !== 'object' || value === null) return {}
  const given = value as { readonly [key: string]: unknown }
  const filled: { [key: string]: unknown } = { ...given }
  for (const [key, schema] of Object.entries(fields)) {
    const parsed = schema.safeParse(given[key])
    if (parsed.success) filled[key] = parsed.data
  }
  return filled
}

function leaves(value: unknown, path: FieldPath = []): Map<string, Leaf> {
  if (value === undefined) return new Map()
  if (typeof value !== 'object' || value === null) return new Map([[fieldName(path), { path, value }]])
  const entries: [string | number, unknown][] = Array.isArray(value)
    ? value.map((item, index) => [index, item])
    : Object.entries(value)
  return new Map(entries.flatMap(([step, inner]) => [...leaves(inner, [...path, step])]))
}

function countGroups(of: ReadonlyMap<string, Leaf>): number {
  const groups = new Set([...of.values()].map(({ path }) => (path[0] === 'islands' ? path[1] : undefined)))
  groups.delete(undefined)
  return groups.size
}

/** Island numbers follow the order of the file, so only the end of the list can grow or shrink. */
function rowFor(
  path: FieldPath,
  groups: number,
  onOneSide: boolean,
  before: number,
  after: number,
): ChangeRow {
  const group = path[0] === 'islands' ? Number(path[1]) : undefined
  if (group !== undefined && onOneSide && group >= Math.min(before, after)) return changeTable['islands[]']!
  if (path[2] === 'count' && group !== undefined && group < groups - 1) {
    return { kind: 'branch', because: 'the islands after this group would get other numbers' }
  }
  return rowOf(path)
}

/** The longest row of the table that fits. */
export function rowOf(path: FieldPath): ChangeRow {
  for (let length = path.length; length > 0; length--) {
    const field = fieldName(path.slice(0, length)).replace(/\[\d+\]/g, '[]')
    if (Object.hasOwn(changeTable, field) && field !== 'islands[]') return changeTable[field]!
  }
  return { kind: 'branch', because: 'the field is unknown' }
}

const kindWords: { readonly [kind in ChangeKind]: string } = {
  free: 'free',
  'next-epoch': 'from the next epoch',
  branch: 'needs a new record',
}

/** A table for a person, one line a difference. */
export function printChanges(file: string, rows: readonly ChangeRowFound[]): string {
  const cells = rows.map((row) => [
    `${file}:${row.place.line}:${row.place.column}`,
    row.field,
    row.old,
    row.new,
    kindWords[row.kind],
    row.because,
  ])
  return columns([['where', 'field', 'was', 'is', 'takes effect', 'because'], ...cells])
}

/** Left-aligned columns, two spaces apart. */
export function columns(rows: readonly (readonly string[])[]): string {
  const widths = (rows[0] ?? []).map((_, column) => Math.max(...rows.map((row) => row[column]!.length)))
  const line = (row: readonly string[]) =>
    row
      .map((cell, column) => cell.padEnd(widths[column]!))
      .join('  ')
      .trimEnd()
  return rows.map(line).join('\n')
}
