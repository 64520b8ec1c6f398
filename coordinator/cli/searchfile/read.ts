// Reads a search file in two steps: readSearchFile looks at the text alone (fields, types, names of methods and settings),
// planSearch joins it with the loaded problem into a SearchPlan. Both collect everything that is wrong; neither stops at the
// first. The caller turns findings into one refusal (finding.ts: refusalOf).

import type { GenomeSpec } from '../../../shared/genome.js'
import { firstControl } from '../../../shared/ids.js'
import type { IslandPlan, ProblemPlan, SearchPlan } from '../../evolution/plan.js'
import { explainIssues, meantAdvice, unknownName } from './explain.js'
import { type Finding, isRefused, sortFindings } from './finding.js'
import { operatorsOf, rowNamed, settingFindings, settingsOf } from './names.js'
import { impossible, methodOf, poor, populationOf, type Rule, type Subject, shareOf } from './relations.js'
import { type Control, type FieldKey, fields, type IslandGroup, type SearchFile } from './schema.js'
import type { SearchTables } from './tables.js'
import { type FieldPath, fieldName, type LocatedText, readText } from './text.js'

export interface ReadFile {
  /** The fields that were right by themselves. */
  readonly partial: Partial<SearchFile>
  /** All fields, when nothing was refused. */
  readonly file: SearchFile | undefined
  readonly findings: readonly Finding[]
  readonly located: LocatedText
}

/** Step one: what can be said without the problem. */
export function readSearchFile(text: string, tables: SearchTables): ReadFile {
  const located = readText(text)
  if (located.findings.length > 0)
    return { partial: {}, file: undefined, findings: located.findings, located }
  const { partial, findings } = readFields(located)
  findings.push(...unlike(findings, nameFindings(located, tables)))
  const sorted = sortFindings(withoutMisspelt(findings))
  return { partial, file: isRefused(sorted) ? undefined : (partial as SearchFile), findings: sorted, located }
}

/** A misspelt field is one mistake: that the right name is missing beside it needs no word. */
function withoutMisspelt(findings: readonly Finding[]): Finding[] {
  const parent = (field: string) => field.replace(/\.?[^.]*$/, '')
  const isMeant = (missing: Finding) =>
    findings.some(
      (one) =>
        one.code === 'unknown-field' &&
        parent(one.field) === parent(missing.field) &&
        one.advice === meantAdvice(missing.field.replace(/^.*\./, '')),
    )
  return findings.filter((finding) => finding.code !== 'missing-field' || !isMeant(finding))
}

/** Of `more`, those about fields that have no finding yet: what is no number needs no word about its size. */
function unlike(findings: readonly Finding[], more: readonly Finding[]): Finding[] {
  return more.filter(({ field }) => !findings.some((finding) => finding.field === field))
}

function readFields(located: LocatedText): { partial: Partial<SearchFile>; findings: Finding[] } {
  const value = located.value
  if (typeof value !== 'object' || value === null || Array.isArray(value)) {
    return { partial: {}, findings: [notAMap(located)] }
  }
  const given = value as { readonly [key: string]: unknown }
  const known = Object.keys(fields)
  const findings = Object.keys(given)
    .filter((key) => !known.includes(key))
    .map((key) => unknownName({ located, path: [key], what: 'field', known }))
  const partial: { [key: string]: unknown } = {}
  for (const [key, schema] of Object.entries(fields)) {
    const own = Object.hasOwn(given, key) ? given[key] : undefined
    const parsed = schema.safeParse(own)
    if (parsed.success) partial[key] = parsed.data
    else findings.push(...explainIssues(located, key, schema, own, parsed.error.issues))
  }
  return { partial: partial as Partial<SearchFile>, findings }
}

function notAMap(located: LocatedText): Finding {
  return {
    severity: 'refused',
    code: 'missing-field',
    place: located.placeOf([]),
    field: '',
    found: located.value === null ? 'an empty file' : 'no fields',
    expected: 'fields such as name, problem, seed, budget and islands',
    advice: '`skerry new DIR` writes a search file that runs at once.',
  }
}

