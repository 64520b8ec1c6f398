// One item simulated and measured; the same in a thread and in a child process.

import { resultDigest } from '../shared/digests.js'
import { genomeFromBytes } from '../shared/encodings.js'
import type { AnyProblem } from '../shared/problem.js'
import type { WorkItem } from '../shared/result.js'
import { evaluate } from '../sim/evaluate.js'
import { wallSeconds } from './cpu.js'
import { importPlugin } from './plugin/import.js'
import type { Simulated, SimulatorSettings } from './wire.js'

export type Simulator = (
  item: Pick<WorkItem, 'individual' | 'firstReplicate' | 'replicates' | 'genome'>,
) => Omit<Simulated, 'cpuSeconds'>

/**
 * Loads the pinned bundle, which the coordinator has checked before. Throws what importPlugin throws.
 */
export async function createSimulator(settings: SimulatorSettings): Promise<Simulator> {
  const problem = (await importPlugin({ file: settings.pluginFile })) as AnyProblem
  return ({ individual, firstReplicate, replicates, genome }) => {
    const wallStart = wallSeconds()
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
    return { result, digest, wallSeconds: wallSeconds() - wallStart }
  }
}
