// Clear gaps between the walls of a quarter, mirror images included: what the cores of the mould must fill.

import { type PadGenome, quarterNodes, quarterWalls, thicknessOfM } from './genome.js'
import { numbers } from './numbers.js'

type Place = readonly [number, number]

export interface Gap {
  readonly name: string
  readonly gapM: number
  /** The wall to leave out first, were the gap too narrow: a brace rather than a grid line, then the later one. */
  readonly slot: number
}

export function distanceM(a: Place, b: Place): number {
  return Math.sqrt((a[0] - b[0]) * (a[0] - b[0]) + (a[1] - b[1]) * (a[1] - b[1]))
}

/** Distance of a point from the segment a b. */
function toSegment(p: Place, a: Place, b: Place): number {
  const [dx, dy] = [b[0] - a[0], b[1] - a[1]]
  const along = ((p[0] - a[0]) * dx + (p[1] - a[1]) * dy) / (dx * dx + dy * dy)
  const t = Math.min(1, Math.max(0, along))
  return distanceM(p, [a[0] + t * dx, a[1] + t * dy])
}

/** The narrowest gap between walls that share no node (walls of a quarter never cross); none where none lie apart. */
export function narrowestGap(genome: PadGenome): Gap | undefined {
  const nodes = quarterNodes(genome)
  const walls = quarterWalls(genome)
  let narrowest: Gap | undefined
  const offer = (gapM: number, slot: number, name: () => string) => {
    if (!narrowest || gapM < narrowest.gapM) narrowest = { name: name(), gapM, slot }
  }
  for (const [i, wall] of walls.entries()) {
    const [a, b] = [nodes[wall.a]!, nodes[wall.b]!]
    const t = thicknessOfM[wall.kind]!
    const name = `wall ${wall.a + 1} to ${wall.b + 1}`
    for (const other of walls.slice(i + 1)) {
      if ([other.a, other.b].some((node) => node === wall.a || node === wall.b)) continue
      const [c, d] = [nodes[other.a]!, nodes[other.b]!]
      const apart = Math.min(toSegment(a, c, d), toSegment(b, c, d), toSegment(c, a, b), toSegment(d, a, b))
      const gapM = apart - (t + thicknessOfM[other.kind]!) / 2
      offer(gapM, other.slot, () => `${name} and wall ${other.a + 1} to ${other.b + 1}`)
    }
    for (const apart of fromMirrors(genome, a, b)) {
      if (apart > 0) offer(2 * apart - t, wall.slot, () => `${name} and its mirror image`)
    }
  }
  return narrowest
}

/** How far a wall stays from the four mirror lines; 0 where it touches one. */
function fromMirrors(genome: PadGenome, a: Place, b: Place): number[] {
  const [w, h] = [numbers.quarterWidthM, genome.height[0]!]
  return [Math.min(a[0], b[0]), w - Math.max(a[0], b[0]), Math.min(a[1], b[1]), h - Math.max(a[1], b[1])]
}
