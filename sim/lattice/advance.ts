// Moves a lattice through time, with choke points: every `lookEverySteps` steps the whole state must be finite
// and no node may be deeper in the ground than the contact allows. What is not ends the simulation with a reason
// and a time; nothing is patched on the way. Results do not depend on how the steps are split into calls.

import { cos, sin } from '../../shared/detmath/trigonometry.js'
import type { Lattice } from './build.js'
import { addActiveForces, addPassiveForces, integrate, stride, turnRotors } from './kernel.js'

/** Steps between two choke points; also at the end of every call. */
export const lookEverySteps = 64
/** Steps between two fresh sines of the rotors: keeps the rounding of the recurrence below 1e-13. */
const freshEverySteps = 256

export interface Fault {
  readonly reason: string
  readonly seconds: number
}

/** Simulated time, s. */
export function timeSeconds(lattice: Lattice): number {
  return lattice.step * lattice.stepSeconds
}

/** Does `steps` steps; the first fault found at a choke point, or nothing. After a fault the state is worthless. */
export function advance(lattice: Lattice, steps: number): Fault | undefined {
  let left = steps
  while (left > 0) {
    const some = Math.min(left, lookEverySteps)
    for (let i = 0; i < some; i++) stepOnce(lattice)
    left -= some
    const fault = look(lattice)
    if (fault) return fault
  }
  return undefined
}

/** Forces on all nodes at this instant, added to the force fields (which are zero between steps). */
export function addForces(lattice: Lattice): void {
  const { ends, stiffnessNpm, stiffnessRestN, dampingNspm, nodes } = lattice
  addPassiveForces(lattice.passiveCount, ends, stiffnessNpm, stiffnessRestN, dampingNspm, nodes)
  if (lattice.activeCount > 0) {
    addActiveForces(
      lattice.passiveCount,
      lattice.activeCount,
      ends,
      stiffnessNpm,
      stiffnessRestN,
      dampingNspm,
      lattice.group,
      lattice.strainCos,
      lattice.strainSin,
      lattice.limitN,
      lattice.driven,
      nodes,
    )
  }
}

function stepOnce(lattice: Lattice): void {
  addForces(lattice)
  integrate(
    lattice.nodeCount,
    lattice.stepSeconds,
    lattice.inverseMass,
    lattice.gravity,
    lattice.dragNspm,
    lattice.heightsM,
    lattice.terrain,
    lattice.contact,
    lattice.friction,
    lattice.nodes,
  )
  lattice.step++
  if (lattice.rotors.length > 0) turnDrive(lattice)
}

/** The drive at the new time: rotors on, growth applied, prescribed nodes put in their place. */
function turnDrive(lattice: Lattice): void {
  const { rotors, driven, angularRadps, stepSeconds } = lattice
  const since = lattice.step - lattice.driveStartStep
  if (since < 0) return
  if (since % freshEverySteps === 0) {
    for (let g = 0; g < angularRadps.length; g++) {
      const angle = angularRadps[g]! * since * stepSeconds
      rotors[2 * g] = sin(angle)
      rotors[2 * g + 1] = cos(angle)
    }
  } else {
    turnRotors(angularRadps.length, lattice.rotation, rotors)
  }
  const grown = since >= lattice.rampSteps ? 1 : since / lattice.rampSteps
  for (let i = 0; i < rotors.length; i++) driven[i] = rotors[i]! * grown
  if (lattice.prescribed.length > 0) movePrescribed(lattice)
}

function movePrescribed({ prescribed, driven, nodes, stepSeconds }: Lattice): void {
  for (const { offset, groupAt, startM, amplitudeM, cosine, sine } of prescribed) {
    const swing = driven[groupAt]! * cosine + driven[groupAt + 1]! * sine
    for (let i = 0; i < startM.length; i++) {
      const next = startM[i]! + amplitudeM[i]! * swing
      nodes[offset + startM.length + i] = (next - nodes[offset + i]!) / stepSeconds
      nodes[offset + i] = next
    }
  }
}

/** Height of the ground under x, m; -Infinity where there is none. */
export function groundHeightM({ heightsM, terrain }: Lattice, xM: number): number {
  if (terrain[2] === Number.NEGATIVE_INFINITY) return Number.NEGATIVE_INFINITY
  const along = Math.min(Math.max((xM - terrain[0]!) * terrain[1]!, 0), heightsM.length - 1)
  const cell = Math.min(Math.floor(along), heightsM.length - 2)
  return heightsM[cell]! + (heightsM[cell + 1]! - heightsM[cell]!) * (along - cell)
}

function look(lattice: Lattice): Fault | undefined {
  const { nodes, nodeCount } = lattice
  const seconds = timeSeconds(lattice)
  for (let i = 0; i < nodeCount * stride; i++) {
    if (!Number.isFinite(nodes[i]!)) {
      return { reason: `node ${Math.floor(i / stride)} has no finite position or speed`, seconds }
    }
  }
  if (lattice.depthLimitM === Number.POSITIVE_INFINITY) return undefined
  const top = lattice.terrain[2]!
  for (let i = 0; i < nodeCount; i++) {
    const y = nodes[i * stride + 1]!
    if (y >= top) continue
    const depth = groundHeightM(lattice, nodes[i * stride]!) - y
    if (depth > lattice.depthLimitM && lattice.inverseMass[i] !== 0) {
      return { reason: `node ${i} sank ${(depth * 1000).toFixed(1)} mm into the ground`, seconds }
    }
  }
  return undefined
}