/** Methods and their settings, by evolution's tables; in the raw text, so that another mistake nearby hides nothing. */
function nameFindings(located: LocatedText, tables: SearchTables): Finding[] {
  const root = mapOf(located.value)
  const control = root.control
  const controls = Array.isArray(control) ? control : [control]
  const groups = Array.isArray(root.islands) ? root.islands : []
  const look = (value: unknown, path: FieldPath, key: 'method' | 'kind'): Finding[] => {
    const { [key]: name, settings } = mapOf(value)
    if (typeof name !== 'string') return []
    const row = rowNamed(located, [...path, key], 'method', name, tables.methods)
    // A control's kind is a matter of the schema.
    if ('severity' in row) return key === 'method' ? [row] : []
    return settingFindings(located, [...path, 'settings'], row.settings, mapOf(settings))
  }
  return [
    ...groups.flatMap((group, index) => look(group, ['islands', index], 'method')),
    ...controls.flatMap((one, index) =>
      look(one, Array.isArray(control) ? ['control', index] : ['control'], 'kind'),
    ),
  ]
}

/** The fields of a map; none of anything else. */
function mapOf(value: unknown): { readonly [key: string]: unknown } {
  const isMap = typeof value === 'object' && value !== null && !Array.isArray(value)
  return isMap ? (value as { readonly [key: string]: unknown }) : {}
}

function controlsOf(partial: Partial<SearchFile>): { readonly control: Control; readonly path: FieldPath }[] {
  const control = partial.control
  if (control === undefined || control === 'none') return []
  if (!('length' in control)) return [{ control, path: ['control'] }]
  return control.map((one, index) => ({ control: one, path: ['control', index] }))
}

export interface PlannedSearch {
  /** Absent when anything was refused. */
  readonly plan: SearchPlan | undefined
  readonly findings: readonly Finding[]
}

/**
 * Step two: the checked plan, with the findings of step one among its own. Without a problem (it could not be loaded), or with a
 * file that was refused, there is no plan, but what can be said of the rest is said. `known` only serves warnings.
 */
export function planSearch(
  read: ReadFile,
  problem: ProblemPlan | undefined,
  tables: SearchTables,
  known: Pick<Subject, 'nowMs' | 'meanCost'> = {},
): PlannedSearch {
  const { file, located } = read
  const subject: Subject = {
    // Rules are asked only about fields that are there.
    file: read.partial as SearchFile,
    tables,
    casesPerReplicate: Math.max(1, problem?.cases.length ?? 1),
    objectives: problem?.objectives.length,
    ...(problem === undefined ? {} : { tokens: problem.needs?.tokens ?? {} }),
    ...known,
  }
  const related = relationFindings(located, subject, soundFields(read))
  if (!file || !problem) return { plan: undefined, findings: sortFindings([...read.findings, ...related]) }
  const { islands, controls, findings } = planIslands(located, { ...subject, file }, problem.spec)
  const all = sortFindings([...read.findings, ...findings, ...related])
  if (isRefused(all)) return { plan: undefined, findings: all }
  return { plan: assemble(file, problem, tables, islands, controls), findings: all }
}

