// The seal pad as a problem: a structured rubber pad, one unit cell repeated, toward a wanted Poisson's ratio and a
// wanted stiffness. What it is and which handbook cases stand behind it: README.md beside this file.

import { log } from '../../../shared/detmath/exponential.js'
import type { Problem, Situation } from '../../../shared/problem.js'
import { defineProblem } from '../../problem.js'
import { cellOf } from './cell.js'
import { type PadGenome, padGenome } from './genome.js'
import { padProcess, padUse, partsOf } from './making.js'
import { numbers } from './numbers.js'
import { cautionsOf, describePad } from './paper.js'
import { repairPad } from './repair.js'
import { padFrames } from './replay.js'
import { type CastingCondition, drawCasting, tryPad } from './trial.js'

/** The pair that a pad should have, and how far off is near. */
export interface Wanted {
  /** Poisson's ratio when squeezed along the pad's height, -(strain across) / (strain along). Below 0: draws in. */
  readonly poisson: number
  /** Young's modulus along the height, Pa. */
  readonly modulusPa: number
}

/**
 * Distance of a pair from the wanted one, each number in units of its tolerance: sqrt(((nu - wanted) / 0.1)^2 +
 * (ln(E / wanted) / 0.25)^2). Up to 1 is near.
 */
export function missOf(wanted: Wanted, poisson: number, modulusPa: number): number {
  const { tolerance } = numbers
  const a = (poisson - wanted.poisson) / tolerance.poisson
  const b = log(Math.max(modulusPa, 1) / wanted.modulusPa) / tolerance.logModulus
  return Math.min(missMost, Math.sqrt(a * a + b * b))
}

/** A pad that pushes back hardly at all (or not) misses by this. */
const missMost = 100

const clamp = (value: number, low: number, high: number) => Math.min(high, Math.max(low, value))

function simulateOne(
  wanted: Wanted,
  genome: PadGenome,
  { condition }: Situation<CastingCondition>,
  finer = 1,
) {
  const trial = tryPad(genome, condition, finer)
  if ('reason' in trial) return { failed: trial.reason }
  const { moduli, squeezed } = trial
  const poissonAtStrain = -squeezed.across / squeezed.along
  const modulusAtStrain = squeezed.stress / squeezed.along
  // A pad that is right at first touch and buckles before it is seated is no use, nor the other way round.
  const atFirst = missOf(wanted, moduli.nu21, moduli.e2)
  const seated = missOf(wanted, poissonAtStrain, modulusAtStrain)
  return {
    objectives: { miss: Math.max(atFirst, seated) },
    measures: {
      material: trial.materialKg,
      poisson: clamp(moduli.nu21, -5, 5),
      poissonAtStrain: clamp(poissonAtStrain, -5, 5),
      modulus: Math.min(moduli.e2, modulusMostPa),
      modulusAtStrain: clamp(modulusAtStrain, 0, modulusMostPa),
      modulusAcross: Math.min(moduli.e1, modulusMostPa),
      anisotropy: trial.anisotropy,
      density: Math.min(1, trial.density),
      wallStrain: trial.wallStrain,
      walls: cellOf(genome).walls.length,
    },
  }
}

const modulusMostPa = 20e6

/** The problem with other wishes, for plug-ins: `export default sealPad({ poisson: 0, modulusPa: 80e3 })`. */
export function sealPad(wanted: Wanted = numbers.wanted): Problem<typeof padGenome, CastingCondition> {
  return defineProblem({
    name: 'seal-pad',
    version: '3',
    summary: 'A rubber pad of repeated cells for a hatch seal, toward a wanted Poisson ratio and stiffness.',
    genome: padGenome,
    objectives: { miss: { direction: 'minimise', unit: '1' } },
    measures: {
      material: { low: 0, high: 2, unit: 'kg' },
      poisson: { low: -5, high: 5, unit: '1' },
      poissonAtStrain: { low: -5, high: 5, unit: '1' },
      modulus: { low: 0, high: modulusMostPa, unit: 'Pa' },
      modulusAtStrain: { low: 0, high: modulusMostPa, unit: 'Pa' },
      modulusAcross: { low: 0, high: modulusMostPa, unit: 'Pa' },
      anisotropy: { low: 0, high: 1, unit: '1' },
      density: { low: 0, high: 1, unit: '1' },
      wallStrain: { low: 0, high: 0.5, unit: '1' },
      walls: { low: 0, high: 48, unit: '1' },
    },
    drawCondition: drawCasting,
    simulate: (genome, situations) => situations.map((situation) => simulateOne(wanted, genome, situation)),
    simulateFiner: (genome, situations, divide) =>
      situations.map((situation) => simulateOne(wanted, genome, situation, divide)),
    // Measured: the time of a simulation grows about as the square of the number of walls, 12 to 48.
    expectedCost: (genome) => {
      const walls = cellOf(genome).walls.length
      return Math.max(1, Math.round((walls * walls) / 150))
    },
    repair: repairPad,
    frames: padFrames,
    describe: describePad,
    cautions: cautionsOf,
    process: padProcess,
    parts: partsOf,
    use: padUse,
  })
}

export default sealPad()
