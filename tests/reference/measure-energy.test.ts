// Energy budgets, forces on the ground and travel of bodies that move, against closed forms; sources beside the checks. All
// numbers were recomputed independently of this code.

import { describe, expect, test } from 'vitest'
import { advance } from '../../sim/lattice/advance.js'
import { buildLattice, type Lattice } from '../../sim/lattice/build.js'
import { depthM } from '../../sim/lattice/observe.js'
import type { NodeSpec } from '../../sim/lattice/spec.js'
import { openBudget, reportBudget, sampleBudget } from '../../sim/measure/energy.js'
import {
  centreOfMass,
  contactRecord,
  costOfTransport,
  deviationOf,
  newStatistics,
  peakOf,
  rmsOf,
  takeValue,
  travelM,
} from '../../sim/measure/gait.js'
import { chain, orderOf, oscillator, put, vx, y } from './physics-bodies.js'

const turn = 2 * Math.PI
const relative = (value: number, truth: number) => Math.abs(value / truth - 1)

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

describe('on the ground', () => {
  const g = 9.81
  const ground = { firstXM: -1, spacingM: 1, heightsM: [0, 0, 0] }
  const drop = (massKg: number, stiffness: number, heightM: number, h: number) =>
    buildLattice({
      nodes: [{ positionM: [0, heightM], massKg }],
      struts: [],
      gravityMps2: [0, -g],
      ground,
      contact: { stiffness, damping: 0, exponent: 1, depthLimitM: 1 },
      stepSeconds: h,
    })

  // Mass, stiffness, height; then contact time, period, peak force over weight: x_max = d (1 + sqrt(1 + 2 h / d)),
  // d = m g / k, t_c = 2 (pi - atan(v0 / (w d))) / w.
  test.each([
    [80, 20_000, 0.1, 0.251434921587, 0.537003546172, 3.469177992617],
    [1, 1000, 0.2, 0.109170628406, 0.109170628406 + 2 * Math.sqrt(0.4 / g), 7.463336574387],
  ])('a mass of %d kg hopping on a spring of %d N/m from %d m', (m, k, height, contact, period, force) => {
    const h = 1e-4
    const lattice = drop(m, k, height, h)
    const forces = newStatistics()
    const touching: number[] = []
    for (let i = 0; i < 40_000; i++) {
      advance(lattice, 1)
      const depth = depthM(lattice, 0)
      touching.push(depth > 0 ? 1 : 0)
      takeValue(forces, Math.max(0, k * depth))
    }
    const foot = contactRecord(touching, h)
    expect(relative(foot.meanContactSeconds!, contact)).toBeLessThan(0.01)
    expect(relative(foot.meanStrideSeconds!, period)).toBeLessThan(0.01)
    expect(relative(foot.duty, contact / period)).toBeLessThan(0.01)
    expect(relative(peakOf(forces) / (m * g), force)).toBeLessThan(0.01)
  })

  test.each([
    [0.1, 0.93747558],
    [0.3, 0.832869792],
    [1, 0.59362426],
  ])(
    'an impact with lambda v / k = %d gives back %d of the speed; the rest is lost in the contact',
    (strength, e) => {
      const impact = (h: number) => {
        const lattice = buildLattice({
          nodes: [{ positionM: [0, 0], velocityMps: [0, -1], massKg: 1 }],
          struts: [],
          gravityMps2: [0, 0],
          ground,
          contact: { stiffness: 1e4, damping: 1e4 * strength, exponent: 1, depthLimitM: 1 },
          stepSeconds: h,
        })
        return budgetOf(lattice, Math.round(0.1 / h))
      }
      const report = impact(1e-5)
      expect(relative(report.joules.contact, 0.5 * (1 - e * e))).toBeLessThan(2e-3)
      expect(Math.abs(report.closingError)).toBeLessThan(2e-3)
      expect(Math.abs(impact(5e-6).closingErrorJ)).toBeLessThan(0.6 * Math.abs(report.closingErrorJ))
    },
  )

  test.each([2, 3] as const)(
    'a block sliding to rest in %d dimensions loses m v^2 / 2 by friction',
    (dimensions) => {
      const flat = <T>(plane: T, space: T) => (dimensions === 2 ? plane : space)
      const lattice = buildLattice({
        dimensions,
        nodes: [
          {
            positionM: flat([0, -1e-4], [0, -1e-4, 0]),
            velocityMps: flat([2, 0], [1.2, 0, 1.6]),
            massKg: 1,
            friction: { forward: 0.5, backward: 0.5 },
          },
        ],
        struts: [],
        gravityMps2: flat([0, -10], [0, -10, 0]),
        ground,
        contact: { stiffness: 1e5, damping: 1e5, exponent: 1, depthLimitM: 0.01 },
        stepSeconds: 1e-4,
      })
      const from = centreOfMass(lattice).positionM
      const report = budgetOf(lattice, 6000)
      expect(relative(report.joules.friction, 2)).toBeLessThan(2e-3)
      expect(Math.abs(report.closingError)).toBeLessThan(2e-3)
      // Stops after v^2 / (2 mu g).
      expect(relative(travelM(from, centreOfMass(lattice).positionM), 0.4)).toBeLessThan(2e-3)
    },
  )
})

