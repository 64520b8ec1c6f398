// The whole path at full speed: islands, engine, durable record, local dispatcher, threads, with a problem that costs
// nothing. One process a measurement; its resident memory is noted on the way.

import { cpuSecondsOfFamily } from './processes.js'
import { committedSimulations, openBenchSearch, type SearchParts, type SearchText } from './search.js'

export interface WholePathOptions {
  readonly folder: string
  readonly evaluations: number
  /** The budget of the search; more than `evaluations` where the record is to be continued. */
  readonly budget: number
  readonly threads: number
  /** Evaluations between two readings of the resident memory. */
  readonly sampleEvery: number
  /** Goes on when the figures are told, so that whoever hears them can kill it at work. */
  readonly goesOn: boolean
}

export interface WholePath {
  readonly evaluations: number
  readonly seconds: number
  readonly evaluationsPerSecond: number
  readonly coordinatorCpuMicroseconds: number
  readonly allCpuMicroseconds: number
  readonly confirmations: number
  readonly appends: number
  readonly memory: readonly MemoryReading[]
}
export interface MemoryReading {
  readonly evaluations: number
  readonly residentBytes: number
  /** What the heap held just after a collection; only at the first reading and the last, because collecting disturbs. */
  readonly liveBytes: number | undefined
}

const islands = 8
const lookahead = 1024

/** Bits, because the cheapest genome leaves the most of the time to what is measured. */
export function trivialSearch(budget: number): SearchText {
  return {
    search: `name: bench
problem: ./problem.js
seed: 1
budget: { simulations: ${budget} }
replicates: { first: 1, topUp: 0, most: 1 }
islands:
  - { count: ${islands}, method: steady-state, population: 200, lookahead: ${lookahead} }
migration: { every: 20 rounds, emigrants: 2, topology: ring, lag: 1 }
control: none
genomes: none
`,
    problem: `import { bits, defineProblem } from 'skerry'
export default defineProblem({
  name: 'trivial', version: '1', summary: 'Costs nothing; only for measuring.',
  genome: { x: bits({ length: 16 }) },
  objectives: { ones: { direction: 'maximise', unit: '1' } },
  drawCondition: () => 0,
  simulate: ({ x }, situations) => situations.map(() => ({ objectives: { ones: x.reduce((a, b) => a + b, 0) } })),
})
`,
  }
}

/** Runs to `evaluations` or a little beyond; the record stays. */
export async function runWholePath(options: WholePathOptions): Promise<WholePath> {
  const { folder, evaluations, budget, threads, sampleEvery } = options
  const parts = await openBenchSearch(folder, trivialSearch(budget), { threads })
  await parts.dispatcher.start()
  const memory: MemoryReading[] = []
  const figures = stopwatch(parts, memory)
  const enough = new AbortController()
  let next = sampleEvery
  const reached = new Promise<WholePath>((resolve, reject) => {
    const onStep = () => {
      const done = committedSimulations(parts.engine)
      if (done >= next) {
        memory.push(readMemory(done, memory.length === 0 || done >= evaluations))
        next += sampleEvery
      }
      if (done < evaluations || enough.signal.aborted) return
      resolve(figures())
      if (!options.goesOn) enough.abort()
    }
    parts.run(onStep, enough.signal).then(() => parts.close(), reject)
  })
  return reached
}

function readMemory(evaluations: number, collects: boolean): MemoryReading {
  const residentBytes = process.memoryUsage.rss()
  if (collects) globalThis.gc?.()
  return { evaluations, residentBytes, liveBytes: collects ? process.memoryUsage().heapUsed : undefined }
}

/** Starts now; the function returned reads it. */
function stopwatch({ engine, record }: SearchParts, memory: readonly MemoryReading[]): () => WholePath {
  const startMs = performance.now()
  const own = process.cpuUsage()
  const family = cpuSecondsOfFamily()
  return () => {
    const seconds = (performance.now() - startMs) / 1000
    const { user, system } = process.cpuUsage(own)
    const evaluations = committedSimulations(engine)
    return {
      evaluations,
      seconds,
      evaluationsPerSecond: evaluations / seconds,
      coordinatorCpuMicroseconds: (user + system) / evaluations,
      allCpuMicroseconds: ((cpuSecondsOfFamily() - family) * 1e6) / evaluations,
      confirmations: engine.counts.confirmations,
      appends: record.reader.totals().appends,
      memory,
    }
  }
}
