// What is evolved: a quarter of a unit cell. Its corners are fixed, the nodes between them slide along its sides, the
// centre is free; mirrored twice it makes a cell that repeats. Walls may lie along these lines:
//
//    (0,2)---top----(1,2)---------(2,2)      12 walls between neighbours along the grid, and in each of the four
//      |      \       |      /      |        fields a brace: a spoke (centre to corner) or a chord (cutting the
//      |       \      |     /       |        corner off), never both
//    (0,1)-------- centre -------(2,1)
//      |       /      |     \       |        Walls never cross: spokes and grid lines all start from the centre,
//      |      /       |      \      |        chords keep the centre on their other side (repair).
//    (0,0)---------(1,0)---------(2,0)

import { choice, real } from '../../../shared/encodings.js'
import type { GenomeOf } from '../../../shared/genome.js'
import { numbers } from './numbers.js'

export const wallKinds = ['none', 'thin', 'middle', 'thick'] as const
export const thicknessOfM = [0, numbers.wallsM.thin, numbers.wallsM.middle, numbers.wallsM.thick] as const
export const braceKinds = ['none', 'spoke', 'chord'] as const
export const spoke = braceKinds.indexOf('spoke')
export const chord = braceKinds.indexOf('chord')

/** Nodes of the quarter: node (i, j) is 3 j + i. */
export const nodeOf = (i: number, j: number) => 3 * j + i

/** The twelve grid lines: along x row by row, then along y column by column. */
export const gridLines: readonly (readonly [number, number])[] = [
  ...[0, 1, 2].flatMap((j) => [0, 1].map((i) => [nodeOf(i, j), nodeOf(i + 1, j)] as const)),
  ...[0, 1, 2].flatMap((i) => [0, 1].map((j) => [nodeOf(i, j), nodeOf(i, j + 1)] as const)),
]

/** The four fields: corner node, and the two nodes beside it. */
export const fields = [
  { corner: nodeOf(0, 0), beside: [nodeOf(1, 0), nodeOf(0, 1)] },
  { corner: nodeOf(2, 0), beside: [nodeOf(1, 0), nodeOf(2, 1)] },
  { corner: nodeOf(0, 2), beside: [nodeOf(1, 2), nodeOf(0, 1)] },
  { corner: nodeOf(2, 2), beside: [nodeOf(1, 2), nodeOf(2, 1)] },
] as const
const centre = nodeOf(1, 1)

const place = { low: numbers.placeLeast, high: 1 - numbers.placeLeast, unit: 'of the side' } as const

export const padGenome = {
  rubber: choice({ options: numbers.rubbers.map((rubber) => rubber.name) }),
  height: real({ ...numbers.quarterHeightM, unit: 'm' }),
  /** Places along their sides of the nodes in the middle of the lower, upper, left and right side. */
  sides: real({ length: 4, ...place }),
  centre: real({ length: 2, ...place }),
  walls: choice({ length: gridLines.length, options: wallKinds }),
  braces: choice({ length: fields.length, options: braceKinds }),
  braceWalls: choice({ length: fields.length, options: wallKinds.slice(1) }),
} as const

export type PadGenome = GenomeOf<typeof padGenome>

/** A wall of the quarter: its nodes and the index of its kind in `wallKinds` (never none). */
export interface QuarterWall {
  readonly a: number
  readonly b: number
  readonly kind: number
  /** Place in the list of twelve grid lines, then four braces. */
  readonly slot: number
}

/** x, y of the nine nodes of the quarter, m. */
export function quarterNodes(genome: PadGenome): (readonly [number, number])[] {
  const w = numbers.quarterWidthM
  const h = genome.height[0]!
  const [lower, upper, left, right] = genome.sides
  const [x, y] = genome.centre
  return [
    [0, 0],
    [lower! * w, 0],
    [w, 0],
    [0, left! * h],
    [x! * w, y! * h],
    [w, right! * h],
    [0, h],
    [upper! * w, h],
    [w, h],
  ]
}

/** The walls that a genome asks for. */
export function quarterWalls(genome: PadGenome): QuarterWall[] {
  const walls: QuarterWall[] = []
  for (const [slot, [a, b]] of gridLines.entries()) {
    const kind = genome.walls[slot]!
    if (kind > 0) walls.push({ a, b, kind, slot })
  }
  for (const [i, { corner, beside }] of fields.entries()) {
    const kind = genome.braceWalls[i]! + 1
    const slot = gridLines.length + i
    if (genome.braces[i] === spoke) walls.push({ a: centre, b: corner, kind, slot })
    if (genome.braces[i] === chord) walls.push({ a: beside[0], b: beside[1], kind, slot })
  }
  return walls
}
