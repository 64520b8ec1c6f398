// The standard measures of every actuator: peak force, stroke, power, duty. Problems declare them with
// actuatorMeasures() and fill them from tallies, so that the same word means the same number everywhere.
//
//   peakForce  largest |force| (N) or |torque| (N m)
//   stroke     longest minus shortest length over the rest length, or angle between the ends of travel (rad)
//   power      mean mechanical power that it delivers (W): what it is pushed gives nothing back
//   duty       share of time under load: |force| above a tenth of the class's limit (common practice, no source)
//
// ActuatorTally has the fields that a simulator's own tally of a strut can fill; addSample() fills one from samples.

import { check } from '../check.js'
import type { Measure } from '../problem.js'
import type { ActuatorClass } from './types.js'

/** Of a class's force, above which an actuator counts as loaded. */
export const loadedShare = 0.1

export interface ActuatorTally {
  peakForce: number
  /** Shortest and longest length, m, or ends of the angle, rad. */
  shortest: number
  longest: number
  /** Delivered, without what it takes back, J. */
  workJ: number
  loadedSamples: number
  samples: number
}

export function startTally(): ActuatorTally {
  return {
    peakForce: 0,
    shortest: Number.POSITIVE_INFINITY,
    longest: Number.NEGATIVE_INFINITY,
    workJ: 0,
    loadedSamples: 0,
    samples: 0,
  }
}

export interface ActuatorSample {
  /** Tension positive (N); or torque in the positive sense of the angle (N m). */
  readonly force: number
  /** m, or rad. */
  readonly length: number
  /** Of the length or angle, per second. */
  readonly speed: number
}

/**
 * Takes one sample in. A linear actuator in tension delivers power while it shortens (-force * speed), a rotary one
 * while it turns the way it pushes (force * speed).
 */
export function addSample(
  tally: ActuatorTally,
  { force, length, speed }: ActuatorSample,
  { motion, forceMost }: Pick<ActuatorClass, 'motion' | 'forceMost'>,
  secondsPerSample: number,
): void {
  const powerW = motion === 'linear' ? -force * speed : force * speed
  tally.peakForce = Math.max(tally.peakForce, Math.abs(force))
  tally.shortest = Math.min(tally.shortest, length)
  tally.longest = Math.max(tally.longest, length)
  tally.workJ += Math.max(0, powerW) * secondsPerSample
  if (Math.abs(force) > loadedShare * forceMost) tally.loadedSamples++
  tally.samples++
}

export interface ActuatorFigures {
  readonly peakForce: number
  readonly stroke: number
  readonly power: number
  readonly duty: number
}

/** The standard measures of one actuator; `rest`: rest length (m), or 1 where lengths are angles. */
export function actuatorFigures(
  { peakForce, shortest, longest, workJ, loadedSamples, samples }: Readonly<ActuatorTally>,
  rest: number,
  secondsPerSample: number,
): ActuatorFigures {
  check(rest > 0 && secondsPerSample > 0, 'rest length and time between samples are positive')
  if (samples === 0) return { peakForce: 0, stroke: 0, power: 0, duty: 0 }
  return {
    peakForce,
    stroke: (longest - shortest) / rest,
    power: workJ / (samples * secondsPerSample),
    duty: loadedSamples / samples,
  }
}

/** The hardest-worked of several actuators, number by number; all 0 without any. */
export function worstFigures(all: readonly ActuatorFigures[]): ActuatorFigures {
  const most = (name: keyof ActuatorFigures) => all.reduce((top, one) => Math.max(top, one[name]), 0)
  return { peakForce: most('peakForce'), stroke: most('stroke'), power: most('power'), duty: most('duty') }
}

/**
 * Declarations of the four measures for actuators of `row`, up to `lengthMostM` long; ranges are what the class can
 * do, twice its force and stroke (a simulated peak may overshoot a limit).
 */
export function actuatorMeasures(
  row: ActuatorClass,
  lengthMostM = row.lengthMostM,
): { readonly [name in keyof ActuatorFigures]: Measure } {
  const isLinear = row.motion === 'linear'
  const strokeMost = isLinear ? 4 * (row.strokeMost ?? 1) : 2 * Math.PI
  return {
    peakForce: { low: 0, high: 2 * row.forceMost, unit: isLinear ? 'N' : 'N m' },
    stroke: { low: 0, high: strokeMost, unit: isLinear ? '1' : 'rad' },
    power: { low: 0, high: isLinear ? row.powerMost * lengthMostM : row.powerMost, unit: 'W' },
    duty: { low: 0, high: 1, unit: '1' },
  }
}
