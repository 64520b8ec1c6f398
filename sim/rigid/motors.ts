// The drive of a joint. The library has motors of its own but tells nobody what they do, so these are ours: before
// each step an effort is worked out, put on b and, turned round, on a, and it stays for the step. What a motor did is
// therefore known and not inferred:
//
//   command   moves towards the target, at most rateMost * h a step; r is the rate at which it moved
//   effort    (k (command - q - h v) + d (r - v)) / (1 + (k h + d) h / J)     q place of the joint, v its rate
//             clamped to +-effortMost; where effort * v > powerMost, effort = powerMost / v
//   work      effort * h * (rate before + rate after) / 2 (exact for a constant effort on a free joint)
//
// The effort is the answer of a linearly implicit step for a joint of inertia J: with k and d as large as one likes
// the drive stays stable, it only becomes softer than they say. (Linearly implicit integration of a spring and
// dashpot: Baraff and Witkin, Large steps in cloth simulation, 1998, from memory.) J is the least inertia that the
// joint can have: 1 / (wa + wb), w the sum of 1/I over a body's motors, I its moment about its own centre, or about
// the pin where the other body of a hinge is fixed; constraints only add to it.

import type { MotorSpec } from './spec.js'

export interface Drive {
  readonly spec: MotorSpec
  /** J above: kg m^2 in a hinge, kg in a slider. */
  readonly inertia: number
  /** Where the drive is told to go; not finite for a drive that only holds a rate. */
  target: number
  /** Rate told to a drive that only holds a rate (stiffness 0). */
  targetRate: number
  /** Where the command is now. */
  command: number
  effort: number
  /** Largest size of the effort so far. */
  peakEffort: number
  /** Largest power given to the joint so far, W. */
  peakPowerW: number
  /** Work given to the joint, J: all of it, and the positive part (no drive gives energy back). */
  workJ: number
  workGivenJ: number
}

export function startDrive(spec: MotorSpec, inertia: number, place: number): Drive {
  return {
    spec,
    inertia,
    target: place,
    targetRate: 0,
    command: place,
    effort: 0,
    peakEffort: 0,
    peakPowerW: 0,
    workJ: 0,
    workGivenJ: 0,
  }
}

const within = (value: number, most: number) => Math.max(-most, Math.min(most, value))

/** Works out the effort of the coming step of h seconds, from place q and rate v of the joint. */
export function decideEffort(drive: Drive, q: number, v: number, h: number): number {
  const { stiffness: k, damping: d, effortMost, rateMost, powerMostW } = drive.spec
  let rate = within(drive.targetRate, rateMost)
  if (k > 0) {
    const move = within(drive.target - drive.command, rateMost * h)
    drive.command += move
    rate = move / h
  }
  const wanted = k > 0 ? k * (drive.command - q - h * v) + d * (rate - v) : d * (rate - v)
  let effort = within(wanted / (1 + ((k * h + d) * h) / drive.inertia), effortMost)
  if (effort * v > powerMostW) effort = powerMostW / v
  drive.effort = effort
  drive.peakEffort = Math.max(drive.peakEffort, Math.abs(effort))
  return effort
}

/** Books what the effort did in the step that is over. */
export function bookWork(drive: Drive, rateBefore: number, rateAfter: number, h: number): void {
  const powerW = (drive.effort * (rateBefore + rateAfter)) / 2
  drive.workJ += powerW * h
  drive.workGivenJ += Math.max(0, powerW) * h
  drive.peakPowerW = Math.max(drive.peakPowerW, powerW)
}
