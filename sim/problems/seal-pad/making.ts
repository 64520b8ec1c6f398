// What the workshop can make of a pad, and what a genome asks for: walls as rows of the stock table, the narrowest gap
// that a mould's core must fill, and what the pad is used for.

import type { Parts, Process, Use } from '../../../shared/making/types.js'
import { cellOf } from './cell.js'
import { distanceM, narrowestGap } from './gaps.js'
import { type PadGenome, quarterNodes, quarterWalls, thicknessOfM } from './genome.js'
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
    (sum, { a, b, kind }) => sum + distanceM(nodes[a]!, nodes[b]!) * thicknessOfM[kind]!,
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
 * times the rubber's plate modulus E / (1 - nu^2) (Voigt, 1889, from memory), so that its energy is at most half of
 * that times strain squared and volume.
 */
export function padUse(genome: PadGenome): Use {
  const { youngPa, poissonRatio: nu } = rubberOf(genome)
  const modulusMostPa = (rubberShareMost(genome) * youngPa) / (1 - nu * nu)
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
  const gap = narrowestGap(genome)
  return {
    struts: walls.map(({ a, b, kind }) => {
      const wallM = thicknessOfM[kind]!
      const row = numbers.stock.find((one) => one.material === rubber && one.wallM === wallM)!
      return { name: `wall ${a + 1} to ${b + 1}`, stock: row.name, lengthM: distanceM(nodes[a]!, nodes[b]!) }
    }),
    ...(gap ? { gaps: [{ name: gap.name, thicknessM: gap.gapM }] } : {}),
    // Whole cells that fit.
    envelopeM: [
      Math.floor(length / cell.widthM + 1e-9) * cell.widthM,
      Math.floor(height / cell.heightM + 1e-9) * cell.heightM,
      depth,
    ],
    massKg: massMostKg(genome),
  }
}