/** Fields of the top level without a finding. */
function soundFields(read: ReadFile): Set<FieldKey> {
  const sound = new Set(Object.keys(read.partial) as FieldKey[])
  for (const { field, severity } of read.findings) {
    const root = /^[^.[]*/.exec(field)![0] as FieldKey
    if (severity === 'refused') sound.delete(root)
  }
  return sound
}

function relationFindings(located: LocatedText, subject: Subject, sound: ReadonlySet<FieldKey>): Finding[] {
  const ask = (rules: readonly Rule[], severity: Finding['severity']) =>
    rules
      .filter(({ needs }) => needs.every((field) => sound.has(field)))
      .flatMap(({ look }) => look(subject))
      .map(({ path, ...rest }): Finding => {
        return {
          severity,
          code: 'impossible-value',
          place: located.placeOf(path),
          field: fieldName(path),
          ...rest,
        }
      })
  // The other rules share out the budget island by island, which would take for ever.
  const tooMany = ask([impossible.tooManyIslands!], 'refused')
  if (tooMany.length > 0) return tooMany
  const refused = ask(Object.values(impossible), 'refused')
  // What is impossible makes the advice of the other table misleading.
  return refused.length > 0 ? refused : ask(Object.values(poor), 'warning')
}

function planIslands(located: LocatedText, subject: Subject, spec: GenomeSpec) {
  const { file, tables } = subject
  const findings: Finding[] = []
  const operators = (path: FieldPath, given: IslandGroup['operators']) => {
    const planned = operatorsOf({ located, path: [...path, 'operators'], tables, spec }, given)
    findings.push(...planned.findings)
    return planned.operators
  }
  let island = 0
  const islands = file.islands.flatMap((group, index) => {
    const planned = planGroup(tables, group, operators(['islands', index], group.operators))
    return Array.from({ length: group.count }, () => ({ ...planned, island: ++island }))
  })
  const controls = controlsOf(file).map(({ control, path }, index): IslandPlan => {
    const own = Object.keys(control.operators).length > 0
    // Otherwise the same variation as the first island: only selection is missing.
    const variation = own ? operators(path, control.operators) : islands[0]!.operators
    return { ...planControl(tables, control, islands, variation), island: firstControl + index }
  })
  return { islands, controls, findings }
}

function planGroup(
  tables: SearchTables,
  group: IslandGroup,
  operators: IslandPlan['operators'],
): Omit<IslandPlan, 'island'> {
  return {
    method: group.method,
    settings: settingsOf(methodOf(tables, group.method)!.settings, group.settings) ?? {},
    population: populationOf(tables, group),
    lookahead: group.lookahead,
    order: group.order,
    share: shareOf(group),
    operators,
  }
}

/** A control holds as many individuals and as many outstanding evaluations as all islands together, unless the file says otherwise. */
function planControl(
  tables: SearchTables,
  control: Control,
  islands: readonly IslandPlan[],
  operators: IslandPlan['operators'],
): Omit<IslandPlan, 'island'> {
  const sum = (of: (island: IslandPlan) => number) => islands.reduce((total, island) => total + of(island), 0)
  return {
    method: control.kind,
    settings: settingsOf(methodOf(tables, control.kind)!.settings, control.settings) ?? {},
    population: control.population ?? sum((island) => island.population),
    lookahead: control.lookahead ?? sum((island) => island.lookahead),
    order: islands[0]!.order,
    share: 1,
    operators,
  }
}

function assemble(
  file: SearchFile,
  problem: ProblemPlan,
  tables: SearchTables,
  islands: readonly IslandPlan[],
  controls: readonly IslandPlan[],
): SearchPlan {
  const { first, topUp, most, conditions } = file.replicates
  const { simulations, coreHours, until, target, stagnation } = file.budget
  const migration = file.migration
  return {
    name: file.name,
    seed: file.seed,
    semantics: tables.semantics,
    problem,
    islands,
    controls,
    ...(migration === undefined || migration === 'none' || islands.length < 2
      ? {}
      : { migration: migrationPlan(migration) }),
    replicates: { first, topUp, most: most ?? first, shared: conditions === 'shared' },
    budget: {
      simulations,
      ...(coreHours === undefined ? {} : { coreHours }),
      ...(until === undefined ? {} : { until }),
      ...(target === undefined ? {} : { target }),
      ...(stagnation === undefined ? {} : { stagnationRounds: stagnation }),
    },
    confirm: file.confirm,
    genomes: file.genomes,
  }
}

function migrationPlan(migration: Exclude<SearchFile['migration'], 'none' | undefined>) {
  const { every, ...rest } = migration
  return { everyRounds: every, ...rest }
}
