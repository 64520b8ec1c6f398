// The two tables of variation operators, and which operator an encoding gets when the search file names none.
// Adding an operator is adding a row.

import { check } from '../../../shared/check.js'
import type { Encoding, GenomeSpec } from '../../../shared/genome.js'
import type { OperatorPlan } from '../plan.js'
import { checkSettings, defaultSettings, SettingFault } from '../settings.js'
import type { Settings } from '../types.js'
import { bitFlipMutation, oneBitMutation } from './bits.js'
import { creepMutation, noMutation, resetMutation } from './discrete.js'
import { noCrossover, onePointCrossover, twoPointCrossover, uniformCrossover } from './exchange.js'
import { patchCrossover, patchResetMutation } from './layout.js'
import { gaussianMutation, polynomialMutation, simulatedBinaryCrossover } from './real.js'
import type { CrossoverRow, MutationRow } from './rows.js'

export const crossoverRows: readonly CrossoverRow[] = [
  simulatedBinaryCrossover,
  uniformCrossover,
  onePointCrossover,
  twoPointCrossover,
  patchCrossover,
  noCrossover,
]

export const mutationRows: readonly MutationRow[] = [
  polynomialMutation,
  gaussianMutation,
  bitFlipMutation,
  oneBitMutation,
  resetMutation,
  creepMutation,
  patchResetMutation,
  noMutation,
]

/** What a part gets when the search file says nothing, by encoding. */
export const operatorDefaults: {
  readonly [kind in Encoding['kind']]: { readonly crossover: string; readonly mutation: string }
} = {
  real: { crossover: 'sbx', mutation: 'polynomial' },
  integer: { crossover: 'uniform', mutation: 'creep' },
  choice: { crossover: 'uniform', mutation: 'reset' },
  bits: { crossover: 'uniform', mutation: 'bit-flip' },
  layout: { crossover: 'patch', mutation: 'reset' },
}

type AnyRow = CrossoverRow | MutationRow

/** The crossover and mutation of every part, at default settings. */
export function defaultOperators(spec: GenomeSpec): { readonly [part: string]: OperatorPlan } {
  return Object.fromEntries(Object.keys(spec).map((part) => [part, defaultOperator(spec[part]!)]))
}

/** The crossover and mutation of a part of this encoding, at default settings. */
export function defaultOperator(encoding: Encoding): OperatorPlan {
  const names = operatorDefaults[encoding.kind]
  return {
    crossover: {
      operator: names.crossover,
      settings: defaultSettings(rowOf(crossoverRows, names.crossover).settings),
    },
    mutation: {
      operator: names.mutation,
      settings: defaultSettings(rowOf(mutationRows, names.mutation).settings),
    },
  }
}

/**
 * One operator as a search file gives it, checked: its name must be a row of `rows` that fits the encoding, its
 * settings must be those of the row. The fault's field is 'operator' or the setting's name.
 */
export function checkOperator(
  rows: readonly AnyRow[],
  encoding: Encoding,
  operator: string,
  given: { readonly [name: string]: unknown },
): { readonly operator: string; readonly settings: Settings } | SettingFault {
  const fitting = rows.filter((row) => row.encodings.includes(encoding.kind))
  const row = fitting.find((one) => one.name === operator)
  if (row === undefined) {
    const expected = `for ${encoding.kind} one of ${fitting.map((one) => one.name).join(', ')}`
    return new SettingFault('operator', `'${operator}'`, expected)
  }
  const settings = checkSettings(row.settings, given)
  return settings instanceof SettingFault ? settings : { operator, settings }
}

/** The row of this name; a plan was checked before, so it is there. */
export function rowOf<Row extends AnyRow>(rows: readonly Row[], name: string): Row {
  const row = rows.find((one) => one.name === name)
  check(row !== undefined, `'${name}' is a row of the table of operators`)
  return row
}
