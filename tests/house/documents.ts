// The tables of README.md and DEVELOPERS.md are made from the tables in the code, between two marks, so that the
// documents name everything that exists and nothing else. `npm run docs` writes them; the test compares.

import { readFileSync, writeFileSync } from 'node:fs'
import { join } from 'node:path'
import { changeTable } from '../../coordinator/cli/searchfile/changes.js'
import { commands } from '../../coordinator/cli/table.js'
import { methods } from '../../coordinator/evolution/methods/index.js'
import { crossoverRows, mutationRows, operatorDefaults } from '../../coordinator/evolution/operators/index.js'
import type { SettingRow, SettingTable } from '../../coordinator/evolution/types.js'
import { exactnessRules } from '../../shared/exactness.js'
import { actuatorClasses } from '../../shared/making/actuators.js'
import { hazards } from '../../shared/making/hazards.js'
import type { ActuatorClass } from '../../shared/making/types.js'
import { exitCodes, refusals } from '../../shared/refusals.js'
import { phases } from '../tools/phases.mjs'
import { root } from './source.js'

/** One generated table: its document, its mark, its head and its rows. */
export interface DocumentTable {
  readonly file: 'README.md' | 'DEVELOPERS.md'
  readonly mark: string
  readonly head: readonly string[]
  readonly rows: readonly (readonly string[])[]
}

const code = (text: string | number) => `\`${text}\``

function rangeOf(row: SettingRow): string {
  if (row.kind === 'choice') return `${code(row.default)}; one of ${row.options.map(code).join(', ')}`
  return `${code(row.default)}; ${row.kind === 'integer' ? 'whole, ' : ''}${row.low} to ${row.high}`
}

function settingRows(owner: string, settings: SettingTable): string[][] {
  return Object.entries(settings).map(([name, row]) => [code(owner), code(name), rangeOf(row), row.help])
}

const exitCodeMeanings: { readonly [name in keyof typeof exitCodes]: string } = {
  done: 'done',
  usage: 'the command line was not understood',
  badData: 'stored data are damaged or do not agree',
  unreachable: 'workers or a service cannot be reached',
  brokenPromise: 'a defect of Skerry itself',
  inputOutput: 'the disk is full, cannot be written, or failed',
  interrupted: 'stopped before the end: run the same command again',
  protocol: 'written or sent by another version',
  notPermitted: 'somebody else holds the record, or access is refused',
  configuration: 'the search file, the problem or a path must be mended first',
}

const operatorRows = (kind: 'crossover' | 'mutation', rows: typeof crossoverRows | typeof mutationRows) =>
  rows.map((row) => {
    const usual = row.encodings.filter((encoding) => operatorDefaults[encoding][kind] === row.name)
    const fits = row.encodings.map((encoding) => (usual.includes(encoding) ? `**${encoding}**` : encoding))
    return [code(row.name), kind, fits.join(', '), row.summary]
  })

function actuatorRow(row: ActuatorClass): string[] {
  const units = row.motion === 'linear' ? ['N', 'of the length', '1/s', 'W/m'] : ['N m', 'rad', 'rad/s', 'W']
  const limits = [row.forceMost, row.strokeMost, row.rateMostPerSecond, row.powerMost].map((limit, i) =>
    limit === undefined ? 'unlimited' : `${Number(limit.toPrecision(3))} ${units[i]}`,
  )
  return [row.name, ...limits, row.source]
}

