// Trials of one body under several conditions: settle, drive for 8 s, measure. The body settles first (drives still,
// some drag), so that nothing is measured that was stored before the start; then the drag is off and distance
// counts from where the puck stands.
//
// Conditions run side by side in the lanes of the lattice kernel, and are sampled there. followTrial() does the same on
// the reference simulator, one condition at a time and bit for bit the same, for replays and checks.

import { actuatorClasses } from '../../../shared/making/actuators.js'
import { advance, type Fault, look } from '../../lattice/advance.js'
import { buildLattice } from '../../lattice/build.js'
import {
  advanceLanes,
  type Lanes,
  lanePlaceM,
  lanePlaces,
  laneStrutBeyond,
  lanesMost,
  laneTally,
  packLanes,
  releaseLanes,
} from '../../lattice/lanes.js'
import type { Lattice } from '../../lattice/layout.js'
import { latticePlaces } from '../../lattice/places.js'
import type {
  ActuatorSpec,
  FrictionSpec,
  GroundSpec,
  LatticeSpec,
  NodeSpec,
  StrutSpec,
} from '../../lattice/spec.js'
import { chooseStep, stepBound } from '../../lattice/stability.js'
import { newTally, strutBeyond, type Tally, takeSample } from '../../lattice/tally.js'
import { varyLattice } from '../../lattice/vary.js'
import { bayFault, collapsedBay, strutFault, type Watch, watchOf } from './collapse.js'
import type { Foot, Machine } from './machine.js'
import { numbers } from './numbers.js'

/** What is drawn for one simulation, besides the ground. */
export interface Surroundings {
  /** Coefficient of friction of bare rubber on this floor. */
  readonly floorFriction: number
  /** Time constant of the actuators' first-order lag, s. */
  readonly lagSeconds: number
}

/** The floors that a crawler may meet. */
export interface World<Condition extends Surroundings> {
  readonly groundOf: (condition: Condition) => GroundSpec
  /** A ground as steep as any of them, for the choice of the step: a body has one step whatever it meets. */
  readonly steepest: GroundSpec
  /** Its slope. */
  readonly slopeMost: number
}

export const frameSeconds = 1 / numbers.framesPerSecond
export const framesPerTrial = numbers.trialSeconds * numbers.framesPerSecond

export const contactSpec = {
  stiffness: numbers.contactNpm,
  damping: numbers.contactNspm2,
  exponent: 1,
  depthLimitM: numbers.depthLimitM,
} as const

export type MachineSpec = LatticeSpec & { readonly stepSeconds: number }

/** The body on the steepest floor as a description for the lattice simulator, with the longest step that is safe. */
export function describeMachine(machine: Machine, steepest: GroundSpec, divide = 1): MachineSpec {
  const spec = {
    dimensions: machine.dimensions,
    nodes: nodesOf(machine),
    ...strutsOf(machine),
    groups: Array.from(machine.strains, () => ({ frequencyHz: machine.frequencyHz })),
    gravityMps2: [0, -numbers.gravityMps2, 0].slice(0, machine.dimensions),
    dragNspm: numbers.settleDragNspm,
    ground: steepest,
    contact: contactSpec,
    drive: { startSeconds: numbers.settleSeconds, rampSeconds: numbers.rampSeconds },
    stepSeconds: numbers.stepSecondsMost,
  }
  const whole = chooseStep(stepBound(spec), frameSeconds, numbers.stepSecondsMost, numbers.samplesPerFrame)
  return { ...spec, stepSeconds: whole / divide }
}

function nodesOf({ positionsM, nodeMassesKg, footNodes }: Machine): NodeSpec[] {
  const nodes: NodeSpec[] = positionsM.map((positionM, i) => ({ positionM, massKg: nodeMassesKg[i]! }))
  for (const { node, toward } of footNodes) {
    if (toward) nodes[node] = { ...nodes[node]!, headingNode: toward.node }
  }
  return nodes
}

