// Measuring tools on bodies that move: what they read must be what handbooks say of the motion. Vibrations: Harris and
// Piersol, Harris' shock and vibration handbook, 2002 (from memory); transmissibility: Ogata, System dynamics, 2004,
// eq. 9-14 (as cited by others). All numbers were recomputed independently of this code.

import { describe, expect, test } from 'vitest'
import { advance } from '../../sim/lattice/advance.js'
import type { Lattice } from '../../sim/lattice/build.js'
import type { LatticeSpec } from '../../sim/lattice/spec.js'
import { openBudget, reportBudget, sampleBudget } from '../../sim/measure/energy.js'
import { newForceRecord, peakForceN, rmsForceN, takeForces } from '../../sim/measure/forces.js'
import { dominantTone } from '../../sim/measure/spectrum.js'
import { toneAt } from '../../sim/measure/tones.js'
import { sweptTransmissibility, transmissibility } from '../../sim/measure/transmissibility.js'
import { at, chain, orderOf, oscillator, record, x, y } from './physics-bodies.js'

const turn = 2 * Math.PI
const relative = (value: number, truth: number) => Math.abs(value / truth - 1)

/** Two signals of one run, a value each after every step. */
function recordTwo(lattice: Lattice, steps: number, nodes: readonly [number, number]) {
  const [first, second] = [new Float64Array(steps), new Float64Array(steps)]
  for (let i = 0; i < steps; i++) {
    advance(lattice, 1)
    first[i] = at(lattice, nodes[0], x)
    second[i] = at(lattice, nodes[1], x)
  }
  return [first, second] as const
}

/** Same run with a budget, sampled after every step. */
function budgetOf(lattice: Lattice, steps: number) {
  const budget = openBudget(lattice)
  for (let i = 0; i < steps; i++) {
    const fault = advance(lattice, 1)
    if (fault) throw new Error(fault.reason)
    sampleBudget(lattice, budget)
  }
  return reportBudget(lattice, budget)
}

describe('a mass on a shaken base, w0 = 10 rad/s', () => {
  const shaken = (r: number, zeta: number, h: number, rest?: Partial<LatticeSpec>) =>
    oscillator(1, 100, 20 * zeta, h, {
      groups: [{ frequencyHz: (10 * r) / turn }],
      prescribed: [{ node: 0, group: 0, amplitudeM: [0.01, 0], phaseTurns: 0 }],
      ...rest,
    })
  const measured = (r: number, zeta: number, h: number) => {
    const lattice = shaken(r, zeta, h)
    advance(lattice, Math.round(12 / (10 * zeta) / h))
    const [base, mass] = recordTwo(lattice, Math.round((5.3 * turn) / (10 * r) / h), [0, 1])
    return transmissibility(base, mass, h, (10 * r) / turn)
  }

  test.each([
    [0.5, 0.1, 1.328228949],
    [0.9, 0.1, 3.882207213],
    [1, 0.1, 5.099019514],
    [Math.SQRT2, 0.1, 1],
    [2, 0.1, 0.355861707],
    [3, 0.1, 0.14536553],
    [1, 0.05, 10.049875621],
    [1.5, 0.2, 0.841078013],
    [2, 0.5, 0.620173673],
  ])('r = %d, zeta %d: %d of the shaking arrives, and the motion is steady', (r, zeta, truth) => {
    const found = measured(r, zeta, 1e-4)
    expect(relative(found.ratio, truth)).toBeLessThan(1e-3)
    expect(found.drift).toBeLessThan(1e-3)
    // Phase of (1 + 2 i zeta r) / (1 - r^2 + 2 i zeta r).
    const phase = Math.atan2(2 * zeta * r, 1) - Math.atan2(2 * zeta * r, 1 - r * r)
    expect(Math.abs(found.phaseTurns - phase / turn)).toBeLessThan(1e-3)
  })

  test('the error is of first order in the step', () => {
    const error = (h: number) => Math.abs(measured(1, 0.1, h).ratio - 5.099019513592784)
    expect(Math.abs(orderOf(error(2e-3), error(1e-3)) - 1)).toBeLessThan(0.1)
  })

  test('the strut carries m w^2 X at its peak and that over sqrt 2 in the mean square', () => {
    const [r, zeta, h] = [2, 0.1, 1e-4]
    const lattice = shaken(r, zeta, h)
    advance(lattice, Math.round(12 / h))
    const forces = newForceRecord(lattice)
    for (let i = 0; i < Math.round((4 * turn) / (10 * r) / h); i++) {
      advance(lattice, 1)
      takeForces(lattice, forces)
    }
    const truth = 400 * 0.01 * 0.355861707
    expect(relative(peakForceN(forces, 0), truth)).toBeLessThan(1e-3)
    expect(relative(rmsForceN(forces, 0), truth / Math.SQRT2)).toBeLessThan(1e-3)
    expect(relative(forces.tensionN[0]!, forces.thrustN[0]!)).toBeLessThan(1e-3)
  })

  test('a drive that stops too early for the start-up to die away is called unsteady', () => {
    const lattice = shaken(0.9, 0.01, 1e-3)
    const [base, mass] = recordTwo(lattice, 3000, [0, 1])
    expect(transmissibility(base, mass, 1e-3, 9 / turn).drift).toBeGreaterThan(0.1)
  })

  test('coasting down through resonance shows the whole curve at once', () => {
    const zeta = 0.1
    const h = 5e-4
    const lattice = shaken(1, zeta, h, { groups: [{ frequencyHz: 5, sweep: { toHz: 0, seconds: 100 } }] })
    const [base, mass] = recordTwo(lattice, Math.round(112 / h), [0, 1])
    const points = sweptTransmissibility(base, mass, h, 0.3, 4)
    expect(points.length).toBeGreaterThan(200)
    for (const { frequencyHz, ratio } of points) {
      const r = (turn * frequencyHz) / 10
      const below = (1 - r * r) ** 2 + (2 * zeta * r) ** 2
      expect(relative(ratio, Math.sqrt((1 + (2 * zeta * r) ** 2) / below))).toBeLessThan(0.01)
    }
  })

  test('work put in by the base is what the dashpot takes: pi c w Z^2 a cycle', () => {
    // Relative motion Z = Y r^2 / sqrt((1 - r^2)^2 + (2 zeta r)^2).
    const [r, zeta, h] = [1.2, 0.1, 1e-4]
    const w = 10 * r
    const z = (0.01 * r * r) / Math.sqrt((1 - r * r) ** 2 + (2 * zeta * r) ** 2)
    const lattice = shaken(r, zeta, h)
    advance(lattice, Math.round(12 / h))
    const cycles = 10
    const report = budgetOf(lattice, Math.round((cycles * turn) / w / h))
    const truth = cycles * Math.PI * 2 * w * z * z
    expect(relative(report.joules.dashpots, truth)).toBeLessThan(1e-3)
    expect(relative(report.joules.paths, truth)).toBeLessThan(2e-3)
    expect(Math.abs(report.closingError)).toBeLessThan(2e-3)
  })
})

