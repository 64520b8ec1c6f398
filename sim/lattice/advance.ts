// Moves a lattice through time, with choke points: every `lookEverySteps` steps the whole state must be finite
// and no node may be deeper in the ground than the contact allows. What is not ends the simulation with a reason
// and a time; nothing is patched on the way. Results do not depend on how the steps are split into calls.
//
// This is the reference in plain TypeScript; the WebAssembly kernel (lanes.ts) gives the same bits.

import { groundHeightM } from './ground.js'
import { type Lattice, lookEverySteps } from './layout.js'
import { addForcesPlane, runPlane } from './reference/plane.js'
import { addForcesSpace, runSpace } from './reference/space.js'

export { groundHeightM } from './ground.js'

export interface Fault {
  readonly reason: string
  readonly seconds: number
}

/** Simulated time, s. */
export function timeSeconds(lattice: Lattice): number {
  return lattice.step * lattice.stepSeconds
}

/** Something to do on the way: after every `everySteps` steps, counted from the start of the call. */
export interface OnTheWay {
  readonly everySteps: number
  readonly take: (lattice: Lattice) => void
}

/** Does `steps` steps; the first fault found at a choke point, or nothing. After a fault the state is worthless. */
export function advance(lattice: Lattice, steps: number, onTheWay?: OnTheWay): Fault | undefined {
  let left = steps
  let untilLook = lookEverySteps
  let untilTake = onTheWay?.everySteps ?? steps + 1
  while (left > 0) {
    const some = Math.min(left, untilLook, untilTake)
    if (lattice.dimensions === 2) runPlane(lattice, some)
    else runSpace(lattice, some)
    left -= some
    untilLook -= some
    untilTake -= some
    if (onTheWay && untilTake === 0) {
      onTheWay.take(lattice)
      untilTake = onTheWay.everySteps
    }
    if (untilLook > 0 && left > 0) continue
    const fault = look(lattice)
    if (fault) return fault
    untilLook = lookEverySteps
  }
  return undefined
}

/**
 * Forces on all nodes at this instant, added to the force fields (which are zero between steps): all but node drag,
 * contact and friction, which belong to the integration.
 */
export function addForces(lattice: Lattice): void {
  if (lattice.dimensions === 2) addForcesPlane(lattice)
  else addForcesSpace(lattice)
}

/** The choke point: the first fault of the state as it is, or nothing. */
export function look(lattice: Lattice): Fault | undefined {
  const { nodes, nodeCount, stride, dimensions, inverseMass } = lattice
  const seconds = timeSeconds(lattice)
  for (let i = 0; i < nodeCount * stride; i++) {
    if (!Number.isFinite(nodes[i]!)) {
      return { reason: `node ${Math.floor(i / stride)} has no finite position or speed`, seconds }
    }
  }
  if (lattice.depthLimitM === Number.POSITIVE_INFINITY) return undefined
  const top = lattice.terrain[2]!
  for (let i = 0; i < nodeCount; i++) {
    const o = i * stride
    if (nodes[o + 1]! >= top || inverseMass[i] === 0) continue
    const depth = groundHeightM(lattice, nodes[o]!, dimensions === 3 ? nodes[o + 2]! : 0) - nodes[o + 1]!
    if (depth > lattice.depthLimitM) {
      return { reason: `node ${i} sank ${(depth * 1000).toFixed(1)} mm into the ground`, seconds }
    }
  }
  return undefined
}
