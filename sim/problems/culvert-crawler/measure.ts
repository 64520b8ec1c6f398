// What is told of a trial as numbers: the objectives and measures of every culvert crawler.

import { actuatorClasses } from '../../../shared/making/actuators.js'
import {
  type ActuatorFigures,
  actuatorFigures,
  actuatorMeasures,
  worstFigures,
} from '../../../shared/making/measures.js'
import type { SimulationOutcome } from '../../../shared/problem.js'
import type { Fault } from '../../lattice/advance.js'
import { actuatorTally } from '../../lattice/tally.js'
import type { Machine } from './machine.js'
import { numbers } from './numbers.js'
import { runTrials, type Surroundings, stepsOf, type Trial, type World } from './trial.js'

/** Highest value that is kept of the cost of transport: a body that stands still has none. */
const costMost = 10_000

export const objectives = {
  distance: { direction: 'maximise', unit: 'm' },
  material: { direction: 'minimise', unit: 'kg' },
} as const

/** The largest numbers of bays and actuators belong to the genome. */
export function measuresUpTo(bays: number, actuators: number) {
  return {
    puckTravel: { low: 0, high: 0.2, unit: 'm' },
    costOfTransport: { low: 0, high: costMost, unit: '1' },
    contactDuty: { low: 0, high: 1, unit: '1' },
    strutForce: { low: 0, high: 50, unit: 'N' },
    bays: { low: 2, high: bays, unit: '1' },
    actuators: { low: 0, high: actuators, unit: '1' },
    // The standard measures of the only class of actuators, of the hardest-worked one.
    ...actuatorMeasures(actuatorClasses.bellows),
  } as const
}

const sum = (values: Float64Array) => values.reduce((a, b) => a + b, 0)

/** Standard measures of every bellows, number by number the largest. */
function bellowsFigures({ members, passiveCount }: Machine, { tally }: Trial): ActuatorFigures {
  const secondsPerSample = 1 / (numbers.framesPerSecond * numbers.samplesPerFrame)
  return worstFigures(
    members
      .slice(passiveCount)
      .map(({ lengthM }, j) => actuatorFigures(actuatorTally(tally, j), lengthM, secondsPerSample)),
  )
}

function measure(machine: Machine, trial: Trial): SimulationOutcome {
  const { tally, startXM, startYM, endXM } = trial
  const { footNodes, puckNode, massKg, members, passiveCount } = machine
  const distance = endXM - startXM
  const weightN = massKg * numbers.gravityMps2
  const cost = distance > 0 ? sum(tally.workJ) / (weightN * distance) : costMost
  const contacts = footNodes.reduce((count, { node }) => count + tally.contacts[node]!, 0)
  return {
    objectives: { distance, material: machine.materialKg },
    measures: {
      puckTravel: Math.max(startYM, tally.highestM[puckNode]!) - Math.min(startYM, tally.lowestM[puckNode]!),
      costOfTransport: Math.min(costMost, cost),
      contactDuty: contacts / (tally.samples * footNodes.length),
      strutForce: tally.peakTensionN.reduce((a, b) => Math.max(a, b), 0),
      bays: machine.bays.length,
      actuators: members.length - passiveCount,
      ...bellowsFigures(machine, trial),
    },
  }
}

/** The outcome of a trial or of what ended it. */
export function outcomeOf(machine: Machine, result: Trial | Fault): SimulationOutcome {
  return 'reason' in result
    ? { failed: `${result.reason} at ${result.seconds.toFixed(2)} s` }
    : measure(machine, result)
}

export function simulateMachine<Condition extends Surroundings>(
  machine: Machine,
  world: World<Condition>,
  situations: readonly { readonly condition: Condition }[],
  divide = 1,
): SimulationOutcome[] {
  const conditions = situations.map(({ condition }) => condition)
  return runTrials(machine, world, conditions, divide).map((result) => outcomeOf(machine, result))
}

export function costOf<Condition extends Surroundings>(
  machine: Machine,
  { steepest }: World<Condition>,
): number {
  return unitsOf(machine.members.length, machine.positionsM.length, stepsOf(machine, steepest))
}

/** In units of 20,000 strut steps; a node costs about as much as two struts. */
export function unitsOf(struts: number, nodes: number, steps: number): number {
  return Math.max(1, Math.round(((struts + 2 * nodes) * steps) / 20_000))
}
