// What a search file may name, as arguments: the rows of evolution's tables. Given by the caller, so that the reader
// can be tested with tables of its own.

import type { Encoding } from '../../../shared/genome.js'
import type { Method, SettingTable } from '../../evolution/types.js'

export type MethodRow = Pick<
  Method,
  'name' | 'summary' | 'settings' | 'defaultPopulation' | 'pace' | 'objectives'
>

export interface OperatorRow {
  readonly name: string
  readonly summary: string
  readonly encodings: readonly Encoding['kind'][]
  readonly settings: SettingTable
}

export interface SearchTables {
  /** Number of the rules of the search that a new record gets. */
  readonly semantics: number
  readonly methods: readonly MethodRow[]
  readonly crossovers: readonly OperatorRow[]
  readonly mutations: readonly OperatorRow[]
  /** Names of the operators a part gets when the file names none. */
  readonly defaultOperators: (encoding: Encoding) => { readonly crossover: string; readonly mutation: string }
}
