// A crawler as the trial sees it, in the plane or in space: nodes, struts, feet, bays. Made from a genome by body.ts here
// and in culvert-crawler-3d.

import type { feet, kinds } from './genome.js'
import { numbers } from './numbers.js'

export type Foot = (typeof feet)[number]
export type Kind = (typeof kinds)[number]

export interface Member {
  readonly a: number
  readonly b: number
  readonly kind: Kind
  /** Word for the place of the strut in its column. */
  readonly place: string
  readonly column: number
  /** 0 to 3; -1 for passive struts. */
  readonly group: number
  readonly lengthM: number
  readonly stiffnessNpm: number
  readonly massKg: number
}

export interface Machine {
  readonly dimensions: 2 | 3
  readonly columns: number
  /** Of every node, m. The front of the body is at x = 0, its feet on y = 0. */
  readonly positionsM: readonly (readonly number[])[]
  /** Struts, passive ones first, each kind in the order of the genome. */
  readonly members: readonly Member[]
  readonly passiveCount: number
  /** Lower nodes with their foot, in order. */
  readonly footNodes: readonly FootNode[]
  readonly nodeMassesKg: Float64Array
  readonly puckNode: number
  /** Rubber, joints, fittings and pads: all but the puck. */
  readonly materialKg: number
  readonly massKg: number
  /** Strain amplitude of every group, after the limit of the strain rate. */
  readonly strains: Float64Array
  readonly phaseTurns: Float64Array
  readonly frequencyHz: number
  /** Nodes of every bay, as collapse.ts wants them. */
  readonly bays: readonly (readonly number[])[]
}

export interface FootNode {
  readonly node: number
  readonly foot: Foot
  /** In space: the node that the foot's forward direction points at, or, with `isBehind`, away from. */
  readonly toward?: { readonly node: number; readonly isBehind: boolean }
}

/** A place for a strut between two nodes, and what the genome puts there. */
export interface Slot {
  readonly a: number
  readonly b: number
  readonly place: string
  readonly column: number
  readonly kind: Kind
  readonly group: number
}

/** The strut in a slot: tube or bellows of the length between its nodes. */
export function memberOf(slot: Slot, positionsM: readonly (readonly number[])[]): Member {
  const { a, b, place, column, kind, group } = slot
  let squared = 0
  for (const [axis, from] of positionsM[a]!.entries()) {
    const d = positionsM[b]![axis]! - from
    squared += d * d
  }
  const lengthM = Math.sqrt(squared)
  const isActive = kind === actuatorKind
  const youngPa = isActive ? numbers.youngPa.soft : numbers.youngPa[kind as 'soft']
  const rubberKg = numbers.rubberKgpm3 * numbers.strutAreaM2 * lengthM
  return {
    a,
    b,
    kind,
    place,
    column,
    group: isActive ? group : -1,
    lengthM,
    stiffnessNpm: (youngPa * numbers.strutAreaM2) / lengthM,
    massKg: rubberKg + (isActive ? numbers.actuatorFittingKg : 0),
  }
}

const actuatorKind: Kind = 'actuator'

/** Masses, limits and the order of struts, which are the same for every crawler. */
export function assemble(
  shape: Pick<Machine, 'dimensions' | 'columns' | 'positionsM' | 'footNodes' | 'puckNode' | 'bays'>,
  all: readonly Member[],
  drive: { readonly amplitude: Float64Array; readonly phase: Float64Array; readonly frequencyHz: number },
): Machine {
  const passive = all.filter((member) => member.group < 0)
  const active = all.filter((member) => member.group >= 0)
  const nodeMassesKg = new Float64Array(shape.positionsM.length).fill(numbers.jointKg)
  for (const member of all) {
    nodeMassesKg[member.a]! += member.massKg / 2
    nodeMassesKg[member.b]! += member.massKg / 2
  }
  for (const { node, foot } of shape.footNodes) if (foot !== 'bare') nodeMassesKg[node]! += numbers.padKg
  const materialKg = nodeMassesKg.reduce((sum, m) => sum + m, 0)
  nodeMassesKg[shape.puckNode]! += numbers.puckKg
  const strainMost = numbers.strainRateMost / (2 * Math.PI * drive.frequencyHz)
  return {
    ...shape,
    members: [...passive, ...active],
    passiveCount: passive.length,
    nodeMassesKg,
    materialKg,
    massKg: materialKg + numbers.puckKg,
    strains: drive.amplitude.map((strain) => Math.min(strain, strainMost)),
    phaseTurns: drive.phase,
    frequencyHz: drive.frequencyHz,
  }
}
