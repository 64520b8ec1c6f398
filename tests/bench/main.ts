// `npm run bench [names]`: measures the figures of the table (figures.ts), prints them and writes bench-results.json.
//   --list    names the figures
//   --quick   smaller and fewer rounds: to see that it runs, not for the record
// Exit code 1 when a goal was missed on a machine that had time for it.

import { mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { type Figure, figures } from './figures.js'
import { type Company, describeMachine, watchCompany } from './machine.js'
import type { Measure } from './measure.js'
import { median } from './statistics.js'
import { serveTask } from './tasks.js'

const resultsFile = 'bench-results.json'

interface Row extends Measure {
  readonly figure: string
  readonly samples: readonly number[]
  readonly best: number
  readonly median: number
  readonly takes: Figure['takes']
  /** undefined where there is no goal. */
  readonly met: boolean | undefined
  readonly remarks: readonly string[]
  readonly company: Company
  /** False when others had too much of the machine. */
  readonly trusted: boolean
}

async function measure(figure: Figure, quick: boolean): Promise<Row[]> {
  const rounds: (readonly Measure[])[] = []
  const company = watchCompany()
  const count = quick ? figure.rounds.quick : figure.rounds.full
  for (let number = 1; number <= count; number++) {
    const folder = mkdtempSync(join(tmpdir(), 'skerry-bench-'))
    const say = (sentence: string) => console.log(`  ${sentence}`)
    try {
      rounds.push(await figure.run({ quick, number, folder, say }))
    } finally {
      rmSync(folder, { recursive: true, force: true, maxRetries: 5 })
    }
    for (const one of rounds.at(-1)!)
      say(`${one.name}: ${short(one.value)} ${one.unit} (${one.remark ?? ''})`)
  }
  const watched = company()
  return rounds[0]!.map((_, at) =>
    rowOf(
      figure,
      rounds.map((round) => round[at]!),
      watched,
    ),
  )
}

function rowOf(figure: Figure, all: readonly Measure[], company: Company): Row {
  const [first] = all as readonly [Measure]
  const samples = all.map(({ value }) => value)
  const small = first.goal !== undefined && 'atMost' in first.goal
  const best = small ? Math.min(...samples) : Math.max(...samples)
  const middle = median(samples)
  const value = figure.takes === 'best' ? best : middle
  return {
    ...first,
    figure: figure.name,
    value,
    samples,
    best,
    median: middle,
    takes: figure.takes,
    met: first.goal === undefined ? undefined : isMet(first.goal, value),
    remarks: all.map(({ remark }) => remark ?? ''),
    company,
    trusted: !(figure.dependsOnTime && company.tooBusy),
  }
}

function isMet(goal: NonNullable<Measure['goal']>, value: number): boolean {
  return 'atMost' in goal ? value <= goal.atMost : value >= goal.atLeast
}

const short = (value: number) =>
  Math.abs(value) >= 1000 ? Math.round(value).toLocaleString('en') : String(Number(value.toPrecision(4)))

function goalText({ goal, unit }: Measure): string {
  if (goal === undefined) return '-'
  return `${'atMost' in goal ? '<=' : '>='} ${short('atMost' in goal ? goal.atMost : goal.atLeast)} ${unit}`
}

function printTable(rows: readonly Row[]): void {
  const cells = rows.map((row) => [
    row.name,
    `${short(row.value)} ${row.unit}`,
    goalText(row),
    row.met === undefined ? '-' : row.met ? 'met' : 'missed',
    row.samples.length === 1
      ? 'one round'
      : `${row.takes} of ${row.samples.length}: ${short(Math.min(...row.samples))} to ${short(Math.max(...row.samples))}`,
    row.trusted ? '' : `not to be trusted: others used ${row.company.coresOfOthers} cores`,
  ])
  const table = [['figure', 'result', 'goal', '', 'spread', ''], ...cells]
  const widths = table[0]!.map((_, at) => Math.max(...table.map((line) => line[at]!.length)))
  console.log('')
  for (const line of table)
    console.log(
      line
        .map((cell, at) => cell.padEnd(widths[at]!))
        .join('  ')
        .trimEnd(),
    )
}

async function main(words: readonly string[]): Promise<number> {
  const quick = words.includes('--quick')
  const names = words.filter((word) => !word.startsWith('--'))
  const unknown = [
    ...names.filter((name) => !figures.some((figure) => figure.name === name)),
    ...words.filter((word) => word.startsWith('--') && word !== '--quick' && word !== '--list'),
  ]
  if (words.includes('--list') || unknown.length > 0) {
    for (const word of unknown) console.error(`There is no figure and no option ${word}. The figures are:`)
    for (const { name, what } of figures) console.log(`${name.padEnd(14)} ${what}`)
    return unknown.length > 0 ? 64 : 0
  }
  const machine = describeMachine()
  const { cpu, cores, memoryGigabytes, system, node } = machine
  console.log(`${cpu}, ${cores} cores, ${memoryGigabytes} GB, ${system}, Node ${node}`)
  const rows: Row[] = []
  const startedAt = new Date().toISOString()
  for (const figure of figures.filter(({ name }) => names.length === 0 || names.includes(name))) {
    console.log(`${figure.name}: ${figure.what}`)
    rows.push(...(await measure(figure, quick)))
    writeFileSync(
      resultsFile,
      `${JSON.stringify({ startedAt, machine, quick, figures: rows }, undefined, 2)}\n`,
    )
  }
  printTable(rows)
  console.log(`\nwritten to ${resultsFile}${quick ? '; --quick is for seeing that it runs' : ''}`)
  return rows.some(({ met, trusted }) => met === false && trusted) ? 1 : 0
}

const words = process.argv.slice(2)
if (words[0] === '--task') serveTask(words[1] ?? '')
else process.exitCode = await main(words)
