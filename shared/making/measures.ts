// The standard measures of every actuator: peak force, stroke, power, duty. Problems declare them with
// actuatorMeasures() and fill them from tallies, so that the same word means the same number everywhere.
//
//   peakForce   largest |force| (N) or |torque| (N m)
//   stroke      largest minus smallest length over the rest length (share), or angle travelled between stops (rad)
//   peakPower   largest mechanical power that it delivers, W: force times the speed with which it shortens or turns
//   duty        share of time under load: |force| above a tenth of the class's limit (common practice, no source)

import { check } from '../check.js'
import type { Measure } from '../problem.js'
import type { ActuatorClass } from './types.js'

/** Of a class's force, above which an actuator counts as loaded. */
export const loadedShare = 0.1

export interface ActuatorTally {
  peakForce: number
  lengthLeast: number
  lengthMost: number
  peakPowerW: number
  loadedSamples: number
  samples: number
  /** Delivered, without what it takes back, J. */
  positiveWorkJ: number
}

export function startTally(): ActuatorTally {
  return {
    peakForce: 0,
    lengthLeast: Number.POSITIVE_INFINITY,
    lengthMost: Number.NEGATIVE_INFINITY,
    peakPowerW: 0,
    loadedSamples: 0,
    samples: 0,
    positiveWorkJ: 0,
  }
}

/**
 * Takes one sample in. `force`: tension positive (N), or torque (N m); `length`: m, or angle in rad; `speed`: of
 * lengthening (m/s), or of turning against the torque's sense (rad/s), so that power delivered is -force * speed.
 */
export function addSample(
  tally: ActuatorTally,
  force: number,
  length: number,
  speed: number,
  secondsPerSample: number,
  forceMost: number,
): void {
  const size = Math.abs(force)
  const powerW = -force * speed
  if (size > tally.peakForce) tally.peakForce = size
  if (length < tally.lengthLeast) tally.lengthLeast = length
  if (length > tally.lengthMost) tally.lengthMost = length
  if (powerW > tally.peakPowerW) tally.peakPowerW = powerW
  if (powerW > 0) tally.positiveWorkJ += powerW * secondsPerSample
  if (size > loadedShare * forceMost) tally.loadedSamples++
  tally.samples++
}

export interface ActuatorFigures {
  readonly peakForce: number
  readonly stroke: number
  readonly peakPower: number
  readonly duty: number
}

/** The standard measures of one actuator; `rest`: rest length (m), or 1 where lengths are angles. */
export function actuatorFigures(tally: Readonly<ActuatorTally>, rest: number): ActuatorFigures {
  check(rest > 0, 'a rest length is positive')
  const { samples, lengthLeast, lengthMost, peakForce, peakPowerW, loadedSamples } = tally
  if (samples === 0) return { peakForce: 0, stroke: 0, peakPower: 0, duty: 0 }
  return {
    peakForce,
    stroke: (lengthMost - lengthLeast) / rest,
    peakPower: peakPowerW,
    duty: loadedSamples / samples,
  }
}

/** The hardest-worked of several actuators, number by number; all 0 without any. */
export function worstFigures(all: readonly ActuatorFigures[]): ActuatorFigures {
  const most = (pick: (one: ActuatorFigures) => number) =>
    all.reduce((top, one) => Math.max(top, pick(one)), 0)
  return {
    peakForce: most((one) => one.peakForce),
    stroke: most((one) => one.stroke),
    peakPower: most((one) => one.peakPower),
    duty: most((one) => one.duty),
  }
}

/**
 * Declarations of the four measures for actuators of `row`, up to `lengthMostM` long; ranges are what the class can
 * do, twice its force and power (a simulated peak may overshoot a limit).
 */
export function actuatorMeasures(
  row: ActuatorClass,
  lengthMostM = row.lengthMostM,
): { readonly [name in keyof ActuatorFigures]: Measure } {
  const isLinear = row.motion === 'linear'
  const powerMostW = isLinear ? row.powerMost * lengthMostM : row.powerMost
  return {
    peakForce: { low: 0, high: 2 * row.forceMost, unit: isLinear ? 'N' : 'N m' },
    stroke: {
      low: 0,
      high: isLinear ? 2 * (row.strokeMost ?? 1) : 2 * Math.PI,
      unit: isLinear ? '1' : 'rad',
    },
    peakPower: { low: 0, high: 2 * powerMostW, unit: 'W' },
    duty: { low: 0, high: 1, unit: '1' },
  }
}
