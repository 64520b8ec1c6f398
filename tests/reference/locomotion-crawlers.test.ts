// Crawlers and bounders with closed forms, on the lattice where it can express them.
//
// (a) two contacts with directional friction, quasi-static: physics-contact.test.ts.
// (b) two equal masses whose gap swings, small asymmetric Coulomb friction: Zimmermann, Zeidis, Steigenberger and Pivovarov,
//     An approach to worm-like motion, 2004 (abstract read: a constant mean speed exists). Derived by averaging:
//     V = A cos(pi F+ / (F+ + F-)), A the velocity amplitude of each mass.
// (d) the best contraction frequency of a viscoelastic crawler is its natural one (preprint 2410.17058, 2024, abstract read).
// (e) bounce and pitch of a body on two springy legs: any vibration handbook (from memory).

import { describe, expect, test } from 'vitest'
import { advance } from '../../sim/lattice/advance.js'
import { buildLattice, type Lattice } from '../../sim/lattice/build.js'
import { type EventOf, flow, startMotion } from '../../sim/ode/flow.js'
import { type Rates, rungeKutta4 } from '../../sim/ode/runge-kutta.js'
import { at, x } from './physics-bodies.js'

const gravity = 10

interface Pair {
  /** Stiffness and damping of the driven strut between two masses of 1 kg, 1 m apart. */
  readonly stiffnessNpm: number
  readonly dampingNspm: number
  readonly strain: number
  readonly hertz: number
  readonly forward: number
  readonly backward: number
  readonly stepSeconds: number
}

function pair({ stiffnessNpm, dampingNspm, strain, hertz, forward, backward, stepSeconds }: Pair): Lattice {
  const sink = gravity / 1e4
  return buildLattice({
    nodes: [0, 1].map((place) => ({
      positionM: [place, -sink],
      massKg: 1,
      friction: { forward, backward },
    })),
    struts: [],
    actuators: [
      {
        a: 0,
        b: 1,
        restM: 1,
        stiffnessNpm,
        dampingNspm,
        actuator: 'unlimited',
        group: 0,
        strain,
        phaseTurns: 0,
      },
    ],
    groups: [{ frequencyHz: hertz }],
    gravityMps2: [0, -gravity],
    ground: { firstXM: -50, spacingM: 100, heightsM: [0, 0] },
    contact: { stiffness: 1e4, damping: 1e5, exponent: 1, depthLimitM: 0.01 },
    stepSeconds,
  })
}

/** Mean speed of the middle over whole periods, after it has had time to become constant. */
function meanSpeed(lattice: Lattice, hertz: number, waitPeriods: number, periods: number): number {
  const steps = Math.round(1 / hertz / lattice.stepSeconds)
  const middle = () => (at(lattice, 0, x) + at(lattice, 1, x)) / 2
  const fault = advance(lattice, waitPeriods * steps)
  if (fault) throw new Error(fault.reason)
  const before = middle()
  advance(lattice, periods * steps)
  return (middle() - before) / (periods * steps * lattice.stepSeconds)
}

