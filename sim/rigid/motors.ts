// The drives of the joints. The library has motors of its own but tells nobody what they do (and no sum of what is
// known afterwards gives their effort back: measured, it misses by several times), so these are ours: before each
// step an effort is worked out for every drive, put on b and, turned round, on a, and it stays for the step. What a
// drive did is therefore known and not inferred:
//
//   command   moves towards the target at a rate r of at most rateMost, which changes by at most rampMost * h a step
//             and is such that it can still stop at the target, sqrt(2 rampMost |target - command|)
//   effort    k (command - q') + d (r - v')   q', v' place and rate of the joint at the end of the step
//             clamped to +-effortMost; where effort * rate > powerMost, effort = powerMost / rate (mean rate of the step)
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
  const { stiffness, rateMost, rampMost = Number.POSITIVE_INFINITY } = drive.spec
  const way = drive.target - drive.command
  let rate = within(drive.targetRate, rateMost)
  if (stiffness > 0) {
    const stopping = rampMost < Number.POSITIVE_INFINITY ? Math.sqrt(2 * rampMost * Math.abs(way)) : rateMost
    rate = within(way / h, Math.min(rateMost, stopping))
  }
  drive.commandRate += within(rate - drive.commandRate, rampMost * h)
  if (stiffness > 0) drive.command += drive.commandRate * h
}

/**
 * An effort within the drive's limits, where the joint has this rate before the step and, if the effort were `wanted`,
 * one after it that the law of the drive tells.
 */
export function limited(
  { spec, command, commandRate }: Drive,
  wanted: number,
  q: number,
  v: number,
  h: number,
): number {
  const { stiffness, damping, effortMost, powerMostW } = spec
  const after = (stiffness * (command - q) + damping * commandRate - wanted) / (damping + h * stiffness)
  const rate = (v + after) / 2
  const effort = within(wanted, effortMost)
  return effort * rate > powerMostW ? powerMostW / rate : effort
}

/** Books what the effort did in the step that is over. */
export function bookWork(drive: Drive, rateBefore: number, rateAfter: number, h: number): void {
  const powerW = (drive.effort * (rateBefore + rateAfter)) / 2
  drive.workJ += powerW * h
  drive.workGivenJ += Math.max(0, powerW) * h
  drive.peakPowerW = Math.max(drive.peakPowerW, powerW)
  drive.peakEffort = Math.max(drive.peakEffort, Math.abs(drive.effort))
}
