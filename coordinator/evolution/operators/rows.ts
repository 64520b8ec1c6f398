// What a variation operator is: a row that says which encodings it fits, which settings it takes, and builds a
// pure function over the value of one part. Building checks and prepares once; what is built only runs.
//
// An operator never changes a value in place. Where nothing changes it may return the value it was given:
// values are immutable once they have left their maker.

import { check } from '../../../shared/check.js'
import { slotsOf } from '../../../shared/encodings.js'
import type { Encoding, PartValue } from '../../../shared/genome.js'
import type { Stream } from '../../../shared/streams.js'
import { numberSetting } from '../settings.js'
import type { SettingRow, Settings, SettingTable } from '../types.js'

/**
 * The first of the two children of `a` and `b`: the one that keeps the genes of `a` where nothing is exchanged.
 * Equal parents give an equal child.
 */
export type Crossover = (a: PartValue, b: PartValue, stream: Stream) => PartValue
export type Mutation = (value: PartValue, stream: Stream) => PartValue

interface OperatorRow {
  /** As written in a search file. */
  readonly name: string
  readonly title: string
  /** One line for --help and docs. */
  readonly summary: string
  /** Method, year, equation; or 'common practice, no source'. */
  readonly source: string
  readonly encodings: readonly Encoding['kind'][]
  readonly settings: SettingTable
}
export interface CrossoverRow extends OperatorRow {
  /** The operator for parts of this encoding; `settings` were checked against the row's table. */
  readonly build: (encoding: Encoding, settings: Settings) => Crossover
}
export interface MutationRow extends OperatorRow {
  /** The operator for parts of this encoding; `settings` were checked against the row's table. */
  readonly build: (encoding: Encoding, settings: Settings) => Mutation
}

export const everyEncoding: readonly Encoding['kind'][] = ['real', 'integer', 'choice', 'bits', 'layout']

/** The setting of mutations that change each gene independently with the same chance. */
export const changesRow: SettingRow = {
  kind: 'number',
  default: 1,
  low: 0,
  high: 1e6,
  help: 'expected number of genes of the part that change; each changes with chance changes / length',
}

/** The chance of one gene to change, from a setting that gives the expected number of changes in the part. */
export function rateOf(settings: Settings, name: string, encoding: Encoding): number {
  return Math.min(1, numberSetting(settings, name) / slotsOf(encoding))
}

export function realsOf(value: PartValue): Float64Array {
  check(value instanceof Float64Array, 'the value of a real part is a Float64Array')
  return value
}
export function integersOf(value: PartValue): Int32Array {
  check(value instanceof Int32Array, 'the value of an integer, choice or layout part is an Int32Array')
  return value
}
export function bitsOf(value: PartValue): Uint8Array {
  check(value instanceof Uint8Array, 'the value of a bits part is a Uint8Array')
  return value
}
