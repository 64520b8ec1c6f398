// How much of the CPU of a real search goes into simulation: the demo's search of the culvert crawler, through the
// record and the local dispatcher. CPU in simulation is that of the same simulations, the second ones of confirmation
// included, in plain loops in processes that do nothing else: as many side by side as there were threads, because two
// threads of one core slow each other down.

import { readFileSync, writeFileSync } from 'node:fs'
import { join } from 'node:path'
import { demoProblemText, demoSearchText } from '../../coordinator/cli/demo.js'
import { recordFolder } from '../../coordinator/record/index.js'
import { fromHex, hex } from '../../shared/digests.js'
import { genomeFromBytes } from '../../shared/encodings.js'
import type { WorkItem } from '../../shared/result.js'
import { evaluate } from '../../sim/evaluate.js'
import { loadPlugin } from '../../worker/plugin/load.js'
import { cpuSecondsOfFamily } from './processes.js'
import { committedSimulations, openBenchSearch, type SearchText } from './search.js'

export interface CrawlerRun {
  readonly simulations: number
  /** Of all processes, from the moment the first thread was ready until the last commit. */
  readonly cpuSecondsAfterStart: number
  readonly wallSeconds: number
}

/**
 * The demo's search with another budget and seed, and further fields instead of its `control: none`. Migration is as
 * frequent, measured by the budget.
 */
export function demoSearch(simulations: number, seed: number, further = 'control: none'): SearchText {
  const demoSimulations = Number(/simulations: (\d+)/.exec(demoSearchText)?.[1])
  const search = demoSearchText
    .replace(/^seed: .*$/m, `seed: ${seed}`)
    .replace(/^budget: .*$/m, `budget: { simulations: ${simulations} }`)
    .replace(/every: (\d+) rounds/, (_, rounds) => {
      return `every: ${Math.max(1, Math.round((Number(rounds) * simulations) / demoSimulations))} rounds`
    })
    .replace(/^control: .*$/m, further)
  return { search, problem: demoProblemText }
}

const seed = 20261201
type Item = Pick<WorkItem, 'individual' | 'firstReplicate' | 'replicates'> & { readonly genome: string }
const itemsFile = (folder: string) => join(folder, 'items.json')

export async function runCrawler(options: {
  readonly folder: string
  readonly simulations: number
  readonly threads: number
}): Promise<CrawlerRun> {
  const { folder, simulations, threads } = options
  const parts = await openBenchSearch(folder, demoSearch(simulations, seed), { threads })
  const { dispatcher } = parts
  const items: Item[] = []
  const submit = dispatcher.submit.bind(dispatcher)
  dispatcher.submit = (list) => {
    for (const { individual, firstReplicate, replicates, genome } of list) {
      items.push({ individual, firstReplicate, replicates, genome: hex(genome) })
    }
    submit(list)
  }
  try {
    await dispatcher.start()
    const startMs = performance.now()
    const cpu = cpuSecondsOfFamily()
    await parts.run()
    const run = {
      simulations: committedSimulations(parts.engine),
      cpuSecondsAfterStart: cpuSecondsOfFamily() - cpu,
      wallSeconds: (performance.now() - startMs) / 1000,
    }
    writeFileSync(itemsFile(folder), JSON.stringify(items))
    return run
  } finally {
    await parts.close()
  }
}

export interface PlainLoop {
  readonly simulations: number
  readonly cpuSeconds: number
}

/** Every `step`th item that runCrawler handed out, in a plain loop. */
export async function simulateAgain(options: {
  readonly folder: string
  readonly first: number
  readonly step: number
}): Promise<PlainLoop> {
  const { folder, first, step } = options
  const problem = await loadPlugin({ file: recordFolder(join(folder, 'record')).plugin })
  const all = JSON.parse(readFileSync(itemsFile(folder), 'utf8')) as Item[]
  const items = all.filter((_, i) => i % step === first)
  const start = process.cpuUsage()
  let simulations = 0
  for (const { individual, firstReplicate, replicates, genome } of items) {
    const body = genomeFromBytes(problem.genome, fromHex(genome)!)
    evaluate(problem, body, seed, true, individual, firstReplicate, replicates)
    simulations += replicates
  }
  const { user, system } = process.cpuUsage(start)
  return { simulations, cpuSeconds: (user + system) / 1e6 }
}
