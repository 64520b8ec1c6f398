// From genome to machine: nodes, struts, masses, stiffnesses. Lower node of column i is node 2 i, the upper one
// node 2 i + 1. The front of the body is at x = 0, its feet on y = 0.

import { actuator, type CrawlerGenome, feet, kinds, none, places, placesPerColumn } from './genome.js'
import { numbers } from './numbers.js'

export interface Member {
  readonly a: number
  readonly b: number
  readonly kind: (typeof kinds)[number]
  readonly place: (typeof places)[number]
  /** 0 to 3; -1 for passive struts. */
  readonly group: number
  readonly lengthM: number
  readonly stiffnessNpm: number
  readonly massKg: number
}

export interface Body {
  readonly columns: number
  /** x, y of every node, m. */
  readonly positionsM: readonly (readonly [number, number])[]
  /** Struts, passive ones first, each kind in the order of the genome. */
  readonly members: readonly Member[]
  readonly passiveCount: number
  /** Foot of every column. */
  readonly feet: readonly (typeof feet)[number][]
  readonly nodeMassesKg: Float64Array
  readonly puckNode: number
  /** Rubber, joints, fittings and pads: all but the puck. */
  readonly materialKg: number
  readonly massKg: number
  /** Strain amplitude of every group, after the limit of the strain rate. */
  readonly strains: Float64Array
  readonly frequencyHz: number
}

/** The machine that a (repaired) genome describes. */
export function buildBody(genome: CrawlerGenome): Body {
  const columns = genome.bays[0]! + 1
  const positionsM = placeNodes(genome, columns)
  const members = listMembers(genome, columns, positionsM)
  const passive = members.filter((m) => m.group < 0)
  const active = members.filter((m) => m.group >= 0)
  const footKinds = Array.from({ length: columns }, (_, i) => feet[genome.foot[i]!]!)
  const nodeMassesKg = new Float64Array(2 * columns).fill(numbers.jointKg)
  for (const member of members) {
    nodeMassesKg[member.a]! += member.massKg / 2
    nodeMassesKg[member.b]! += member.massKg / 2
  }
  for (const [i, foot] of footKinds.entries()) if (foot !== 'bare') nodeMassesKg[2 * i]! += numbers.padKg
  const materialKg = nodeMassesKg.reduce((sum, m) => sum + m, 0)
  const puckNode = 2 * Math.floor(columns / 2) + 1
  nodeMassesKg[puckNode]! += numbers.puckKg
  const frequencyHz = genome.frequency[0]!
  const strainMost = numbers.strainRateMost / (2 * Math.PI * frequencyHz)
  return {
    columns,
    positionsM,
    members: [...passive, ...active],
    passiveCount: passive.length,
    feet: footKinds,
    nodeMassesKg,
    puckNode,
    materialKg,
    massKg: materialKg + numbers.puckKg,
    strains: genome.amplitude.map((strain) => Math.min(strain, strainMost)),
    frequencyHz,
  }
}

function placeNodes(genome: CrawlerGenome, columns: number): (readonly [number, number])[] {
  let lengthM = 0
  for (let i = 0; i < columns - 1; i++) lengthM += genome.bayLength[i]!
  const positions: (readonly [number, number])[] = []
  let x = -lengthM
  for (let i = 0; i < columns; i++) {
    positions.push([x, 0], [x, genome.height[i]!])
    x += genome.bayLength[i] ?? 0
  }
  return positions
}

/** Nodes of the five places of column i, in the order of `places`. */
function endsOf(column: number): readonly (readonly [number, number])[] {
  const lower = 2 * column
  const upper = lower + 1
  return [
    [lower, upper],
    [lower, lower + 2],
    [upper, upper + 2],
    [lower, upper + 2],
    [upper, lower + 2],
  ]
}

function listMembers(
  genome: CrawlerGenome,
  columns: number,
  positionsM: readonly (readonly [number, number])[],
): Member[] {
  const members: Member[] = []
  for (let column = 0; column < columns; column++) {
    const used = column === columns - 1 ? 1 : placesPerColumn
    for (let place = 0; place < used; place++) {
      const slot = column * placesPerColumn + place
      const kind = genome.struts[slot]!
      if (kind === none) continue
      const [a, b] = endsOf(column)[place]!
      const dx = positionsM[b]![0] - positionsM[a]![0]
      const dy = positionsM[b]![1] - positionsM[a]![1]
      const lengthM = Math.sqrt(dx * dx + dy * dy)
      const isActive = kind === actuator
      const youngPa = isActive ? numbers.youngPa.soft : numbers.youngPa[kinds[kind] as 'soft']
      const rubberKg = numbers.rubberKgpm3 * numbers.strutAreaM2 * lengthM
      members.push({
        a,
        b,
        kind: kinds[kind]!,
        place: places[place]!,
        group: isActive ? genome.group[slot]! : -1,
        lengthM,
        stiffnessNpm: (youngPa * numbers.strutAreaM2) / lengthM,
        massKg: rubberKg + (isActive ? numbers.actuatorFittingKg : 0),
      })
    }
  }
  return members
}