function strutsOf({ members, passiveCount, strains, phaseTurns }: Machine) {
  const struts: StrutSpec[] = []
  const actuators: ActuatorSpec[] = []
  for (let i = 0; i < members.length; i++) {
    const { a, b, lengthM: restM, stiffnessNpm, group } = members[i]!
    const dampingNspm = stiffnessNpm * numbers.relaxationSeconds
    if (i < passiveCount) struts.push({ a, b, restM, stiffnessNpm, dampingNspm })
    else {
      const drive = { group, strain: strains[group]!, phaseTurns: phaseTurns[group]! }
      const actuator = actuatorClasses.bellows
      actuators.push({ a, b, restM, stiffnessNpm, dampingNspm, ...drive, actuator })
    }
  }
  return { struts, actuators }
}

/** Friction of every node on a floor. */
export function frictionOf(machine: Machine, floorFriction: number): FrictionSpec[] {
  const { dimensions, positionsM, footNodes } = machine
  const on = (foot: Foot, turned: boolean): FrictionSpec => {
    const { forward, backward } = numbers.feet[foot]
    const coefficient = (factor: number) => Math.min(numbers.frictionMost, floorFriction * factor)
    const [ahead, behind] = [coefficient(forward), coefficient(backward)]
    const along = turned ? { forward: behind, backward: ahead } : { forward: ahead, backward: behind }
    return dimensions === 2 ? along : { ...along, sideways: Math.max(ahead, behind) }
  }
  const friction = positionsM.map(() => on('bare', false))
  for (const { node, foot, toward } of footNodes) friction[node] = on(foot, toward?.isBehind ?? false)
  return friction
}

/** The body on the steepest floor: what situate() varies. */
export function baseLattice(machine: Machine, steepest: GroundSpec, divide = 1): Lattice {
  return buildLattice(describeMachine(machine, steepest, divide))
}

/** The body ready to settle under each condition: lattices that share all that does not differ. */
export function situate<Condition extends Surroundings>(
  base: Lattice,
  machine: Machine,
  world: World<Condition>,
  conditions: readonly Condition[],
): Lattice[] {
  return conditions.map((condition) =>
    varyLattice(base, {
      ground: world.groundOf(condition),
      steepestSlope: world.slopeMost,
      friction: frictionOf(machine, condition.floorFriction),
      lagSeconds: condition.lagSeconds,
    }),
  )
}

/** Steps of a whole trial of this body, settling included; the same under every condition. */
export function stepsOf(machine: Machine, steepest: GroundSpec): number {
  return stepsPerTrial(describeMachine(machine, steepest).stepSeconds)
}

export function stepsPerTrial(stepSeconds: number): number {
  return Math.round((numbers.settleSeconds + numbers.trialSeconds) / stepSeconds)
}

/** A trial that came to its end: what was sampled, and where the puck was. */
export interface Trial {
  readonly tally: Tally
  readonly startXM: number
  readonly startYM: number
  readonly endXM: number
}

/** Steps between two samples, and between two looks. */
function pacesOf({ stepSeconds }: Lattice) {
  const stepsPerSample = Math.round(frameSeconds / numbers.samplesPerFrame / stepSeconds)
  return { stepsPerSample, stepsPerLook: stepsPerSample * numbers.samplesPerFrame * numbers.framesPerLook }
}

const looksPerTrial = framesPerTrial / numbers.framesPerLook

/** One trial for each condition, in order; a fault where the machine broke. */
export function runTrials<Condition extends Surroundings>(
  machine: Machine,
  world: World<Condition>,
  conditions: readonly Condition[],
  divide = 1,
): (Trial | Fault)[] {
  const results: (Trial | Fault)[] = []
  const watch = watchOf(machine)
  const base = baseLattice(machine, world.steepest, divide)
  for (let first = 0; first < conditions.length; first += lanesMost.double) {
    const some = conditions.slice(first, first + lanesMost.double)
    results.push(...runGroup(watch, situate(base, machine, world, some)))
  }
  return results
}