describe('a mass driven by an active strut', () => {
  const driven = (zeta: number, h: number, r = 1) =>
    oscillator(1, 0, 0, h, {
      struts: [],
      actuators: [
        {
          a: 0,
          b: 1,
          restM: 1,
          stiffnessNpm: 100,
          dampingNspm: 20 * zeta,
          actuator: 'unlimited',
          group: 0,
          strain: 0.01,
          phaseTurns: 0,
        },
      ],
      groups: [{ frequencyHz: (10 * r) / turn }],
    })

  test.each([0.05, 0.1, 0.2])(
    'zeta %d: at resonance it lags a quarter turn, by 1/(2 zeta) of the stroke',
    (zeta) => {
      const h = 1e-4
      const lattice = driven(zeta, h)
      const settled = Math.round(12 / (10 * zeta) / h)
      advance(lattice, settled)
      const tone = toneAt(
        record(lattice, 20_000, (l) => at(l, 1, x)),
        h,
        10 / turn,
      )
      expect(relative(tone.amplitude / 0.01, 1 / (2 * zeta))).toBeLessThan(1e-3)
      const command = (10 / turn) * settled * h
      const lag = tone.phaseTurns - command
      expect(Math.abs(lag - Math.round(lag + 0.25) + 0.25)).toBeLessThan(1e-3)
    },
  )

  test('with its dashpot in a passive strut beside it: loss pi c w X^2 a cycle, put in by the strut', () => {
    const h = 5e-5
    const lattice = oscillator(1, 0, 2, h, {
      actuators: [
        {
          a: 0,
          b: 1,
          restM: 1,
          stiffnessNpm: 100,
          dampingNspm: 0,
          actuator: 'unlimited',
          group: 0,
          strain: 0.01,
          phaseTurns: 0,
        },
      ],
      groups: [{ frequencyHz: 10 / turn }],
    })
    advance(lattice, Math.round(12 / h))
    const report = budgetOf(lattice, Math.round((10 * turn) / 10 / h))
    // X = 0.01 / (2 zeta) = 0.05 m.
    const truth = 10 * Math.PI * 2 * 10 * 0.05 * 0.05
    expect(relative(report.joules.dashpots, truth)).toBeLessThan(1e-3)
    expect(relative(report.joules.actuators, truth)).toBeLessThan(2e-3)
  })

  test('the budget closes at first order in the step', () => {
    const error = (h: number) => Math.abs(budgetOf(driven(0.1, h), Math.round(2.2 / h)).closingErrorJ)
    expect(error(1e-3)).toBeGreaterThan(0)
    expect(Math.abs(orderOf(error(1e-3), error(5e-4)) - 1)).toBeLessThan(0.1)
  })
})

test('a pendulum of 60 degrees on a stiff strut swings with 1.07318200715 times the period of small swings', () => {
  // Landau and Lifshitz, Mechanics, section 11 (from memory); the strut stretches by less than 2e-5 of its length.
  const h = 2e-4
  const lattice = chain({
    masses: [1],
    stiffnessNpm: 1e6,
    dampingNspm: 100,
    stepSeconds: h,
    ends: 'fixed-free',
    rest: { gravityMps2: [9.81 * Math.sin(Math.PI / 6), -9.81 * Math.cos(Math.PI / 6)] },
  })
  // The strut lies along x; gravity points 60 degrees away from it.
  const samples: number[] = []
  for (let i = 0; i < 800; i++) {
    samples.push(at(lattice, 1, y))
    advance(lattice, 250)
  }
  const peak = dominantTone(samples, 250 * h)!
  const small = turn / Math.sqrt(9.81)
  expect(relative(peak.frequencyHz * small * 1.07318200715, 1)).toBeLessThan(1e-3)
})
