// One trial of one body under one condition: settle, drive for 8 s, measure. The body settles first (drives still,
// some drag), so that nothing is measured that was stored before the start; then the drag is off and distance
// counts from where the puck stands.

import { advance, type Fault, groundHeightM } from '../../lattice/advance.js'
import { buildLattice, type Lattice } from '../../lattice/build.js'
import { planeStride as stride } from '../../lattice/layout.js'
import { lengthM, lengthRateMps, tensionN } from '../../lattice/observe.js'
import type { LatticeSpec } from '../../lattice/spec.js'
import { chooseStep, stepBound } from '../../lattice/stability.js'
import type { Body } from './body.js'
import { type CulvertCondition, culvertGround, steepestGround } from './floor.js'
import type { CrawlerGenome } from './genome.js'
import { numbers } from './numbers.js'

const frameSeconds = 1 / numbers.framesPerSecond
export const framesPerTrial = numbers.trialSeconds * numbers.framesPerSecond

/** The body in the culvert as a description for the lattice simulator, with the longest step that is safe. */
export function describeLattice(
  genome: CrawlerGenome,
  body: Body,
  condition: CulvertCondition,
): LatticeSpec & { readonly stepSeconds: number } {
  const { floorFriction, lagSeconds, debris } = condition
  const frictionOf = (foot: keyof typeof numbers.feet) => ({
    forward: Math.min(numbers.frictionMost, floorFriction * numbers.feet[foot].forward),
    backward: Math.min(numbers.frictionMost, floorFriction * numbers.feet[foot].backward),
  })
  const strut = ({ a, b, lengthM: restM, stiffnessNpm }: Body['members'][number]) => {
    return { a, b, restM, stiffnessNpm, dampingNspm: stiffnessNpm * numbers.relaxationSeconds }
  }
  const spec = {
    nodes: body.positionsM.map((positionM, i) => ({
      positionM,
      massKg: body.nodeMassesKg[i]!,
      friction: frictionOf(i % 2 === 0 ? body.feet[i / 2]! : 'bare'),
    })),
    struts: body.members.slice(0, body.passiveCount).map(strut),
    actuators: body.members.slice(body.passiveCount).map((member) => ({
      ...strut(member),
      group: member.group,
      strain: body.strains[member.group]!,
      phaseTurns: genome.phase[member.group]!,
      forceLimitN: numbers.pressurePa * numbers.boreAreaM2,
    })),
    groups: Array.from(body.strains, () => ({ frequencyHz: body.frequencyHz, lagSeconds })),
    gravityMps2: [0, -numbers.gravityMps2],
    dragNspm: numbers.settleDragNspm,
    ground: culvertGround(debris),
    contact: {
      stiffness: numbers.contactNpm,
      damping: numbers.contactNspm2,
      exponent: 1 as const,
      depthLimitM: numbers.depthLimitM,
    },
    drive: { startSeconds: numbers.settleSeconds, rampSeconds: numbers.rampSeconds },
    stepSeconds: numbers.stepSecondsMost,
  }
  // The step is chosen for the steepest floor there is, so that a body has one step whatever it meets.
  const bound = stepBound({ ...spec, ground: steepestGround })
  const stepSeconds = chooseStep(bound, frameSeconds, numbers.stepSecondsMost, numbers.samplesPerFrame)
  return { ...spec, stepSeconds }
}

/** Steps of a whole trial of this body, settling included; the same under every condition. */
export function stepsOf(genome: CrawlerGenome, body: Body): number {
  const { stepSeconds } = describeLattice(genome, body, { floorFriction: 0, lagSeconds: 0, debris: [] })
  return Math.round((numbers.settleSeconds + numbers.trialSeconds) / stepSeconds)
}

/** What is counted while the trial runs. */
export interface Tally {
  samples: number
  contacts: number
  peakTensionN: number
  /** Mechanical work given to the nodes by the actuators, J, positive part: a bellows that is pushed gives nothing back. */
  workJ: number
  puckLowM: number
  puckHighM: number
}

export interface Trial {
  readonly lattice: Lattice
  readonly body: Body
  readonly startXM: number
  readonly stepsPerSample: number
  readonly tally: Tally
}

