// One simulation: the walker is let go on a clean, stiff launch board, does its first step there undisturbed, and
// goes on down a ramp that is not quite even, with a nudge now and then.

import type { Stream } from '../../../shared/streams.js'
import { multipliersOf, strideDerivative } from './gaits.js'
import { type Fall, type Stance, type StepTaken, takeStep } from './model.js'
import { numbers } from './numbers.js'

/** Everything random about one walk. */
export interface Ramp {
  /** How much steeper than the ramp's own slope each further step is, rad. */
  readonly unevenness: readonly number[]
  /** How much the speed changes at the start of each further step, as a share of it. */
  readonly nudges: readonly number[]
}

/** Normal unevenness, cut off at three standard deviations: nobody walks here after an accident. */
export function drawRamp(stream: Stream): Ramp {
  const scatter = () => numbers.unevennessRad * Math.min(3, Math.max(-3, stream.normal()))
  const nudge = () => numbers.nudgeMost * (2 * stream.uniform() - 1)
  const further = numbers.stepsMost - 1
  const unevenness = Array.from({ length: further }, scatter)
  const nudges = Array.from({ length: further }, (_, i) =>
    (i + 1) % numbers.stepsPerNudge === 0 ? nudge() : 0,
  )
  return { unevenness, nudges }
}

export interface Walk {
  readonly starts: readonly Stance[]
  readonly slopes: readonly number[]
  readonly taken: readonly StepTaken[]
  readonly fall: Fall | undefined
}

/** Walks until it falls or has taken all its steps. */
export function walk(start: Stance, gamma: number, ramp: Ramp, stepSeconds: number = numbers.step): Walk {
  const starts: Stance[] = []
  const slopes: number[] = []
  const taken: StepTaken[] = []
  let before = start
  for (let i = 0; i < numbers.stepsMost; i++) {
    const now = i === 0 ? start : { ...before, thetaRate: before.thetaRate * (1 + ramp.nudges[i - 1]!) }
    const slope = i === 0 ? gamma : gamma + ramp.unevenness[i - 1]!
    starts.push(now)
    slopes.push(slope)
    const end = takeStep(now, slope, stepSeconds)
    if ('fell' in end) return { starts, slopes, taken, fall: end }
    taken.push(end)
    before = end.next
  }
  return { starts, slopes, taken, fall: undefined }
}

/** How far the state after the first step is from the one it started with, in the model's units. */
export function unsteadiness(start: Stance, next: Stance): number {
  const turned = next.theta - start.theta
  const rate = next.thetaRate - start.thetaRate
  const swing = next.phiRate - start.phiRate
  return Math.sqrt(turned * turned + rate * rate + swing * swing)
}

/** Largest multiplier of the stride map at the start, at most `multiplierMost`; that where a neighbour falls. */
export function multiplierAt({ theta, thetaRate }: Stance, gamma: number): number {
  const derivative = strideDerivative([theta, thetaRate], gamma, 1, numbers.step)
  if (!derivative) return numbers.multiplierMost
  return Math.min(numbers.multiplierMost, multipliersOf(derivative).largest)
}
