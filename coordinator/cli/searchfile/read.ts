// Reads a search file in two steps: readSearchFile looks at the text alone (fields, types, names of methods and settings),
// planSearch joins it with the loaded problem into a SearchPlan. Both collect everything that is wrong; neither stops at the
// first. The caller turns findings into one refusal (finding.ts: refusalOf).

import type { GenomeSpec } from '../../../shared/genome.js'
import { firstControl } from '../../../shared/ids.js'
import type { IslandPlan, ProblemPlan, SearchPlan } from '../../evolution/plan.js'
import { explainIssues, unknownName } from './explain.js'
import { type Finding, isRefused, sortFindings } from './finding.js'
import { operatorsOf, rowNamed, settingFindings, settingsOf } from './names.js'
import {
  type Complaint,
  impossible,
  methodOf,
  poor,
  populationOf,
  type Subject,
  shareOf,
} from './relations.js'
import { type Control, fields, type IslandGroup, type SearchFile } from './schema.js'
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
  findings.push(...nameFindings(located, partial, tables))
  const sorted = sortFindings(findings)
  return { partial, file: isRefused(sorted) ? undefined : (partial as SearchFile), findings: sorted, located }
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

/** Methods and their settings, by evolution's tables. */
function nameFindings(located: LocatedText, partial: Partial<SearchFile>, tables: SearchTables): Finding[] {
  const of = (path: FieldPath, name: string, settings: object) => {
    const row = rowNamed(located, [...path, 'method'], 'method', name, tables.methods)
    if ('severity' in row) return [row]
    return settingFindings(located, [...path, 'settings'], row.settings, { ...settings })
  }
  const islands = partial.islands ?? []
  const controls = controlsOf(partial)
  return [
    ...islands.flatMap((group, index) => of(['islands', index], group.method, group.settings)),
    ...controls.flatMap(({ control, path }) => of(path, control.kind, control.settings)),
  ]
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

/** Step two: the checked plan, with the findings of step one in it. `nowMs` only serves the warning about a date that is past. */
export function planSearch(
  read: ReadFile,
  problem: ProblemPlan,
  tables: SearchTables,
  nowMs?: number,
): PlannedSearch {
  const file = read.file
  if (!file) return { plan: undefined, findings: read.findings }
  const subject: Subject = {
    file,
    tables,
    casesPerReplicate: Math.max(1, problem.cases.length),
    objectives: problem.objectives.length,
    ...(nowMs === undefined ? {} : { nowMs }),
  }
  const related = relationFindings(read.located, subject)
  const { islands, controls, findings } = planIslands(read.located, subject, problem.spec)
  const all = sortFindings([...read.findings, ...findings, ...related])
  if (isRefused(all)) return { plan: undefined, findings: all }
  return { plan: assemble(file, problem, tables, islands, controls), findings: all }
}

function relationFindings(located: LocatedText, subject: Subject): Finding[] {
  const finding = (severity: Finding['severity'], { path, ...rest }: Complaint): Finding => ({
    severity,
    code: 'impossible-value',
    place: located.placeOf(path),
    field: fieldName(path),
    ...rest,
  })
  const tooMany = impossible.tooManyIslands!(subject)
  // The other rules share out the budget island by island, which would take for ever.
  if (tooMany.length > 0) return tooMany.map((one) => finding('refused', one))
  const refused = Object.values(impossible).flatMap((rule) =>
    rule(subject).map((one) => finding('refused', one)),
  )
  // What is impossible makes the advice of the other table misleading.
  if (refused.length > 0) return refused
  return Object.values(poor).flatMap((rule) => rule(subject).map((one) => finding('warning', one)))
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