export const documentTables: readonly DocumentTable[] = [
  {
    file: 'README.md',
    mark: 'commands',
    head: ['command', 'does'],
    rows: commands.map((command) => [
      code(['skerry', command.name, ...command.arguments.map((argument) => argument.name)].join(' ')),
      command.summary,
    ]),
  },
  {
    file: 'README.md',
    mark: 'methods',
    head: ['method', 'does', 'objectives', 'pace', 'source'],
    rows: methods.map((row) => [code(row.name), row.summary, row.objectives, row.pace, row.source]),
  },
  {
    file: 'README.md',
    mark: 'operators',
    head: ['operator', 'kind', 'encodings', 'does'],
    rows: [...operatorRows('crossover', crossoverRows), ...operatorRows('mutation', mutationRows)],
  },
  {
    file: 'README.md',
    mark: 'settings',
    head: ['of', 'setting', 'default and range', 'meaning'],
    rows: [...methods, ...crossoverRows, ...mutationRows].flatMap((row) =>
      settingRows(row.name, row.settings),
    ),
  },
  {
    file: 'README.md',
    mark: 'changes',
    head: ['field', 'edited during a search', 'because'],
    rows: Object.entries(changeTable).map(([field, { kind, because }]) => [code(field), kind, because]),
  },
  {
    file: 'README.md',
    mark: 'exit codes',
    head: ['exit code', 'meaning'],
    rows: Object.entries(exitCodes).map(([name, number]) => [
      code(number),
      exitCodeMeanings[name as keyof typeof exitCodes],
    ]),
  },
  {
    file: 'DEVELOPERS.md',
    mark: 'refusals',
    head: ['code', 'exit code', 'what people read'],
    rows: Object.entries(refusals).map(([name, row]) => [
      code(name),
      String(row.exitCode),
      `${row.text}. ${row.cure}`,
    ]),
  },
  {
    file: 'DEVELOPERS.md',
    mark: 'sources',
    head: ['method or operator', 'source'],
    rows: [...methods, ...crossoverRows, ...mutationRows].map((row) => [code(row.name), row.source]),
  },
  {
    file: 'DEVELOPERS.md',
    mark: 'hazards',
    head: ['hazard', 'caution begins where', 'source of the bound'],
    rows: hazards.map((row) => [row.hazard, row.when.text, row.source]),
  },
  {
    file: 'DEVELOPERS.md',
    mark: 'actuators',
    head: ['actuator class', 'force', 'stroke either way', 'rate', 'power', 'source'],
    rows: Object.values<ActuatorClass>(actuatorClasses).map(actuatorRow),
  },
  {
    file: 'DEVELOPERS.md',
    mark: 'exactness',
    head: ['exactness', 'votes', 'digests', '`rederive --resimulate`'],
    rows: Object.entries(exactnessRules).map(([name, rule]) => [
      code(name),
      rule.votes,
      rule.digests,
      rule.resimulate,
    ]),
  },
  {
    file: 'DEVELOPERS.md',
    mark: 'phases',
    head: ['phase', 'what it runs'],
    rows: phases.map((phase) => [code(phase.name), phase.says]),
  },
]

function line(cells: readonly string[]): string {
  return `| ${cells.map((cell) => cell.replaceAll('|', '\\|').replaceAll('\n', ' ')).join(' | ')} |`
}

export function renderTable(table: DocumentTable): string {
  return [line(table.head), line(table.head.map(() => '---')), ...table.rows.map(line)].join('\n')
}

/** The text between the marks of a table; undefined when the document has no such marks. */
export function tableIn(text: string, mark: string): string | undefined {
  const [begin, end] = marksOf(mark)
  const from = text.indexOf(begin)
  const to = text.indexOf(end)
  return from < 0 || to < from ? undefined : text.slice(from + begin.length, to).trim()
}

const marksOf = (mark: string): [string, string] => [
  `<!-- from the code: ${mark}; npm run docs -->`,
  `<!-- end: ${mark} -->`,
]

export function readDocument(file: string): string {
  return readFileSync(join(root, file), 'utf8')
}

/** Writes every table into its document. */
export function writeTables(): void {
  for (const table of documentTables) {
    const text = readDocument(table.file)
    const [begin, end] = marksOf(table.mark)
    const from = text.indexOf(begin)
    const to = text.indexOf(end)
    if (from < 0 || to < from) throw new Error(`${table.file} lacks the lines ${begin} and ${end}`)
    const filled = `${text.slice(0, from)}${begin}\n\n${renderTable(table)}\n\n${text.slice(to)}`
    writeFileSync(join(root, table.file), filled)
  }
}
