// The simplest walking model, in its own units (leg length, gravity and hip mass are 1): two massless rigid legs, a
// point mass at the hip and vanishing ones at the feet, on a ramp of slope gamma. Garcia, Chatterjee, Ruina and
// Coleman, The simplest walking model: stability, complexity, and scaling, 1998.
//
//   stance leg   theta, from the ramp's normal; falls forwards as theta falls     theta'' = sin(theta - gamma)
//   swing leg    phi, from the stance leg          phi'' = theta'' + theta'^2 sin phi - cos(theta - gamma) sin phi
//
// The swing foot is at the height of the ramp where phi = 2 theta. It passes through the ramp while the legs pass
// each other (straight legs of one length scuff); the model ignores that, and takes the later passage, downwards, as
// the heel strike: phi - 2 theta grows through zero and theta < 0. The passage where it falls is the scuff, even
// where theta is below zero by then. At heel strike the legs change their roles and the hip loses the part of its
// velocity along the new stance leg:
//   theta+ = -theta   theta'+ = cos 2theta theta'   phi+ = -2 theta   phi'+ = cos 2theta (1 - cos 2theta) theta'

import { cos, sin } from '../../../shared/detmath/trigonometry.js'
import { type EventOf, flow, type Motion, startMotion } from '../../ode/flow.js'
import { type Rates, rungeKutta4 } from '../../ode/runge-kutta.js'

/** State just after a heel strike; phi is 2 theta there. Angles rad, rates rad / sqrt(leg / gravity). */
export interface Stance {
  readonly theta: number
  readonly thetaRate: number
  readonly phiRate: number
}

/** A step that ended in a heel strike. */
export interface StepTaken {
  /** The next step's start. */
  readonly next: Stance
  /** sqrt(leg / gravity). */
  readonly period: number
}
export interface Fall {
  readonly fell: string
  readonly period: number
}

/** Equations of motion on a ramp of slope `gamma`: theta, theta', phi, phi'. */
export function walkingRates(gamma: number): Rates {
  return (_seconds, state, rate) => {
    const lean = state[0]! - gamma
    const turning = state[1]!
    const sinPhi = sin(state[2]!)
    const gaining = sin(lean)
    rate[0] = turning
    rate[1] = gaining
    rate[2] = state[3]!
    rate[3] = gaining + (turning * turning - cos(lean)) * sinPhi
  }
}

/** Steps of the known gaits take less than 5. */
const periodMost = 12

const heelStrike: EventOf = {
  value: (_seconds, state) => state[2]! - 2 * state[0]!,
  direction: 1,
  counts: (_seconds, state) => state[0]! < 0,
}

/** What the stance leg carries, in weights of the hip. A leg can push but not pull: every fall ends with none. */
export function loadOf(gamma: number, state: Float64Array): number {
  return cos(state[0]! - gamma) - state[1]! * state[1]!
}

/** The motion of one step from its start, for replays; `endStep` says when it is over. */
export function startStep(start: Stance, gamma: number, stepSeconds: number): Motion {
  const { theta, thetaRate, phiRate } = start
  return startMotion(rungeKutta4, walkingRates(gamma), [theta, thetaRate, 2 * theta, phiRate], stepSeconds)
}

/** Moves on until the step ends or until `until`; nothing when it goes on after that. */
export function endStep(motion: Motion, gamma: number, until = periodMost): StepTaken | Fall | undefined {
  const load: EventOf = { value: (_seconds, state) => loadOf(gamma, state), direction: -1 }
  const happening = flow(motion, until, [heelStrike, load])
  const period = motion.seconds
  if (!happening) return until < periodMost ? undefined : { fell: 'stood still', period }
  if (happening.event === 0) return { next: afterStrike(motion.state), period }
  return { fell: motion.state[0]! > gamma ? 'fell backwards' : 'fell forwards', period }
}

function afterStrike(state: Float64Array): Stance {
  const kept = cos(2 * state[0]!)
  const thetaRate = kept * state[1]!
  return { theta: -state[0]!, thetaRate, phiRate: (1 - kept) * thetaRate }
}

/** One whole step: the stride map. */
export function takeStep(start: Stance, gamma: number, stepSeconds: number): StepTaken | Fall {
  // A step that ends at periodMost has an end in any case.
  return endStep(startStep(start, gamma, stepSeconds), gamma)!
}

/** A start as it is after any heel strike, where theta and its rate say all. */
export function stanceAfterStrike(theta: number, thetaRate: number): Stance {
  return { theta, thetaRate, phiRate: (1 - cos(2 * theta)) * thetaRate }
}