describe('energy budgets of whole bodies', () => {
  /** A tetrahedron with everything on it: struts, a driven one, a volume, drag, drag struts, slope, friction with a heading. */
  const everything = (h: number): Lattice => {
    const nodes: NodeSpec[] = [
      [0, 0.3, 0],
      [0.1, 0.3, 0],
      [0.05, 0.3, 0.09],
      [0.05, 0.39, 0.03],
    ].map((positionM, i) => ({
      positionM,
      velocityMps: [0.3, 0.1 * i, -0.2],
      massKg: 0.02,
      friction: { forward: 0.2, backward: 0.8, sideways: 0.5 },
      headingNode: (i + 1) % 4,
    }))
    const pairs = [
      [0, 1],
      [0, 2],
      [1, 2],
      [0, 3],
      [1, 3],
      [2, 3],
    ] as const
    return buildLattice({
      dimensions: 3,
      nodes,
      struts: pairs.slice(1).map(([a, b]) => ({ a, b, stiffnessNpm: 300, dampingNspm: 0.3 })),
      guided: [
        {
          a: 0,
          b: 1,
          stiffnessNpm: 300,
          dampingNspm: 0.2,
          actuator: 'unlimited',
          group: 0,
          strain: 0.15,
          phaseTurns: 0,
          powerLimitW: 0.05,
        },
      ],
      groups: [{ frequencyHz: 3 }],
      dragStruts: [{ a: 1, b: 3, normalNspm2: 0.6, tangentNspm2: 0.3 }],
      volumes: [{ nodes: [0, 2, 1, 3], stiffnessPa: 4e4 }],
      dragNspm: 0.01,
      gravityMps2: [0, -9.81, 0],
      ground: {
        firstXM: -2,
        spacingM: 1,
        heightsM: [0, 0.1, 0, 0.1, 0.2, 0, 0.1, 0, 0, 0, 0.1, 0],
        rows: 3,
        firstZM: -1,
      },
      contact: { stiffness: 3e3, damping: 6e3, exponent: 1.5, depthLimitM: 0.05 },
      stepSeconds: h,
    })
  }

  test('every account is used and the budget closes at first order in the step, all the way', () => {
    const h = 2e-4
    const worst = [1, 2, 4].map((divide) => {
      const lattice = everything(h / divide)
      const budget = openBudget(lattice)
      let most = 0
      for (let i = 0; i < (1.5 * divide) / h; i++) {
        advance(lattice, 1)
        sampleBudget(lattice, budget)
        if (i % (250 * divide) === 0)
          most = Math.max(most, Math.abs(reportBudget(lattice, budget).closingErrorJ))
      }
      const report = reportBudget(lattice, budget)
      for (const [account, joules] of Object.entries(report.joules)) {
        if (account === 'paths') expect(joules).toBe(0)
        else expect(joules).toBeGreaterThan(1e-6)
      }
      return most / report.lossJ
    })
    expect(worst[2]).toBeLessThan(5e-3)
    // Narrow enough to show when a force law here is not the one of the integration.
    expect(Math.abs(orderOf(worst[0]!, worst[1]!) - 1)).toBeLessThan(0.02)
    expect(Math.abs(orderOf(worst[1]!, worst[2]!) - 1)).toBeLessThan(0.02)
  })

  test('a budget changes nothing about the motion', () => {
    const [watched, alone] = [everything(1e-4), everything(1e-4)]
    budgetOf(watched, 500)
    advance(alone, 500)
    expect(watched.nodes).toEqual(alone.nodes)
    const moved = oscillator(1, 100, 1, 1e-3, {
      groups: [{ frequencyHz: 1 }],
      prescribed: [{ node: 0, group: 0, amplitudeM: [0.01, 0], phaseTurns: 0 }],
    })
    budgetOf(moved, 500)
    expect(moved.nodes.filter((_, i) => i % 6 >= 4)).toEqual(new Float64Array(4))
  })
})

