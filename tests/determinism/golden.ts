// The golden simulations: a table of small computations, each reduced to one digest. The default export computes all of
// them, so that this file bundled as a plug-in is one module that runs on every engine and needs nothing of it
// (module.ts). What they must give is in digests.ts.

import type { AnyProblem } from '../../shared/problem.js'
import { asProblem } from '../../sim/problem.js'
import crawler from '../../sim/problems/culvert-crawler/index.js'
import crawler3d from '../../sim/problems/culvert-crawler-3d/index.js'
import mount from '../../sim/problems/pump-mount/index.js'
import walker from '../../sim/problems/ramp-walker/index.js'
import rake from '../../sim/problems/screen-rake/index.js'
import pad from '../../sim/problems/seal-pad/index.js'
import { library as library3d } from '../../sim/rigid/rigid3d.js'
import { controllerNumbers } from './controllers.js'
import { lanesNumbers, referenceNumbers } from './lattices.js'
import { evaluationNumbers } from './machines.js'
import { functionNumbers, modesNumbers, signalNumbers } from './measures.js'
import { digestOf } from './numbers.js'
import { heapNumbers } from './rigid.js'

/** Name of a golden simulation: its digest. */
export interface Digests {
  readonly [name: string]: string
}

/**
 * Problem, number of the founder (chosen because it does not fail), replicates. Every row's name ends with the
 * problem's version: whoever changes results gives a new one.
 */
export const machines: readonly (readonly [problem: AnyProblem, founder: number, replicates: number])[] = [
  [asProblem(crawler), 0, 4],
  [asProblem(crawler3d), 2, 1],
  [asProblem(mount), 2, 1],
  [asProblem(pad), 7, 1],
  [asProblem(walker), 12, 1],
  [asProblem(rake), 2, 1],
]

const simulations: readonly (readonly [name: string, numbers: () => number[]])[] = [
  ['functions', functionNumbers],
  ['signal', signalNumbers],
  ['modes', modesNumbers],
  ['lattices, plane, reference', () => referenceNumbers(2, 4)],
  ['lattices, plane, 4 lanes', () => lanesNumbers(2, 4, 'double')],
  ['lattices, plane, 1 lane', () => lanesNumbers(2, 1, 'double')],
  ['lattices, plane, 8 single lanes', () => lanesNumbers(2, 8, 'single')],
  ['lattices, space, reference', () => referenceNumbers(3, 4)],
  ['lattices, space, 4 lanes', () => lanesNumbers(3, 4, 'double')],
  ['lattices, space, 2 lanes', () => lanesNumbers(3, 2, 'double')],
  ['lattices, space, 8 single lanes', () => lanesNumbers(3, 8, 'single')],
  ['controllers', controllerNumbers],
  [`heap ${library3d}`, heapNumbers],
  ...machines.map(([problem, founder, replicates]) => {
    const name = `${problem.name} ${problem.version}`
    return [name, () => evaluationNumbers(problem, founder, replicates)] as const
  }),
]

/** Computes every golden simulation, in order. `say` hears each name before its work begins. */
export default function computeGolden(say: (name: string) => void = () => {}): Digests {
  const digests: { [name: string]: string } = {}
  for (const [name, numbers] of simulations) {
    say(name)
    digests[name] = digestOf(numbers())
  }
  return digests
}
