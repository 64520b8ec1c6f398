// `skerry demo`: a real, small search of the culvert crawler that ships with the program, in ./records/demo. It is run, stopped
// and continued like any other.

import { mkdirSync, writeFileSync } from 'node:fs'
import { join } from 'node:path'
import type { Command, CommandInput } from './command.js'
import { runAndReport, runOptionRows } from './run.js'

const folder = join('records', 'demo-files')
const record = join('records', 'demo')

/** Small enough for a minute or so on two cores: three islands that trade often. */
export const demoSearchText = `# The search that \`skerry demo\` runs. Copy it, or begin with \`skerry new DIR\`.
name: demo
problem: ./problem.js
seed: 20261201
workersExpected: 4
budget: { simulations: 10000 }
replicates: { first: 1, topUp: 1, most: 6 }
islands:
  - { count: 3, method: nsga-ii, population: 24, lookahead: 8 }
migration: { every: 60 rounds, emigrants: 2, topology: ring, lag: 1 }
control: none
`

export const demoProblemText = `export { default } from 'skerry/problems/culvert-crawler'\n`

export const demoCommand: Command = {
  name: 'demo',
  summary: 'Run a small search of the culvert crawler that comes with the program, in ./records/demo.',
  arguments: [],
  options: runOptionRows,
  examples: ['skerry demo', 'skerry demo --cores 1'],
  run,
}

async function run(input: CommandInput): Promise<number> {
  mkdirSync(folder, { recursive: true })
  writeFileSync(join(folder, 'problem.js'), demoProblemText)
  writeFileSync(join(folder, 'search.yaml'), demoSearchText)
  return runAndReport(input, join(folder, 'search.yaml'), input.texts['--record'] ?? record)
}
