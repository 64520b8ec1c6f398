// From a genome to the masses and struts of a mount with its sensor, as it is before gravity acts.

import { cos, sin } from '../../../shared/detmath/trigonometry.js'
import type { LatticeSpec, NodeSpec, StrutSpec } from '../../lattice/spec.js'
import {
  columns,
  compoundNames,
  compounds,
  heldJoints,
  jointAt,
  levels,
  type MountGenome,
  none,
  otherEnds,
  places,
  slotAt,
} from './genome.js'
import { numbers } from './numbers.js'
import { makeOf, type StrutClass, type StrutMake, strutClasses } from './stock.js'

export interface Member extends StrutMake {
  readonly name: string
  readonly kind: StrutClass
  readonly a: number
  readonly b: number
  readonly lengthM: number
}

/** Nodes: base joints first, then the other joints that are held, then the sensor's centre of mass. */
export interface Mount {
  readonly positionsM: readonly (readonly [number, number])[]
  /** Of the joints with the halves of their struts; without the sensor. */
  readonly mountKg: readonly number[]
  readonly members: readonly Member[]
  /** Top joints, which carry the foot plate. */
  readonly top: readonly number[]
  readonly sensorNode: number
  /** Struts and joints above the base plate. */
  readonly materialKg: number
  readonly damping: number
  readonly compound: string
}

/** The mount that a repaired genome describes. */
export function buildMount(genome: MountGenome): Mount {
  const held = heldJoints(genome.struts)
  const [width, height] = [genome.cellWidth[0]!, genome.cellHeight[0]!]
  const numberOf = new Int32Array(held.length).fill(-1)
  const positionsM: [number, number][] = []
  for (let joint = 0; joint < held.length; joint++) {
    if (!held[joint]) continue
    numberOf[joint] = positionsM.length
    const column = joint % columns
    positionsM.push([(column - (columns - 1) / 2) * width, Math.floor(joint / columns) * height])
  }
  const members = membersOf(genome, numberOf, positionsM)
  // Base joints move as the pump does: their mass does not matter.
  const mountKg = positionsM.map(() => numbers.jointKg)
  for (const { a, b, massKg } of members) {
    mountKg[a]! += massKg / 2
    mountKg[b]! += massKg / 2
  }
  const top: number[] = []
  for (let column = 0; column < columns; column++) {
    const number = numberOf[jointAt(levels - 1, column)]!
    if (number >= 0) top.push(number)
  }
  const jointsKg = numbers.jointKg * (positionsM.length - columns)
  const materialKg = jointsKg + members.reduce((sum, member) => sum + member.massKg, 0)
  const sensorNode = positionsM.length
  positionsM.push([0, (levels - 1) * height + numbers.sensorHeightM])
  const compound = compoundNames[genome.compound[0]!]!
  return { positionsM, mountKg, members, top, sensorNode, materialKg, damping: compounds[compound], compound }
}

/** Columns from 1, levels from 0, which is the base plate. */
const jointName = (joint: number) => `joint ${(joint % columns) + 1} of level ${Math.floor(joint / columns)}`

function membersOf(
  genome: MountGenome,
  numberOf: Int32Array,
  positionsM: readonly (readonly [number, number])[],
): Member[] {
  const members: Member[] = []
  for (let row = 1; row < levels; row++) {
    for (let column = 0; column < columns; column++) {
      for (const place of places) {
        const option = genome.struts[slotAt(row, column, place)]!
        if (option === none) continue
        for (const other of otherEnds(row, column, place)) {
          const [a, b] = [numberOf[other]!, numberOf[jointAt(row, column)]!]
          const [from, to] = [positionsM[a]!, positionsM[b]!]
          const [dx, dy] = [to[0] - from[0], to[1] - from[1]]
          const lengthM = Math.sqrt(dx * dx + dy * dy)
          const kind = strutClasses[option - 1]!
          const name = `${jointName(other)} to ${jointName(jointAt(row, column))}`
          members.push({ name, kind, a, b, lengthM, ...makeOf(kind, lengthM) })
        }
      }
    }
  }
  return members
}

/** One build of a mount, and how the pump shakes it. */
export interface Build {
  /** Factor on the stiffness and damping of all rubber. */
  readonly batch: number
  readonly sensorKg: number
  /** Where the base goes at the crest of its motion, m. */
  readonly shakeM: readonly [number, number]
}

/** The mount with its sensor as a lattice without load: rest lengths written out, no drive but the base's paths. */
export function latticeOf(mount: Mount, build: Build): LatticeSpec {
  const { positionsM, mountKg, members, top, sensorNode, damping } = mount
  const footKg = (numbers.footShare * build.sensorKg) / top.length
  const nodes: NodeSpec[] = positionsM.map((positionM, i) => {
    if (i === sensorNode) return { positionM, massKg: (1 - numbers.footShare) * build.sensorKg }
    return { positionM, massKg: mountKg[i]! + (top.includes(i) ? footKg : 0) }
  })
  const struts = members.map(({ a, b, lengthM, stiffnessNpm, relaxationSeconds, kind }): StrutSpec => {
    const rubber = kind.kind === 'rubber'
    const k = stiffnessNpm * (rubber ? build.batch : 1)
    return {
      a,
      b,
      restM: lengthM,
      stiffnessNpm: k,
      dampingNspm: k * relaxationSeconds * (rubber ? damping : 1),
    }
  })
  return {
    nodes,
    struts: [...struts, ...plate(mount)],
    groups: [{ frequencyHz: 0 }],
    prescribed: nodes.slice(0, columns).map((_, node) => {
      return { node, group: 0, amplitudeM: build.shakeM, phaseTurns: 0 }
    }),
    gravityMps2: [0, -numbers.gravityMps2],
    stepSeconds: 'auto',
  }
}

/** The sensor's body: the joints of its foot, each joined to the next and to its centre of mass. */
function plate({ positionsM, top, sensorNode }: Mount): StrutSpec[] {
  const stiff = (a: number, b: number): StrutSpec => {
    const [dx, dy] = [positionsM[b]![0] - positionsM[a]![0], positionsM[b]![1] - positionsM[a]![1]]
    const dampingNspm = numbers.bodyNpm * numbers.bodyRelaxationSeconds
    return { a, b, restM: Math.sqrt(dx * dx + dy * dy), stiffnessNpm: numbers.bodyNpm, dampingNspm }
  }
  return [
    ...top.slice(1).map((joint, i) => stiff(top[i]!, joint)),
    ...top.map((joint) => stiff(joint, sensorNode)),
  ]
}

/** The crest of a shaking that leans from the upright. */
export function crestM(leanRad: number): readonly [number, number] {
  return [numbers.shakeM * sin(leanRad), numbers.shakeM * cos(leanRad)]
}
