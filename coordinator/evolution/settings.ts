// Settings of methods and operators: reading what a search file gives against a table of rows. The table is
// the one place that knows a setting's kind, bounds and default, so that help, check and use agree.

import { check } from '../../shared/check.js'
import type { SettingRow, Settings, SettingTable } from './types.js'

/** A given setting that its table does not allow. A value, not an error: the caller knows file and line. */
export class SettingFault {
  /** Name of the setting as it was given. */
  readonly field: string
  /** What stood there, in words for a person. */
  readonly found: string
  readonly expected: string

  constructor(field: string, found: string, expected: string) {
    this.field = field
    this.found = found
    this.expected = expected
  }
}

/** What a row allows, in words: 'a number from 0 to 1'. */
export function expectedOf(row: SettingRow): string {
  if (row.kind === 'choice') return `one of ${row.options.join(', ')}`
  return `${row.kind === 'integer' ? 'a whole number' : 'a number'} from ${row.low} to ${row.high}`
}

/** Every row at its default. */
export function defaultSettings(table: SettingTable): Settings {
  return Object.fromEntries(Object.entries(table).map(([name, row]) => [name, row.default]))
}

/**
 * The settings of `table` with what was given in place of the defaults; a SettingFault for the first name that
 * is no row or value that its row does not allow.
 */
export function checkSettings(
  table: SettingTable,
  given: { readonly [name: string]: unknown },
): Settings | SettingFault {
  for (const [name, value] of Object.entries(given)) {
    if (!Object.hasOwn(table, name)) return new SettingFault(name, 'an unknown setting', namesOf(table))
    const row = table[name]!
    if (!allows(row, value)) return new SettingFault(name, wordsOf(value), expectedOf(row))
  }
  const rows = Object.entries(table).map(([name, row]) => [
    name,
    Object.hasOwn(given, name) ? given[name] : row.default,
  ])
  return Object.fromEntries(rows) as Settings
}

/** A checked number; the table promised that it is there. */
export function numberSetting(settings: Settings, name: string): number {
  const value = settings[name]
  check(typeof value === 'number', `setting ${name} is a number`)
  return value
}

/** A checked choice; the table promised that it is there. */
export function choiceSetting(settings: Settings, name: string): string {
  const value = settings[name]
  check(typeof value === 'string', `setting ${name} is a choice`)
  return value
}

function allows(row: SettingRow, value: unknown): boolean {
  if (row.kind === 'choice') return typeof value === 'string' && row.options.includes(value)
  if (typeof value !== 'number' || !Number.isFinite(value)) return false
  if (row.kind === 'integer' && !Number.isInteger(value)) return false
  return value >= row.low && value <= row.high
}

function namesOf(table: SettingTable): string {
  const names = Object.keys(table)
  return names.length === 0 ? 'no settings here' : `one of ${names.join(', ')}`
}

function wordsOf(value: unknown): string {
  if (typeof value === 'string') return `'${value}'`
  if (typeof value === 'number' || typeof value === 'boolean' || value === null) return String(value)
  return Array.isArray(value) ? 'a list' : value === undefined ? 'nothing' : 'a mapping'
}
