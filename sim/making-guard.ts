// What cannot be made is not simulated: it fails with the part and the rule that forbid it. Bundled with the
// plug-in, so that the rules of a pinned problem stay those it was started with.

import type { Genome } from '../shared/genome.js'
import { makingFaults, makingFaultText } from '../shared/making/makeability.js'
import type { Parts, Process } from '../shared/making/types.js'
import type { FailedSimulation } from '../shared/problem.js'

/** Why a genome cannot be made, as the outcome of its simulation; nothing when it can or nothing is declared. */
export function unmakeable<G extends Genome>(
  problem: { readonly process?: Process | undefined; readonly parts?: ((genome: G) => Parts) | undefined },
  genome: G,
): FailedSimulation | undefined {
  if (problem.process === undefined || problem.parts === undefined) return undefined
  const faults = makingFaults(problem.process, problem.parts(genome))
  if (faults.length === 0) return undefined
  const more = faults.length > 1 ? ` (and ${faults.length - 1} more)` : ''
  return { failed: `cannot be made: ${makingFaultText(faults[0]!)}${more}` }
}