/** The settled body, ready to start; or why it could not settle. `divide` makes the step smaller, for checks. */
export function startTrial(
  genome: CrawlerGenome,
  body: Body,
  condition: CulvertCondition,
  divide = 1,
): Trial | Fault {
  const spec = describeLattice(genome, body, condition)
  const lattice = buildLattice({ ...spec, stepSeconds: spec.stepSeconds / divide })
  const stepsPerSample = Math.round(frameSeconds / numbers.samplesPerFrame / lattice.stepSeconds)
  const fault = advance(lattice, lattice.driveStartStep) ?? collapse(lattice, body)
  if (fault) return fault
  lattice.dragNspm = 0
  const startXM = lattice.nodes[body.puckNode * stride]!
  const y = lattice.nodes[body.puckNode * stride + 1]!
  const tally = { samples: 0, contacts: 0, peakTensionN: 0, workJ: 0, puckLowM: y, puckHighM: y }
  return { lattice, body, startXM, stepsPerSample, tally }
}

/** One frame (1/25 s) further; the fault that ended the trial, or nothing. */
export function advanceFrame(trial: Trial): Fault | undefined {
  for (let i = 0; i < numbers.samplesPerFrame; i++) {
    const fault = advance(trial.lattice, trial.stepsPerSample)
    if (fault) return fault
    sample(trial)
  }
  return collapse(trial.lattice, trial.body)
}

/** How far the puck has come since the start, m. */
export function distanceM({ lattice, body, startXM }: Trial): number {
  return lattice.nodes[body.puckNode * stride]! - startXM
}

function sample({ lattice, body, tally, stepsPerSample }: Trial): void {
  const { nodes, passiveCount } = lattice
  tally.samples++
  for (let column = 0; column < body.columns; column++) {
    const o = 2 * column * stride
    if (nodes[o + 1]! < groundHeightM(lattice, nodes[o]!)) tally.contacts++
  }
  const seconds = stepsPerSample * lattice.stepSeconds
  for (let i = 0; i < body.members.length; i++) {
    const tension = tensionN(lattice, i)
    tally.peakTensionN = Math.max(tally.peakTensionN, Math.abs(tension))
    if (i >= passiveCount) tally.workJ += Math.max(0, -tension * lengthRateMps(lattice, i)) * seconds
  }
  const y = nodes[body.puckNode * stride + 1]!
  tally.puckLowM = Math.min(tally.puckLowM, y)
  tally.puckHighM = Math.max(tally.puckHighM, y)
}

/** A bay turned inside out, or a strut squeezed or torn beyond what rubber does: the machine is broken. */
function collapse(lattice: Lattice, body: Body): Fault | undefined {
  const seconds = lattice.step * lattice.stepSeconds
  for (let column = 0; column + 1 < body.columns; column++) {
    const now = bayArea((node, axis) => lattice.nodes[node * stride + axis]!, column)
    const before = bayArea((node, axis) => body.positionsM[node]![axis]!, column)
    if (now < numbers.bayAreaLeast * before) return { reason: `bay ${column + 1} collapsed`, seconds }
  }
  for (const [i, member] of body.members.entries()) {
    const ratio = lengthM(lattice, i) / member.lengthM
    if (ratio < numbers.strutRatioLeast || ratio > numbers.strutRatioMost) {
      const percent = Math.round(100 * ratio)
      return {
        reason: `${member.place} of column ${(member.a >> 1) + 1} is at ${percent} % of its length`,
        seconds,
      }
    }
  }
  return undefined
}

/** Signed area of a bay, m^2: half the cross product of its diagonals. */
function bayArea(coordinate: (node: number, axis: 0 | 1) => number, column: number): number {
  const lower = 2 * column
  const upper = lower + 1
  const risingX = coordinate(upper + 2, 0) - coordinate(lower, 0)
  const risingY = coordinate(upper + 2, 1) - coordinate(lower, 1)
  const fallingX = coordinate(upper, 0) - coordinate(lower + 2, 0)
  const fallingY = coordinate(upper, 1) - coordinate(lower + 2, 1)
  return (risingX * fallingY - risingY * fallingX) / 2
}
