// From the quarter to the whole cell: 16 nodes, every wall with its mirror images, over the cell's edges where needed.
// Column 3 of the cell mirrors column 1 of the quarter, row 3 mirrors row 1.

import { type PadGenome, type QuarterWall, quarterNodes, quarterWalls } from './genome.js'
import { numbers } from './numbers.js'

export interface CellWall {
  readonly a: number
  readonly b: number
  readonly shift: readonly [number, number]
  readonly kind: number
  readonly slot: number
}

export interface PadCell {
  readonly widthM: number
  readonly heightM: number
  /** x, y of the 16 nodes; node (i, j) is 4 j + i. */
  readonly nodesM: readonly (readonly [number, number])[]
  readonly walls: readonly CellWall[]
}

/** A node of the quarter in the mirrored cell: columns -2 to 2 around the mirror, brought into 0 to 3 with its shift. */
function place(quarterNode: number, mirrorX: number, mirrorY: number) {
  const column = mirrorX * (quarterNode % 3)
  const row = mirrorY * Math.floor(quarterNode / 3)
  const [i, j] = [(column + 4) % 4, (row + 4) % 4]
  return { node: 4 * j + i, shift: [(column - i) / 4, (row - j) / 4] as const }
}

/** The cell that these quarter walls make. */
export function mirrorWalls(walls: readonly QuarterWall[]): CellWall[] {
  const all: CellWall[] = []
  const seen = new Set<string>()
  for (const { a, b, kind, slot } of walls) {
    for (const mirrorX of [1, -1]) {
      for (const mirrorY of [1, -1]) {
        const from = place(a, mirrorX, mirrorY)
        const to = place(b, mirrorX, mirrorY)
        const shift = [to.shift[0] - from.shift[0], to.shift[1] - from.shift[1]] as const
        // A wall on a mirror line is its own image; as b to a it would have the opposite shift.
        const names = [
          `${from.node} ${to.node} ${shift}`,
          `${to.node} ${from.node} ${-shift[0]},${-shift[1]}`,
        ]
        if (names.some((name) => seen.has(name))) continue
        seen.add(names[0]!)
        all.push({ a: from.node, b: to.node, shift, kind, slot })
      }
    }
  }
  return all
}

/** The whole cell of a (repaired) genome. */
export function cellOf(genome: PadGenome): PadCell {
  const widthM = 2 * numbers.quarterWidthM
  const heightM = 2 * genome.height[0]!
  const quarter = quarterNodes(genome)
  const nodesM = Array.from({ length: 16 }, (_, node) => {
    const [i, j] = [node % 4, Math.floor(node / 4)]
    const [x, y] = quarter[3 * (j === 3 ? 1 : j) + (i === 3 ? 1 : i)]!
    return [i === 3 ? widthM - x : x, j === 3 ? heightM - y : y] as const
  })
  return { widthM, heightM, nodesM, walls: mirrorWalls(quarterWalls(genome)) }
}

/** Walls that hold nothing: with a free end, or in a piece that does not reach from cell to cell. Slots of the quarter. */
export function idleSlots(walls: readonly CellWall[]): Set<number> {
  const idle = new Set<number>()
  for (;;) {
    const left = walls.filter((wall) => !idle.has(wall.slot))
    const loose = looseEnds(left)
    if (loose.length === 0) {
      const reach = new Map<number, number>()
      for (const wall of left) {
        if (!reach.has(wall.a)) {
          const piece = pieceOf(left, wall.a)
          for (const node of piece.nodes) reach.set(node, piece.reach)
        }
        if (reach.get(wall.a) === 0) idle.add(wall.slot)
      }
      return idle
    }
    for (const slot of loose) idle.add(slot)
  }
}

function looseEnds(walls: readonly CellWall[]): number[] {
  const ends = new Int32Array(16)
  for (const { a, b } of walls) {
    ends[a]!++
    ends[b]!++
  }
  return walls.filter(({ a, b }) => ends[a] === 1 || ends[b] === 1).map((wall) => wall.slot)
}

export interface Piece {
  readonly nodes: readonly number[]
  /**
   * In how many independent directions (0, 1, 2) the piece reaches from cell to cell: the rank of the net shifts of its
   * closed walks.
   */
  readonly reach: number
}

/** The piece that holds this node. */
export function pieceOf(walls: readonly CellWall[], start: number): Piece {
  const at = new Map<number, readonly [number, number]>([[start, [0, 0]]])
  const nodes = [start]
  const loops: (readonly [number, number])[] = []
  for (let next = 0; next < nodes.length; next++) {
    const node = nodes[next]!
    const [x, y] = at.get(node)!
    for (const { a, b, shift } of walls) {
      if (a !== node && b !== node) continue
      const [to, sign] = a === node ? [b, 1] : [a, -1]
      const there = [x + sign * shift[0], y + sign * shift[1]] as const
      const known = at.get(to)
      if (!known) {
        at.set(to, there)
        nodes.push(to)
      } else if (there[0] !== known[0] || there[1] !== known[1]) {
        loops.push([there[0] - known[0], there[1] - known[1]])
      }
    }
  }
  const [first] = loops
  if (!first) return { nodes, reach: 0 }
  return { nodes, reach: loops.some(([x, y]) => x * first[1] !== y * first[0]) ? 2 : 1 }
}
