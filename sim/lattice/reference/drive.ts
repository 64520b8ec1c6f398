// The drive at a new time: the rotors (sine and cosine) of the drive groups, how far the drive has grown, and the nodes
// that are moved along a path.

import { cos, sin } from '../../../shared/detmath/trigonometry.js'
import { freshEverySteps, type Lattice } from '../layout.js'

type Frequencies = Pick<Lattice, 'angularRadps' | 'sweepRadps2' | 'sweepSteps' | 'stepSeconds'>

/**
 * Phase of a group after `since` steps of driving, rad: w t; with a sweep w t + a t^2 / 2 up to its end T, then
 * (phase at T) + (w + a T)(t - T).
 */
export function phaseAt(frequencies: Frequencies, g: number, since: number): number {
  const { angularRadps, sweepRadps2, sweepSteps, stepSeconds } = frequencies
  const steady = angularRadps[g]! * since * stepSeconds
  if (sweepSteps[g] === 0) return steady
  const sweeping = Math.min(since, sweepSteps[g]!) * stepSeconds
  const left = (since - Math.min(since, sweepSteps[g]!)) * stepSeconds
  return steady + sweepRadps2[g]! * sweeping * (0.5 * sweeping + left)
}

/** The angle of the step that follows `since`, rad: exact, as the difference of phaseAt(), at every step of a sweep. */
export function turnAt(frequencies: Frequencies, g: number, since: number): number {
  const { angularRadps, sweepRadps2, sweepSteps, stepSeconds } = frequencies
  const steady = angularRadps[g]! * stepSeconds
  if (sweepSteps[g] === 0) return steady
  const middle = since < sweepSteps[g]! ? since + 0.5 : sweepSteps[g]!
  return steady + sweepRadps2[g]! * (middle * stepSeconds) * stepSeconds
}

/** Fresh sines from detmath, so that neither the recurrence of the rotors nor that of a sweep drifts. */
function refresh(lattice: Lattice, g: number, since: number): void {
  const { rotors, rotation } = lattice
  const phase = phaseAt(lattice, g, since)
  rotors[2 * g] = sin(phase)
  rotors[2 * g + 1] = cos(phase)
  if (lattice.sweepSteps[g] === 0) return
  const turn = turnAt(lattice, g, since)
  rotation[2 * g] = sin(turn)
  rotation[2 * g + 1] = cos(turn)
}

/** Turns the pair (sine, cosine) at `at` of `pairs` on by the angle whose pair is at `at` of `by`. */
function turnPair(pairs: Float64Array, by: Float64Array, at: number): void {
  const s = pairs[at]!
  const c = pairs[at + 1]!
  const ds = by[at]!
  const dc = by[at + 1]!
  pairs[at] = s * dc + c * ds
  pairs[at + 1] = c * dc - s * ds
}

/** To be called after every step with the number of steps since the drive started, from 0 on. */
export function turnDrive(
  since: number,
  groupCount: number,
  rampSteps: number,
  rotors: Float64Array,
  rotation: Float64Array,
  rotationTurn: Float64Array,
  sweepSteps: Int32Array,
  driven: Float64Array,
  lattice: Lattice,
): void {
  for (let g = 0; g < groupCount; g++) {
    const sweep = sweepSteps[g]!
    if (since % freshEverySteps === 0 || (since === sweep && since > 0)) {
      refresh(lattice, g, since)
    } else {
      turnPair(rotors, rotation, 2 * g)
      if (since < sweep) turnPair(rotation, rotationTurn, 2 * g)
    }
  }
  const grown = since >= rampSteps ? 1 : since / rampSteps
  for (let i = 0; i < 2 * groupCount; i++) driven[i] = rotors[i]! * grown
}

/** position = start + amplitude * sin(phase + own phase); the speed is the one that leads there in one step. */
export function movePrescribed(lattice: Lattice): void {
  const { dimensions, prescribedCount, prescribedEnds, prescribedGroup, prescribedStartM } = lattice
  const { prescribedAmplitudeM, prescribedCos, prescribedSin, driven, nodes, stepSeconds } = lattice
  for (let n = 0; n < prescribedCount; n++) {
    const o = prescribedEnds[n]!
    const g = prescribedGroup[n]!
    const swing = driven[g]! * prescribedCos[n]! + driven[g + 1]! * prescribedSin[n]!
    for (let i = 0; i < dimensions; i++) {
      const next = prescribedStartM[dimensions * n + i]! + prescribedAmplitudeM[dimensions * n + i]! * swing
      nodes[o + dimensions + i] = (next - nodes[o + i]!) / stepSeconds
      nodes[o + i] = next
    }
  }
}