/** Up to four trials side by side. */
function runGroup(watch: Watch, lattices: readonly Lattice[]): (Trial | Fault)[] {
  const { machine } = watch
  const lanes = packLanes(lattices)
  const faults: (Fault | undefined)[] = lattices.map(() => undefined)
  const { stepsPerSample, stepsPerLook } = pacesOf(lattices[0]!)
  advanceLanes(lanes, lattices[0]!.driveStartStep)
  noteFaults(watch, lanes, faults)
  for (const lattice of lattices) lattice.dragNspm = 0
  const starts = lattices.map((_, i) => [puckM(machine, lanes, i, 0), puckM(machine, lanes, i, 1)])
  for (let look = 0; look < looksPerTrial && faults.includes(undefined); look++) {
    advanceLanes(lanes, stepsPerLook, stepsPerSample)
    noteFaults(watch, lanes, faults)
  }
  const results = faults.map((fault, i) => {
    if (fault) return fault
    const [startXM, startYM] = starts[i] as [number, number]
    return { tally: laneTally(lanes, i), startXM, startYM, endXM: puckM(machine, lanes, i, 0) }
  })
  releaseLanes(lanes)
  return results
}

function puckM({ puckNode }: Machine, lanes: Lanes, lane: number, axis: 0 | 1): number {
  return lanePlaceM(lanes, lane, puckNode, axis)
}

/** The first fault of every lane stays: the kernel's own, a collapsed bay, or a strut beyond its bounds in a sample. */
function noteFaults(watch: Watch, lanes: Lanes, faults: (Fault | undefined)[]): void {
  const seconds = lanes.step * lanes.lattices[0]!.stepSeconds
  for (let i = 0; i < faults.length; i++) {
    if (faults[i]) continue
    if (lanes.faults[i]) {
      faults[i] = lanes.faults[i]
      continue
    }
    const bay = collapsedBay(lanePlaces(lanes, i), watch)
    if (bay >= 0) {
      faults[i] = bayFault(bay, seconds)
      continue
    }
    const strut = lanes.samples === 0 ? -1 : laneStrutBeyond(lanes, i, watch.leastM, watch.mostM)
    if (strut >= 0) faults[i] = strutFault(watch, strut, laneTally(lanes, i), seconds)
  }
}

/** What noteFaults() tells of a lane, of a lattice on the reference simulator. */
function brokenNow(watch: Watch, lattice: Lattice, tally: Tally): Fault | undefined {
  const seconds = lattice.step * lattice.stepSeconds
  const bay = collapsedBay(latticePlaces(lattice), watch)
  if (bay >= 0) return bayFault(bay, seconds)
  const strut = tally.samples === 0 ? -1 : strutBeyond(tally, watch.leastM, watch.mostM)
  return strut >= 0 ? strutFault(watch, strut, tally, seconds) : undefined
}

/**
 * One trial on the reference simulator; `onFrame` sees the settled body and every frame (1/25 s) after it, until a fault.
 * The same bits as the trial of runTrials().
 */
export function followTrial(
  machine: Machine,
  lattice: Lattice,
  onFrame: (lattice: Lattice) => void = () => {},
): Trial | Fault {
  const watch = watchOf(machine)
  const tally = newTally(lattice)
  const settled = advance(lattice, lattice.driveStartStep) ?? brokenNow(watch, lattice, tally)
  if (settled) return settled
  lattice.dragNspm = 0
  onFrame(lattice)
  const at = (axis: number) => lattice.nodes[machine.puckNode * lattice.stride + axis]!
  const [startXM, startYM] = [at(0), at(1)]
  const { stepsPerSample, stepsPerLook } = pacesOf(lattice)
  const take = () => {
    takeSample(lattice, tally, stepsPerSample * lattice.stepSeconds)
    // Between two choke points nobody has looked yet: what has a fault is not drawn.
    if (tally.samples % numbers.samplesPerFrame === 0 && !look(lattice)) onFrame(lattice)
  }
  for (let turn = 0; turn < looksPerTrial; turn++) {
    const fault =
      advance(lattice, stepsPerLook, { everySteps: stepsPerSample, take }) ?? brokenNow(watch, lattice, tally)
    if (fault) return fault
  }
  return { tally, startXM, startYM, endXM: at(0) }
}
