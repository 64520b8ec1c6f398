// The drives of the joints. The library has motors of its own but tells nobody what they do (and no sum of what is
// known afterwards gives their effort back: measured, it misses by several times), so these are ours: before each
// step an effort is worked out for every drive, put on b and, turned round, on a, and it stays for the step. What a
// drive did is therefore known and not inferred:
//
//   command   moves towards the target, at most rateMost * h a step; r is the rate at which it moved
//   effort    k (command - q') + d (r - v')   q', v' place and rate of the joint at the end of the step
//             clamped to +-effortMost; where effort * rate > powerMost, effort = powerMost / rate
//   work      effort * h * (rate before + rate after) / 2 (exact for a constant effort on a free joint)
//
// q' and v' are foreseen: all jointed bodies together take one linearly implicit step under their loads, their joints
// and the drives (mechanism.ts), so that a drive stays stable however stiff it is. What is not foreseen is contact and
// the ends of a joint's range: against those a drive pushes more softly than k says while the step is not small
// against d / k and sqrt(inertia / k).

import type { MotorSpec } from './spec.js'

export interface Drive {
  readonly spec: MotorSpec
  /** Where the drive is told to go. */
  target: number
  /** Rate told to a drive that only holds a rate (stiffness 0). */
  targetRate: number
  /** Where the command is now, and the rate at which it moves. */
  command: number
  commandRate: number
  effort: number
  /** Largest size of the effort so far. */
  peakEffort: number
  /** Largest power given to the joint so far, W. */
  peakPowerW: number
  /** Work given to the joint, J: all of it, and the positive part (no drive gives energy back). */
  workJ: number
  workGivenJ: number
}

export function startDrive(spec: MotorSpec, place: number): Drive {
  return {
    spec,
    target: place,
    targetRate: 0,
    command: place,
    commandRate: 0,
    effort: 0,
    peakEffort: 0,
    peakPowerW: 0,
    workJ: 0,
    workGivenJ: 0,
  }
}

const within = (value: number, most: number) => Math.max(-most, Math.min(most, value))

/** Moves the command on by one step of h seconds. */
export function moveCommand(drive: Drive, h: number): void {
  const { stiffness, rateMost } = drive.spec
  if (stiffness > 0) {
    const move = within(drive.target - drive.command, rateMost * h)
    drive.command += move
    drive.commandRate = move / h
  } else drive.commandRate = within(drive.targetRate, rateMost)
}

/** An effort within the drive's limits, at this rate of the joint. */
export function limited({ spec }: Drive, wanted: number, rate: number): number {
  const effort = within(wanted, spec.effortMost)
  return effort * rate > spec.powerMostW ? spec.powerMostW / rate : effort
}

/** Books what the effort did in the step that is over. */
export function bookWork(drive: Drive, rateBefore: number, rateAfter: number, h: number): void {
  const powerW = (drive.effort * (rateBefore + rateAfter)) / 2
  drive.workJ += powerW * h
  drive.workGivenJ += Math.max(0, powerW) * h
  drive.peakPowerW = Math.max(drive.peakPowerW, powerW)
  drive.peakEffort = Math.max(drive.peakEffort, Math.abs(drive.effort))
}
