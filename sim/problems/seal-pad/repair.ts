// Makes a freshly varied genome castable and its walls useful. Pure and idempotent.

import { cellOf, idleSlots } from './cell.js'
import { narrowestGap } from './gaps.js'
import {
  braceKinds,
  chord,
  fields,
  gridLines,
  type PadGenome,
  quarterNodes,
  quarterWalls,
  spoke,
  thicknessOfM,
} from './genome.js'
import { numbers } from './numbers.js'

const none = braceKinds.indexOf('none')

/** A chord's middle line keeps this far from the centre: the widest wall and the least gap. */
const clearanceM = numbers.wallsM.thick + numbers.gapLeastM

/**
 * Chords that would cross the walls of the centre become spokes; walls that are too short for their thickness are cast
 * thinner; walls that leave no room for the mould, have a free end or hang on nothing are left out.
 */
export function repairPad(genome: PadGenome): PadGenome {
  let sound = withoutIdle(thinShortWalls(turnChords(genome)))
  for (;;) {
    const gap = narrowestGap(sound)
    if (!gap || gap.gapM >= numbers.gapLeastM) return sound
    sound = withoutIdle(without(sound, new Set([gap.slot])))
  }
}

function withoutIdle(genome: PadGenome): PadGenome {
  return without(genome, idleSlots(cellOf(genome).walls))
}

function without(genome: PadGenome, slots: ReadonlySet<number>): PadGenome {
  const walls = genome.walls.map((kind, slot) => (slots.has(slot) ? 0 : kind))
  const braces = genome.braces.map((kind, i) => (slots.has(gridLines.length + i) ? none : kind))
  return { ...genome, walls, braces }
}

function turnChords(genome: PadGenome): PadGenome {
  const nodes = quarterNodes(genome)
  const [x, y] = nodes[4]!
  const braces = genome.braces.map((kind, i) => {
    if (kind !== chord) return kind
    const { corner, beside } = fields[i]!
    const [[ax, ay], [bx, by]] = [nodes[beside[0]]!, nodes[beside[1]]!]
    const [cx, cy] = nodes[corner]!
    const side = (px: number, py: number) => (bx - ax) * (py - ay) - (by - ay) * (px - ax)
    const lengthM = Math.sqrt((bx - ax) * (bx - ax) + (by - ay) * (by - ay))
    // Distance of the centre from the chord, positive on the side away from the corner.
    const away = (-side(x, y) * Math.sign(side(cx, cy))) / lengthM
    return away >= clearanceM ? kind : spoke
  })
  return { ...genome, braces }
}

function thinShortWalls(genome: PadGenome): PadGenome {
  const nodes = quarterNodes(genome)
  const walls = Int32Array.from(genome.walls)
  const braceWalls = Int32Array.from(genome.braceWalls)
  for (const { a, b, kind, slot } of quarterWalls(genome)) {
    const dx = nodes[b]![0] - nodes[a]![0]
    const dy = nodes[b]![1] - nodes[a]![1]
    const lengthM = Math.sqrt(dx * dx + dy * dy)
    let castable = kind
    while (castable > 1 && lengthM < numbers.slendernessLeast * thicknessOfM[castable]!) castable--
    if (slot < gridLines.length) walls[slot] = castable
    else braceWalls[slot - gridLines.length] = castable - 1
  }
  return { ...genome, walls, braceWalls }
}
