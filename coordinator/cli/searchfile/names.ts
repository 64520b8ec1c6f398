// Names a search file takes from evolution's tables and from the problem: methods, their settings, the parts of
// the genome and the operators that fit each. Unknown ones are refused with the name that was probably meant.

import type { GenomeSpec } from '../../../shared/genome.js'
import { plainText } from '../../../shared/refusals.js'
import type { OperatorPlan } from '../../evolution/plan.js'
import { checkSettings, SettingFault } from '../../evolution/settings.js'
import type { Settings, SettingTable } from '../../evolution/types.js'
import { unknownName } from './explain.js'
import { describeValue, eitherOf, type Finding } from './finding.js'
import { nearestName } from './nearest.js'
import type { OperatorChoice, PartOperators } from './schema.js'
import type { OperatorRow, SearchTables } from './tables.js'
import { type FieldPath, fieldName, type LocatedText } from './text.js'

/** A row of a table by the name at `path`, or the finding that there is none. */
export function rowNamed<Row extends { readonly name: string }>(
  located: LocatedText,
  path: FieldPath,
  what: string,
  name: string,
  rows: readonly Row[],
): Row | Finding {
  const row = rows.find((candidate) => candidate.name === name)
  if (row) return row
  const names = rows.map((candidate) => candidate.name)
  const meant = nearestName(name, names)
  return {
    severity: 'refused',
    code: 'impossible-value',
    place: located.placeOf(path),
    field: fieldName(path),
    found: `the unknown ${what} "${plainText(name)}"`,
    expected: eitherOf(names),
    advice: meant ? `Did you mean "${meant}"?` : 'Use one of the names above.',
  }
}

/** Given settings that their table does not allow, all of them. */
export function settingFindings(
  located: LocatedText,
  path: FieldPath,
  table: SettingTable,
  given: { readonly [name: string]: unknown },
): Finding[] {
  return Object.entries(given).flatMap(([name, value]) => {
    const at = [...path, name]
    if (!Object.hasOwn(table, name))
      return unknownName({ located, path: at, what: 'setting', known: Object.keys(table) })
    const fault = checkSettings(table, { [name]: value })
    if (!(fault instanceof SettingFault)) return []
    const row = table[name]!
    const meant =
      row.kind === 'choice' && typeof value === 'string' ? nearestName(value, row.options) : undefined
    return {
      severity: 'refused',
      code: typeof value === typeof row.default ? 'impossible-value' : 'wrong-type',
      place: located.placeOf(at),
      field: fieldName(at),
      found: describeValue(value),
      expected: fault.expected,
      advice: meant ? `Did you mean "${meant}"?` : row.help,
    }
  })
}

/** Settings with defaults; only for those that settingFindings found nothing wrong with. */
export function settingsOf(
  table: SettingTable,
  given: { readonly [name: string]: unknown },
): Settings | undefined {
  const settings = checkSettings(table, given)
  return settings instanceof SettingFault ? undefined : settings
}

type Kind = 'crossover' | 'mutation'
interface PartContext {
  readonly located: LocatedText
  readonly path: FieldPath
  readonly tables: SearchTables
  readonly spec: GenomeSpec
}

/** Operators of every part: those the file names, defaults elsewhere, and what is wrong with the names. */
export function operatorsOf(
  context: PartContext,
  given: { readonly [part: string]: PartOperators },
): { readonly operators: { readonly [part: string]: OperatorPlan }; readonly findings: Finding[] } {
  const { located, path, spec } = context
  const known = Object.keys(spec)
  const findings: Finding[] = Object.keys(given)
    .filter((part) => !Object.hasOwn(spec, part))
    .map((part) => unknownName({ located, path: [...path, part], what: 'part of the genome', known }))
  const operators = Object.fromEntries(
    known.map((part) => {
      const own = Object.hasOwn(given, part) ? given[part]! : {}
      const plan = {
        crossover: operatorOf(context, part, 'crossover', own.crossover, findings),
        mutation: operatorOf(context, part, 'mutation', own.mutation, findings),
      }
      return [part, plan] as const
    }),
  )
  return { operators, findings }
}

function operatorOf(
  context: PartContext,
  part: string,
  kind: Kind,
  choice: OperatorChoice | undefined,
  findings: Finding[],
): { readonly operator: string; readonly settings: Settings } {
  const encoding = context.spec[part]!
  const rows = (kind === 'crossover' ? context.tables.crossovers : context.tables.mutations).filter((row) =>
    row.encodings.includes(encoding.kind),
  )
  const fallback = { operator: context.tables.defaultOperators(encoding)[kind], settings: {} }
  const { operator, settings } =
    choice === undefined ? fallback : typeof choice === 'string' ? { operator: choice, settings: {} } : choice
  const path = [...context.path, part, kind]
  const namePath = typeof choice === 'object' ? [...path, 'operator'] : path
  const row = rowNamed<OperatorRow>(
    context.located,
    namePath,
    `${kind} for ${encoding.kind} parts`,
    operator,
    rows,
  )
  if ('severity' in row) {
    findings.push(row)
    return { operator, settings: {} }
  }
  findings.push(...settingFindings(context.located, [...path, 'settings'], row.settings, settings))
  return { operator, settings: settingsOf(row.settings, settings) ?? {} }
}