describe('travel', () => {
  test('a walker that gravity drives has the cost of transport of its slope, sin 0.009', () => {
    // Garcia, Chatterjee, Ruina and Coleman, The simplest walking model, 1998 (abstract read; numbers recomputed):
    // gravity work 0.003581484089 for a step of 0.397948048842, in units of m, g and leg length.
    const cost = costOfTransport({
      energyJ: 0.003581484089,
      massKg: 1,
      gravityMps2: 1,
      distanceM: 0.397948048842,
    })
    expect(Math.abs(cost! - Math.sin(0.009))).toBeLessThan(1e-11)
  })

  test('what stands still has no cost of transport', () => {
    expect(costOfTransport({ energyJ: 1, massKg: 1, gravityMps2: 9.81, distanceM: 0 })).toBeUndefined()
  })

  test('the centre of mass of masses 1, 2 and 3, and its velocity', () => {
    const lattice = chain({ masses: [1, 2, 3], stiffnessNpm: 1, stepSeconds: 0.01, ends: 'free-free' })
    put(lattice, 2, vx, 4)
    put(lattice, 0, y, 6)
    const centre = centreOfMass(lattice)
    expect(centre).toEqual({ massKg: 6, positionM: [8 / 6, 1], velocityMps: [2, 0] })
    expect(travelM([0, 5], [-3, 7])).toBe(3)
    expect(travelM([0, 5, 0], [3, 7, 4])).toBe(5)
  })

  test('contact is cut to whole strides; contacts cut off by the ends are not averaged', () => {
    const touching = [1, 1, 0, 0, 1, 1, 1, 0, 1, 0, 0, 0, 1, 1].map(Boolean)
    // Touchdowns at 4, 8, 12: 4 of 8 samples; contacts of 3 and 1 samples.
    const found = contactRecord(touching, 0.5)
    expect(found).toEqual({ duty: 0.5, touchdowns: 3, meanContactSeconds: 1, meanStrideSeconds: 2 })
    expect(contactRecord([1, 1, 0, 0], 1).duty).toBe(0.5)
  })

  test('statistics of a sine of amplitude 3 about 4: peak 7, rms sqrt(16 + 9/2), deviation 3 / sqrt 2', () => {
    const statistics = newStatistics()
    for (let i = 0; i < 1000; i++) takeValue(statistics, 4 + 3 * Math.sin((turn * i) / 1000))
    expect(peakOf(statistics)).toBeCloseTo(7, 10)
    expect(rmsOf(statistics)).toBeCloseTo(Math.sqrt(20.5), 10)
    expect(deviationOf(statistics)).toBeCloseTo(3 / Math.SQRT2, 10)
  })
})
