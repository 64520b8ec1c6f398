// One item simulated and measured; the same in a thread and in a child process.

import { resultDigest } from '../shared/digests.js'
import { genomeFromBytes } from '../shared/encodings.js'
import type { AnyProblem } from '../shared/problem.js'
import type { WorkItem } from '../shared/result.js'
import { evaluate } from '../sim/evaluate.js'
import { importPlugin } from './plugin/import.js'
import type { Simulated, SimulatorSettings } from './wire.js'

export type Simulator = (
  item: Pick<WorkItem, 'individual' | 'firstReplicate' | 'replicates' | 'genome'>,
) => Simulated

/** Seconds of CPU so far, of whatever runs this code. */
export type CpuClock = () => number

/**
 * Loads the pinned bundle, which the coordinator has checked before. Throws what importPlugin throws.
 */
export async function createSimulator(settings: SimulatorSettings, cpuSeconds: CpuClock): Promise<Simulator> {
  const problem = (await importPlugin({ file: settings.pluginFile })) as AnyProblem
  return ({ individual, firstReplicate, replicates, genome }) => {
    const wallStart = wallSeconds()
    const cpuStart = cpuSeconds()
    const result = evaluate(
      problem,
      genomeFromBytes(problem.genome, genome),
      settings.seed,
      settings.sharedConditions,
      individual,
      firstReplicate,
      replicates,
    )
    const digest = resultDigest(result)
    return { result, digest, cpuSeconds: cpuSeconds() - cpuStart, wallSeconds: wallSeconds() - wallStart }
  }
}

// Taken when this file loads, before any plug-in could put another in its place.
const monotonic = performance.now.bind(performance)

export function wallSeconds(): number {
  return monotonic() / 1000
}

/**
 * CPU seconds of this thread where Node can tell (process.threadCpuUsage, Node 23.9 and later). Older versions only
 * know the whole process; there it is wall time inside the thread, which is too much when there are more busy threads
 * than cores.
 */
export function threadCpuSeconds(): number {
  const threads = process as { readonly threadCpuUsage?: () => NodeJS.CpuUsage }
  const usage = threads.threadCpuUsage?.()
  return usage === undefined ? wallSeconds() : (usage.user + usage.system) / 1e6
}

/** CPU seconds of this process. */
export function processCpuSeconds(): number {
  const { user, system } = process.cpuUsage()
  return (user + system) / 1e6
}
