// What the local dispatcher costs beyond simulation, with a problem that costs nothing. Functions only; the benchmark
// runner (and `node` by way of the emitted files) calls them. No absolute time is asserted anywhere.

import { mkdtempSync, readdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { localDispatcher } from '../../coordinator/dispatch/local.js'
import type { Dispatcher } from '../../coordinator/engine/ports.js'
import { genomeBytes, genomeFromBytes } from '../../shared/encodings.js'
import { idOf } from '../../shared/ids.js'
import type { WorkItem } from '../../shared/result.js'
import { evaluate } from '../../sim/evaluate.js'
import { bundlePlugin } from '../../worker/plugin/bundle.js'
import { loadPlugin } from '../../worker/plugin/load.js'
import { createPool } from '../../worker/pool.js'

export interface DispatchFigures {
  readonly threads: number
  readonly evaluations: number
  /** Through submit() and facts(), nothing else. */
  readonly evaluationsPerSecond: number
  /** CPU of this process and of those it started, all threads, for each evaluation. */
  readonly cpuMicrosecondsPerEvaluation: number
  /** The same evaluations simulated in a plain loop. */
  readonly simulationMicrosecondsPerEvaluation: number
  /** The difference: what dispatching costs. */
  readonly overheadMicrosecondsPerEvaluation: number
  /** Milliseconds from createPool to the first thread that is ready. */
  readonly startMs: number
}

const trivial = `import { defineProblem, real } from 'skerry'
export default defineProblem({
  name: 'trivial', version: '1', summary: 'Costs nothing; only for measuring.',
  genome: { x: real({ length: 8, low: -1, high: 1 }) },
  objectives: { value: { direction: 'minimise', unit: '1' } },
  drawCondition: () => 0,
  simulate: ({ x }, situations) => situations.map(() => ({ objectives: { value: x[0] * x[0] + x[1] } })),
})`

/** Best of `rounds` measurements of the whole path through the local dispatcher. */
export async function benchDispatch(
  threads = 2,
  evaluations = 100_000,
  rounds = 3,
): Promise<DispatchFigures> {
  const folder = mkdtempSync(join(tmpdir(), 'skerry-bench-'))
  try {
    writeFileSync(join(folder, 'trivial.js'), trivial)
    const pluginFile = join(folder, 'plugin.mjs')
    writeFileSync(pluginFile, (await bundlePlugin(join(folder, 'trivial.js'))).code)
    const simulationMicros = await plainLoop(pluginFile, evaluations)
    const startedMs = performance.now()
    const dispatcher = localDispatcher((events) =>
      createPool({ pluginFile, seed: 1, sharedConditions: true, threads }, events),
    )
    await dispatcher.start()
    const startMs = performance.now() - startedMs
    try {
      let best = { seconds: Number.POSITIVE_INFINITY, cpuSeconds: Number.POSITIVE_INFINITY }
      await pass(dispatcher, Math.min(20_000, evaluations))
      for (let i = 0; i < rounds; i++) {
        const { seconds, cpuSeconds } = await pass(dispatcher, evaluations)
        best = { seconds: Math.min(best.seconds, seconds), cpuSeconds: Math.min(best.cpuSeconds, cpuSeconds) }
      }
      const cpuMicros = (best.cpuSeconds * 1e6) / evaluations
      return {
        threads,
        evaluations,
        evaluationsPerSecond: evaluations / best.seconds,
        cpuMicrosecondsPerEvaluation: cpuMicros,
        simulationMicrosecondsPerEvaluation: simulationMicros,
        overheadMicrosecondsPerEvaluation: cpuMicros - simulationMicros,
        startMs,
      }
    } finally {
      await dispatcher.close()
    }
  } finally {
    rmSync(folder, { recursive: true, force: true })
  }
}

const spec = { x: { kind: 'real', length: 8, low: -1, high: 1, scale: 'linear' } } as const
const genomes = Array.from({ length: 64 }, (_, n) =>
  genomeBytes(spec, { x: Float64Array.from({ length: 8 }, (_, i) => ((n * 8 + i) % 100) / 100) }),
)

function itemOf(evaluation: number): WorkItem {
  return {
    island: 1,
    evaluation,
    individual: idOf(1, evaluation),
    firstReplicate: 0,
    replicates: 1,
    genome: genomes[evaluation % genomes.length]!,
    expectedCost: 1,
    attempt: 1,
    purpose: 'evaluate',
    isolation: 'shared',
    avoid: [],
  }
}

/** Keeps the dispatcher as full as it wants to be until all are answered. */
async function pass(
  dispatcher: Dispatcher,
  evaluations: number,
): Promise<{ seconds: number; cpuSeconds: number }> {
  const startMs = performance.now()
  const cpuStart = cpuSecondsOfFamily()
  let submitted = 0
  let answered = 0
  while (answered < evaluations) {
    const wanted = Math.min(dispatcher.status().wanted, evaluations - submitted)
    const items: WorkItem[] = []
    for (let i = 0; i < wanted; i++) items.push(itemOf(++submitted))
    dispatcher.submit(items)
    const facts = await dispatcher.facts(1000)
    answered += facts.length
    if (facts.some(({ kind }) => kind === 'lost')) throw new Error('an evaluation was lost in a benchmark')
  }
  return { seconds: (performance.now() - startMs) / 1000, cpuSeconds: cpuSecondsOfFamily() - cpuStart }
}

/** CPU seconds of this process and its children so far (Linux; the kernel counts in hundredths of a second). */
function cpuSecondsOfFamily(): number {
  const { user, system } = process.cpuUsage()
  const children = readdirSync('/proc/self/task').flatMap((thread) =>
    readFileSync(`/proc/self/task/${thread}/children`, 'utf8').split(' ').filter(Boolean),
  )
  const childTicks = children.reduce((sum, pid) => {
    // After the name, which ends with the last parenthesis: state is field 3, user and system time 14 and 15.
    const stat = readFileSync(`/proc/${pid}/stat`, 'utf8')
    const fields = stat.slice(stat.lastIndexOf(')') + 2).split(' ')
    return sum + Number(fields[11]) + Number(fields[12])
  }, 0)
  return (user + system) / 1e6 + childTicks / 100
}

/** CPU microseconds of one evaluation without any dispatching. */
async function plainLoop(pluginFile: string, evaluations: number): Promise<number> {
  const problem = await loadPlugin({ file: pluginFile })
  const simulateAll = () => {
    for (let i = 1; i <= evaluations; i++) {
      const item = itemOf(i)
      evaluate(problem, genomeFromBytes(problem.genome, item.genome), 1, true, item.individual, 0, 1)
    }
  }
  simulateAll()
  const start = process.cpuUsage()
  simulateAll()
  const { user, system } = process.cpuUsage(start)
  return (user + system) / evaluations
}
