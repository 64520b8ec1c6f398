// The replay of one trial: where every node was, 25 times a second of simulated time.

import type { Frames, FrameWall, Situation } from '../../../shared/problem.js'
import { groundHeightM } from '../../lattice/ground.js'
import type { Lattice } from '../../lattice/layout.js'
import { commandedStrain } from '../../lattice/observe.js'
import { buildBody } from './body.js'
import { type CulvertCondition, culvert, culvertGround, firstXM, lastXM } from './floor.js'
import type { CrawlerGenome } from './genome.js'
import type { Machine } from './machine.js'
import { numbers } from './numbers.js'
import { baseLattice, followTrial, type Surroundings, situate, type World } from './trial.js'

export function crawlerFrames(genome: CrawlerGenome, situation: Situation<CulvertCondition>): Frames {
  const ground = groundLine(situation.condition)
  return { ...machineFrames(buildBody(genome), culvert, situation.condition), ground, walls: [crown] }
}

/** The culvert's crown, for scale: bodies do not reach it, so it is not simulated. */
const crown: FrameWall = {
  label: 'crown of the culvert',
  pointsM: [firstXM, numbers.boreM, lastXM, numbers.boreM],
  solid: 'left',
}

function groundLine({ debris }: CulvertCondition): (readonly [number, number])[] {
  const { firstXM, spacingM, heightsM } = culvertGround(debris)
  return Array.from(heightsM, (height, i) => [firstXM + i * spacingM, height] as const)
}

/**
 * Frames of any crawler, without the ground, from the settled body on. A trial that fails ends where it failed; one that
 * cannot settle has one frame, the body as built.
 */
export function machineFrames<Condition extends Surroundings>(
  machine: Machine,
  world: World<Condition>,
  condition: Condition,
): Omit<Frames, 'ground'> {
  const base = baseLattice(machine, world.steepest)
  const [lattice] = situate(base, machine, world, [condition]) as [Lattice]
  const positions: Float64Array[] = []
  const contacts: Uint8Array[] = []
  const drives: number[][] = machine.members.slice(machine.passiveCount).map(() => [])
  followTrial(machine, lattice, () => record(machine, lattice, positions, contacts, drives))
  if (positions.length === 0) {
    positions.push(Float64Array.from(machine.positionsM.flat()))
    contacts.push(new Uint8Array(machine.positionsM.length))
    for (const drive of drives) drive.push(0)
  }
  return {
    dimensions: machine.dimensions,
    secondsPerFrame: 1 / numbers.framesPerSecond,
    positions,
    links: machine.members.map(({ a, b, kind, group }) => ({
      a,
      b,
      kind: group < 0 ? kind : `actuator ${group + 1}`,
      ...(group < 0 ? { weight: weights[kind as 'soft'] } : {}),
    })),
    nodeRadiiM: radiiM(machine),
    markers: [{ node: machine.puckNode, label: 'sensor puck', radiusM: numbers.puckRadiusM }],
    drive: drives.map((values, i) => ({ link: machine.passiveCount + i, values: Float64Array.from(values) })),
    contacts,
  }
}

/** How bold a stiffness class is drawn. */
const weights = { soft: 0, firm: 0.5, hard: 1 }

function record(
  machine: Machine,
  lattice: Lattice,
  positions: Float64Array[],
  contacts: Uint8Array[],
  drives: number[][],
): void {
  const { dimensions, stride, nodeCount, nodes } = lattice
  const frame = new Float64Array(dimensions * nodeCount)
  const touches = new Uint8Array(nodeCount)
  for (let i = 0; i < nodeCount; i++) {
    for (let axis = 0; axis < dimensions; axis++) frame[dimensions * i + axis] = nodes[i * stride + axis]!
    const [x, y, z] = [nodes[i * stride]!, nodes[i * stride + 1]!, nodes[i * stride + 2]!]
    touches[i] = y < groundHeightM(lattice, x, dimensions === 3 ? z : 0) ? 1 : 0
  }
  positions.push(frame)
  contacts.push(touches)
  for (const [i, drive] of drives.entries()) {
    const strain = machine.strains[machine.members[machine.passiveCount + i]!.group]!
    drive.push(strain > 0 ? Math.min(1, Math.max(-1, commandedStrain(lattice, i) / strain)) : 0)
  }
}

/** Feet are drawn as large as their pads; nothing is simulated with these radii. */
function radiiM({ positionsM, footNodes }: Machine): number[] {
  const radii = positionsM.map(() => 0.004)
  for (const { node, foot } of footNodes) if (foot !== 'bare') radii[node] = 0.006
  return radii
}
