// How much of the CPU of a real search goes into simulation: the culvert crawler with a population, a lookahead and
// replicates as a search of weeks has them, through the record and the local dispatcher. CPU in simulation is what the
// threads tell of it, confirmations included. A third of the run is let pass first: starting processes and compiling
// are over by then, and a search of weeks has them once. (The same simulations in plain loops beside it would be no
// better measure: compiled anew in each process, one loop takes up to 1.4 times as long as another.)

import { demoProblemText, demoSearchText } from '../../coordinator/cli/demo.js'
import { cpuSecondsOfFamily } from './processes.js'
import { committedSimulations, openBenchSearch, type SearchText } from './search.js'

/** CPU seconds of one stretch of a run. */
export interface CpuPart {
  readonly simulationSeconds: number
  /** Of all processes. */
  readonly allSeconds: number
}

export interface CrawlerRun {
  readonly simulations: number
  /** From the moment the first thread was ready. */
  readonly whole: CpuPart
  /** After a third of the simulations. */
  readonly later: CpuPart
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

function longSearch(simulations: number): SearchText {
  const { search, problem } = demoSearch(simulations, seed)
  return {
    problem,
    search: search
      .replace(/^replicates: .*$/m, 'replicates: { first: 4, topUp: 4, most: 16 }')
      .replace(/population: \d+, lookahead: \d+/, 'population: 60, lookahead: 24'),
  }
}

export async function runCrawler(options: {
  readonly folder: string
  readonly simulations: number
  readonly threads: number
}): Promise<CrawlerRun> {
  const { folder, simulations, threads } = options
  const parts = await openBenchSearch(folder, longSearch(simulations), { threads })
  const { dispatcher } = parts
  let simulationSeconds = 0
  const facts = dispatcher.facts.bind(dispatcher)
  dispatcher.facts = async (waitMs) => {
    const list = await facts(waitMs)
    for (const fact of list) if (fact.kind === 'result') simulationSeconds += fact.cpuSeconds
    return list
  }
  try {
    await dispatcher.start()
    const now = (): CpuPart => ({ simulationSeconds, allSeconds: cpuSecondsOfFamily() })
    const start = now()
    let third: CpuPart | undefined
    await parts.run(() => {
      if (third === undefined && committedSimulations(parts.engine) >= simulations / 3) third = now()
    })
    const end = now()
    return {
      simulations: committedSimulations(parts.engine),
      whole: between(start, end),
      later: between(third ?? start, end),
    }
  } finally {
    await parts.close()
  }
}

function between(start: CpuPart, end: CpuPart): CpuPart {
  return {
    simulationSeconds: end.simulationSeconds - start.simulationSeconds,
    allSeconds: end.allSeconds - start.allSeconds,
  }
}
