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

export interface Wanted {
  /** Poisson's ratio when squeezed along the pad's height, -(strain across) / (strain along). Below 0: draws in. */
  readonly poisson: number
  /** Young's modulus along the height, Pa. */
  readonly modulusPa: number
}

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
  const worse = (miss: (value: number) => number, atFirst: number, atStrain: number) =>
    Math.max(miss(atFirst), miss(atStrain))
  return {
    objectives: {
      poissonMiss: worse((nu) => Math.abs(nu - wanted.poisson), moduli.nu21, poissonAtStrain),
      stiffnessMiss: worse(
        (e) => Math.min(missMost, Math.abs(log(Math.max(e, 1) / wanted.modulusPa))),
        moduli.e2,
        modulusAtStrain,
      ),
      material: trial.materialKg,
    },
    measures: {
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
/** A pad that pushes back hardly at all (or not) misses the stiffness by this. */
const missMost = 20

/** The problem with other wishes, for plug-ins: `export default sealPad({ poisson: 0, modulusPa: 80e3 })`. */
export function sealPad(wanted: Wanted = numbers.wanted): Problem<typeof padGenome, CastingCondition> {
  return defineProblem({
    name: 'seal-pad',
    version: '2',
    summary: 'A rubber pad of repeated cells for a hatch seal, toward a wanted Poisson ratio and stiffness.',
    genome: padGenome,
    objectives: {
      poissonMiss: { direction: 'minimise', unit: '1' },
      stiffnessMiss: { direction: 'minimise', unit: '1' },
      material: { direction: 'minimise', unit: 'kg' },
    },
    measures: {
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
