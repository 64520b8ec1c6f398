// What the workshop can make of a pad, and what a genome asks for: walls as rows of the stock table, the narrowest gap
// that a mould's core must fill, and what the pad is used for.

import type { Parts, Process, Use } from '../../../shared/making/types.js'
import { cellOf } from './cell.js'
import { type PadGenome, type QuarterWall, quarterNodes, quarterWalls, thicknessOfM } from './genome.js'
import { numbers } from './numbers.js'

const { length, height, depth } = numbers.padM

export const padProcess: Process = {
  name: 'silicone rubber cast in a machined mould',
  methods: ['machining', 'moulding'],
  stock: numbers.stock,
  actuators: [],
  wallLeastM: numbers.wallsM.thin,
  gapLeastM: numbers.gapLeastM,
  envelopeM: [length, height, depth],
}

/** At most this share of the pad is rubber: walls on mirror lines, and joints, are counted twice. */
function rubberShareMost(genome: PadGenome): number {
  const nodes = quarterNodes(genome)
  const wallsM2 = quarterWalls(genome).reduce(
    (sum, { a, b, kind }) => sum + distance(nodes[a]!, nodes[b]!) * thicknessOfM[kind]!,
    0,
  )
  return Math.min(1, wallsM2 / (numbers.quarterWidthM * genome.height[0]!))
}

const rubberOf = (genome: PadGenome) => numbers.rubbers[genome.rubber[0]!]!

function massMostKg(genome: PadGenome): number {
  return rubberOf(genome).densityKgpm3 * rubberShareMost(genome) * length * height * depth
}

/**
 * Stands still in a wet place and holds no energy but its own squeeze. No pad is stiffer than its share of rubber
 * times the rubber (Voigt, 1889, from memory), so that its energy is at most half of that times strain squared and
 * volume.
 */
export function padUse(genome: PadGenome): Use {
  const modulusMostPa = rubberShareMost(genome) * rubberOf(genome).youngPa
  const squeeze = numbers.workingSqueeze
  return {
    places: ['wet-room'],
    wetted: 'drinking-water',
    energy: ['none'],
    gasPressurePa: 0,
    gasVolumeM3: 0,
    liquidPressurePa: 0,
    storedElasticJ: 0.5 * modulusMostPa * squeeze * squeeze * length * height * depth,
    suspendedKg: 0,
    suspendedHeightM: 0,
    movingParts: false,
    peakForceN: modulusMostPa * squeeze * length * depth,
    rotationHz: 0,
    voltageV: 0,
    battery: 'none',
    hottestC: 25,
    massKg: massMostKg(genome),
    onRunningMachine: false,
    vibrationHz: 0,
    upstreamOfPump: false,
  }
}

/** Walls of one quarter (the others mirror it) by their stock row, and the narrowest gap. */
export function partsOf(genome: PadGenome): Parts {
  const nodes = quarterNodes(genome)
  const walls = quarterWalls(genome)
  const rubber = rubberOf(genome)
  const cell = cellOf(genome)
  const gap = narrowestGap(genome, walls)
  return {
    struts: walls.map(({ a, b, kind }) => {
      const wallM = thicknessOfM[kind]!
      const row = numbers.stock.find((one) => one.material === rubber && one.wallM === wallM)!
      return { name: `wall ${a + 1} to ${b + 1}`, stock: row.name, lengthM: distance(nodes[a]!, nodes[b]!) }
    }),
    ...(gap ? { gaps: [gap] } : {}),
    // Whole cells that fit.
    envelopeM: [
      Math.floor(length / cell.widthM + 1e-9) * cell.widthM,
      Math.floor(height / cell.heightM + 1e-9) * cell.heightM,
      depth,
    ],
    massKg: massMostKg(genome),
  }
}

type Place = readonly [number, number]

function distance(a: Place, b: Place): number {
  return Math.sqrt((a[0] - b[0]) * (a[0] - b[0]) + (a[1] - b[1]) * (a[1] - b[1]))
}

/** Distance of a point from the segment a b. */
function toSegment(p: Place, a: Place, b: Place): number {
  const [dx, dy] = [b[0] - a[0], b[1] - a[1]]
  const along = ((p[0] - a[0]) * dx + (p[1] - a[1]) * dy) / (dx * dx + dy * dy)
  const t = Math.min(1, Math.max(0, along))
  return distance(p, [a[0] + t * dx, a[1] + t * dy])
}

/** Narrowest clear gap between walls that share no node, mirror images included; walls of one quarter never cross. */
function narrowestGap(genome: PadGenome, walls: readonly QuarterWall[]) {
  const nodes = quarterNodes(genome)
  let narrowest: { name: string; thicknessM: number } | undefined
  const offer = (thicknessM: number, name: () => string) => {
    if (!narrowest || thicknessM < narrowest.thicknessM) narrowest = { name: name(), thicknessM }
  }
  for (const [i, wall] of walls.entries()) {
    const [a, b] = [nodes[wall.a]!, nodes[wall.b]!]
    const t = thicknessOfM[wall.kind]!
    const name = `wall ${wall.a + 1} to ${wall.b + 1}`
    for (const other of walls.slice(i + 1)) {
      if ([other.a, other.b].some((node) => node === wall.a || node === wall.b)) continue
      const [c, d] = [nodes[other.a]!, nodes[other.b]!]
      const apart = Math.min(toSegment(a, c, d), toSegment(b, c, d), toSegment(c, a, b), toSegment(d, a, b))
      offer(
        apart - (t + thicknessOfM[other.kind]!) / 2,
        () => `${name} to wall ${other.a + 1} to ${other.b + 1}`,
      )
    }
    for (const apart of fromMirrors(genome, a, b)) {
      if (apart > 0) offer(2 * apart - t, () => `${name} to its mirror image`)
    }
  }
  return narrowest
}

/** How far a wall stays from the four mirror lines; 0 where it touches one. */
function fromMirrors(genome: PadGenome, a: Place, b: Place): number[] {
  const [w, h] = [numbers.quarterWidthM, genome.height[0]!]
  return [Math.min(a[0], b[0]), w - Math.max(a[0], b[0]), Math.min(a[1], b[1]), h - Math.max(a[1], b[1])]
}