describe('two masses whose gap swings on ground of unequal friction', () => {
  // F- / F+, V / A.
  const rows = [
    [2, 0.5],
    [3, Math.SQRT1_2],
    [1.2, 0.142314838273],
  ] as const
  const hertz = 1
  // The gap's own frequency is 141 rad/s: it follows its command to 0.2 %, which is taken into account.
  const strain = 0.1
  const radps = 2 * Math.PI * hertz
  const magnification = 1 / (1 - (radps * radps) / 2e4)
  const amplitude = (strain * radps * magnification) / 2

  const speedOver = (ratio: number, mean: number) => {
    const forward = (2 * mean * amplitude * radps) / gravity / (1 + ratio)
    const body = {
      stiffnessNpm: 1e4,
      dampingNspm: 20,
      strain,
      hertz,
      forward,
      backward: ratio * forward,
      stepSeconds: 5e-4,
    }
    return meanSpeed(pair(body), hertz, Math.ceil(8 / mean), 40) / amplitude
  }

  test.each(rows)('F- = %d F+: they travel at %d A', (ratio, speed) => {
    // Within 0.5 % for friction up to 0.05 m A w.
    expect(speedOver(ratio, 0.05) / speed).toBeCloseTo(1, 2)
    expect(Math.abs(speedOver(ratio, 0.05) / speed - 1)).toBeLessThan(0.005)
  })

  test('equal friction both ways: they stay, and the less friction the nearer to the law', () => {
    expect(Math.abs(speedOver(1, 0.05))).toBeLessThan(2e-3)
    const error = (mean: number) => Math.abs(speedOver(3, mean) - Math.SQRT1_2)
    expect(error(0.05)).toBeLessThan(error(0.2))
  })
})

describe('a soft crawler', () => {
  test('is fastest when driven at its natural frequency', () => {
    // Natural frequency sqrt(2 k / m) = 2 pi, zeta = 0.1; velocity resonance of a damped mass is exactly there.
    const speedAt = (hertz: number, stepsPerPeriod: number) => {
      const stiffnessNpm = 2 * Math.PI * Math.PI
      const body = {
        stiffnessNpm,
        dampingNspm: (0.2 * stiffnessNpm) / (2 * Math.PI),
        strain: 0.02,
        hertz,
        forward: 2e-4,
        backward: 4e-4,
        stepSeconds: 1 / stepsPerPeriod / hertz,
      }
      return meanSpeed(pair(body), hertz, 500, 60)
    }
    const speeds = [0.6, 0.8, 0.9, 1, 1.1, 1.25, 1.5].map((hertz) => speedAt(hertz, 1_200))
    expect(speeds.indexOf(Math.max(...speeds))).toBe(3)
    // And the answer is that of (b): half the velocity amplitude, strain w / (2 zeta) / 2 for each mass, less what
    // friction of 1 % of the drive's force takes.
    const speed = speedAt(1, 4_800) / (0.5 * ((0.02 * 2 * Math.PI) / 0.2 / 2))
    expect(speed).toBeGreaterThan(0.96)
    expect(speed).toBeLessThan(1)
  })
})

describe('a body on two springy legs, 1 kg, 0.02 kg m^2, legs of 200 N/m at +-0.2 m', () => {
  // Height and angle of a body on vertical springs.
  const rates: Rates = (_seconds, [y, angle, vy, turning], rate) => {
    const lift = (side: number) => -200 * (y! + side * 0.2 * Math.sin(angle!))
    rate[0] = vy!
    rate[1] = turning!
    rate[2] = lift(1) + lift(-1)
    rate[3] = ((lift(1) - lift(-1)) * 0.2 * Math.cos(angle!)) / 0.02
  }
  const frequency = (start: readonly number[], place: number) => {
    const upwards: EventOf = { value: (_seconds, state) => state[place]!, direction: 1 }
    const motion = startMotion(rungeKutta4, rates, start, 1e-3)
    const first = flow(motion, 10, [upwards])!.seconds
    return (2 * Math.PI) / (flow(motion, 10, [upwards])!.seconds - first)
  }

  test('bounces at sqrt(2 k / m) = 20 and pitches at sqrt(2 k d^2 / I) = 28.284271247462 rad/s', () => {
    expect(frequency([1e-3, 0, 0, 0], 0)).toBeCloseTo(20, 6)
    expect(frequency([0, 1e-3, 0, 0], 1)).toBeCloseTo(28.284271247462, 4)
  })

  test('large pitch is slower: half the leaning, a quarter of the change', () => {
    const change = (angle: number) => 1 - frequency([0, angle, 0, 0], 1) / 28.284271247462
    expect(change(0.2) / change(0.1)).toBeCloseTo(4, 1)
  })
})
