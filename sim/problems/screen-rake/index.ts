// The screen rake as a problem: a linkage with motors that clears debris from an intake screen. What it is and which
// handbook cases stand behind it: README.md beside this file.

import { actuatorMeasures, worstFigures } from '../../../shared/making/measures.js'
import type { Situation } from '../../../shared/problem.js'
import { defineProblem } from '../../problem.js'
import { library } from '../../rigid/rigid2d.js'
import { type RakeGenome, rakeGenome } from './genome.js'
import { rakeParts, rakeProcess, rakeUse } from './making.js'
import { numbers } from './numbers.js'
import { describeRake, rakeCautions } from './paper.js'
import { repairRake } from './repair.js'
import { rakeFrames } from './replay.js'
import { drawIntake, type IntakeCondition } from './screen.js'
import { runTrial } from './trial.js'

/** Highest value that is kept of the work per mass, J/kg, and the mass below which a machine has cleared nothing. */
const perKgMost = 10_000
const kgLeast = 0.1
/** Of the strongest motor that is drawn. */
const torqueMostNm = numbers.motor.forceMost * numbers.strengthMost

/**
 * A machine that stands still needs neither energy nor torque and has cleared nothing: it gets the highest values, not
 * the lowest, or a search for low ones would breed idlers.
 */
function effortObjectives(clearedKg: number, energyJ: number, peakTorqueNm: number) {
  if (clearedKg < kgLeast) return { energy: perKgMost, peakTorque: torqueMostNm }
  return { energy: Math.min(perKgMost, energyJ / clearedKg), peakTorque: peakTorqueNm }
}

function simulateOne(genome: RakeGenome, { condition }: Situation<IntakeCondition>, divide = 1) {
  const result = runTrial(genome, condition, divide)
  if ('reason' in result) return { failed: `${result.reason} at ${result.seconds.toFixed(2)} s` }
  const { overLip, raised, totalKg, energyJ, peakTorqueNm, machineKg, motors } = result
  const cleared = (1 - numbers.raisedCounts) * overLip + numbers.raisedCounts * raised
  const { stroke, power, duty } = worstFigures(motors)
  return {
    objectives: { cleared, ...effortObjectives(cleared * totalKg, energyJ, peakTorqueNm) },
    measures: {
      overLip,
      raised,
      work: energyJ,
      clearedMass: overLip * totalKg,
      machineMass: machineKg,
      motors: motors.length,
      stroke,
      power,
      duty,
    },
  }
}

const { stroke, power, duty } = actuatorMeasures(numbers.motor)

export default defineProblem({
  name: 'screen-rake',
  // The library's version is part of the problem's: results of two versions are never taken for the same.
  version: `3+${library}`,
  summary: 'A motor-driven linkage rakes debris up an intake screen and over its lip into a trough.',
  genome: rakeGenome,
  objectives: {
    cleared: { direction: 'maximise', unit: '1' },
    energy: { direction: 'minimise', unit: 'J/kg' },
    peakTorque: { direction: 'minimise', unit: 'N m' },
  },
  measures: {
    overLip: { low: 0, high: 1, unit: '1' },
    raised: { low: 0, high: 1, unit: '1' },
    work: { low: 0, high: 2000, unit: 'J' },
    clearedMass: { low: 0, high: 40, unit: 'kg' },
    machineMass: { low: 0, high: 15, unit: 'kg' },
    motors: { low: 1, high: 3, unit: '1' },
    stroke,
    power,
    duty,
  },
  drawCondition: drawIntake,
  simulate: (genome, situations) => situations.map((situation) => simulateOne(genome, situation)),
  simulateFiner: (genome, situations, divide) =>
    situations.map((situation) => simulateOne(genome, situation, divide)),
  repair: repairRake,
  frames: rakeFrames,
  describe: describeRake,
  cautions: rakeCautions,
  process: rakeProcess,
  parts: rakeParts,
  use: rakeUse,
})
