// The integrator: how large a step may be, and what a step does to frequency and energy. Hairer, Lubich and Wanner,
// Geometric Numerical Integration, 2006 (from memory); numbers recomputed independently of this code.

import { EigenvalueDecomposition, Matrix } from 'ml-matrix'
import { describe, expect, test } from 'vitest'
import { stream } from '../../shared/streams.js'
import { addForces, advance } from '../../sim/lattice/advance.js'
import { buildLattice, type Lattice } from '../../sim/lattice/build.js'
import { kineticJ } from '../../sim/lattice/observe.js'
import { chooseStep, stableStepSeconds, stepBound, stepSafety } from '../../sim/lattice/stability.js'
import { at, chain, massScaledStiffness, oscillator, put, record, vx, x, y } from './physics-bodies.js'

/** A free pair of equal masses: its one frequency, sqrt(2 k / m), is exactly the bound. w = 1 here. */
function pair(dampingNspm: number, stepTimesFrequency: number): Lattice {
  const lattice = chain({
    masses: [1, 1],
    stiffnessNpm: 0.5,
    dampingNspm,
    stepSeconds: 0.01,
    ends: 'free-free',
  })
  put(lattice, 1, x, 1 + 1e-6)
  // Steps beyond the bound are refused by buildLattice; this goes round it on purpose.
  return { ...lattice, stepSeconds: stepTimesFrequency }
}
const stretch = (lattice: Lattice) => Math.abs(at(lattice, 1, x) - at(lattice, 0, x) - 1)
const largest = (lattice: Lattice, steps: number) =>
  record(lattice, steps, stretch).reduce((a, b) => Math.max(a, b))

describe('the largest step', () => {
  test('without a dashpot: h w = 1.999 stays, 2.001 blows up', () => {
    expect(largest(pair(0, 1.999), 5_000)).toBeLessThan(1e-4)
    expect(largest(pair(0, 2.001), 300)).toBeGreaterThan(1e-3)
  })

  // zeta, h w.
  const limits = [
    [0.05, 1.902498],
    [0.1, 1.809975],
    [0.3, 1.488061],
    [0.5, 1.236068],
    [1, 0.828427],
    [2, 0.472136],
  ] as const

  test.each(limits)('with a dashpot, zeta %d: h w < %d', (zeta, limit) => {
    // h w < 2 (sqrt(1 + zeta^2) - zeta): derived from the spectral radius of one step.
    expect(stableStepSeconds(1, zeta)).toBeCloseTo(limit, 6)
    expect(largest(pair(zeta, 0.998 * limit), 5_000)).toBeLessThan(1e-4)
    expect(largest(pair(zeta, 1.002 * limit), 5_000)).toBeGreaterThan(1e-3)
  })

  test('a lattice beyond it is refused with the numbers', () => {
    const build = (stepSeconds: number) =>
      chain({ masses: [1, 1], stiffnessNpm: 0.5, stepSeconds, ends: 'free-free' })
    expect(() => build(1.999)).not.toThrow()
    expect(() => build(2.001)).toThrow(/found 2\.001 s, expected a step below 2 s.*1 rad\/s/)
  })

  test('the bound is never below the true highest frequency of random lattices', () => {
    // Gershgorin's theorem says so; ml-matrix is the second opinion on the eigenvalues.
    let tightest = 0
    for (let trial = 0; trial < 30; trial++) {
      const draw = stream(20_261_201, 'spare', 8, 1, trial)
      const nodes = Array.from({ length: 8 }, () => ({
        positionM: [draw.uniform(), draw.uniform()],
        massKg: 0.1 + draw.uniform(),
      }))
      const struts = Array.from({ length: 16 }, (_, i) => ({
        a: i % 8,
        b: (i + 1 + draw.below(7)) % 8,
        stiffnessNpm: 10 + 90 * draw.uniform(),
        dampingNspm: 0,
      }))
      const spec = { nodes, struts, gravityMps2: [0, 0], stepSeconds: 1e-3 }
      const matrix = new Matrix(massScaledStiffness(buildLattice(spec), [x, y], 1e-6))
      const highest = Math.sqrt(Math.max(...new EigenvalueDecomposition(matrix).realEigenvalues))
      const { highestRadps } = stepBound(spec)
      expect(highestRadps).toBeGreaterThan(highest * (1 - 1e-6))
      tightest = Math.max(tightest, highest / highestRadps)
    }
    // And it is of use: some lattice comes within a third of it.
    expect(tightest).toBeGreaterThan(0.67)
  })

  test('both ends of a strut count: whichever way round it is listed, the bound is the same', () => {
    // The middle of three masses on unequal springs has the largest row: w^2 <= 2 (3 + 5) / 1.
    const nodes = [0, 1, 2].map((place) => ({ positionM: [place, 0], massKg: 1 }))
    const strut = (a: number, b: number, stiffnessNpm: number) => ({ a, b, stiffnessNpm, dampingNspm: 0.5 })
    const rows = [
      [strut(0, 1, 3), strut(1, 2, 5)],
      [strut(1, 0, 3), strut(1, 2, 5)],
      [strut(0, 1, 3), strut(2, 1, 5)],
      [strut(1, 0, 3), strut(2, 1, 5)],
    ]
    for (const struts of rows) {
      const bound = stepBound({ nodes, struts, gravityMps2: [0, 0], stepSeconds: 1e-3 })
      expect(bound.highestRadps).toBeCloseTo(4, 12)
      // Damping 2 (0.5 + 0.5) = 2 z w.
      expect(bound.dampingRatio).toBeCloseTo(2 / 8, 12)
      expect(bound.node).toBe(1)
    }
  })

  test('contact counts: a heavy contact spring makes the step shorter', () => {
    const spec = {
      nodes: [{ positionM: [0, 0], massKg: 1 }],
      struts: [],
      gravityMps2: [0, -10],
      ground: { firstXM: -1, spacingM: 1, heightsM: [0, 0, 0] },
      contact: { stiffness: 1e4, damping: 0, exponent: 1, depthLimitM: 0.01 } as const,
      stepSeconds: 1e-3,
    }
    expect(stepBound(spec).highestRadps).toBeCloseTo(100, 9)
    expect(() => buildLattice({ ...spec, stepSeconds: 0.021 })).toThrow(/0\.02 s/)
    // On a slope of 1 the vertical depth costs twice the stiffness along the normal.
    const steep = { ...spec, ground: { firstXM: 0, spacingM: 1, heightsM: [0, 1] } }
    expect(stepBound(steep).highestRadps).toBeCloseTo(100 * Math.SQRT2, 9)
  })

  test('an automatic step divides the wanted time and keeps the safety factor', () => {
    const bound = { highestRadps: 1000, dampingRatio: 0.5, limitSeconds: stableStepSeconds(1000, 0.5) }
    const step = chooseStep(bound, 0.04, 1, 4)
    expect(step).toBeLessThanOrEqual(stepSafety * bound.limitSeconds)
    expect((0.04 / step) % 4).toBeCloseTo(0, 9)
    expect(chooseStep(bound, 0.04, 1e-4, 4)).toBeCloseTo(1e-4, 12)
  })
})

describe('what a step does', () => {
  test.each([
    [0.05, 1.000104195974],
    [0.1, 1.000417136115],
    [0.2, 1.001674211616],
    [0.5, 1.010721020568],
  ])('h w = %d turns the frequency by the factor %d', (hw, ratio) => {
    // (2 / h w) asin(h w / 2); samples of a sine obey x[n+1] + x[n-1] = 2 cos(w' h) x[n].
    const lattice = oscillator(1, 1, 0, hw)
    put(lattice, 1, x, 0.01)
    const [a, b, c] = record(lattice, 2, (l) => at(l, 1, x)) as unknown as [number, number, number]
    expect(Math.acos((a + c) / (2 * b)) / hw / ratio).toBeCloseTo(1, 9)
  })

  test('the frequency converges at second order', () => {
    const error = (h: number) => {
      const lattice = oscillator(1, 1, 0, h)
      put(lattice, 1, x, 0.01)
      const [a, b, c] = record(lattice, 2, (l) => at(l, 1, x)) as unknown as [number, number, number]
      return Math.acos((a + c) / (2 * b)) / h - 1
    }
    expect(Math.log2(error(0.2) / error(0.1))).toBeCloseTo(2, 1)
  })

  test('the shadow energy v^2/2 + x^2/2 - h x v / 2 is kept for 10,000 steps', () => {
    const h = 0.1
    const lattice = oscillator(1, 1, 0, h)
    put(lattice, 1, x, 0.5)
    const shadow = (l: Lattice) => {
      const [s, v] = [at(l, 1, x), at(l, 1, vx)]
      return 0.5 * v * v + 0.5 * s * s - (h / 2) * s * v
    }
    const values = record(lattice, 10_000, shadow)
    for (const value of values) expect(Math.abs(value / values[0]! - 1)).toBeLessThan(1e-12)
  })

  test('free fall lags by g h t / 2 exactly', () => {
    // Closed form of symplectic Euler: y_n = -g h^2 n (n + 1) / 2; n = 100, h = 0.01, g = 9.81 gives -4.95405.
    const spec = {
      nodes: [{ positionM: [0, 0], massKg: 1 }],
      struts: [],
      gravityMps2: [0, -9.81],
      stepSeconds: 0.01,
    }
    const lattice = buildLattice(spec)
    advance(lattice, 100)
    expect(at(lattice, 0, y)).toBeCloseTo(-4.95405, 10)
  })

  test('drives follow strain * cos d * sin(2 pi (f t + phase) - d), tan d = 2 pi f lag, for thousands of steps', () => {
    // Closed form of a first-order lag's steady answer; the host's sine is the second opinion.
    const strut = { stiffnessNpm: 100, dampingNspm: 0, restM: 1 }
    const nodes = [0, 1, 2].map((place) => ({ positionM: [place, 0], massKg: 1, pinned: true }))
    const lattice = buildLattice({
      nodes,
      struts: [],
      actuators: [
        { a: 0, b: 1, ...strut, actuator: 'unlimited', group: 0, strain: 0.1, phaseTurns: 0.15 },
        { a: 1, b: 2, ...strut, actuator: 'unlimited', group: 1, strain: 0.2, phaseTurns: 0.6 },
      ],
      groups: [{ frequencyHz: 1.3, lagSeconds: 0.07 }, { frequencyHz: 0.7 }],
      drive: { startSeconds: 0.5, rampSeconds: 0.25 },
      gravityMps2: [0, 0],
      stepSeconds: 1e-3,
    })
    const commanded = (strain: number, hertz: number, phase: number, lag: number, t: number) => {
      const d = Math.atan(2 * Math.PI * hertz * lag)
      return strain * Math.cos(d) * Math.sin(2 * Math.PI * (hertz * t + phase) - d)
    }
    for (const steps of [100, 560, 710, 755, 756, 3_333, 10_001]) {
      advance(lattice, steps - lattice.step)
      const t = (steps - 500) * 1e-3
      const grown = Math.min(1, Math.max(0, t / 0.25))
      addForces(lattice)
      // A pinned strut at its rest length pushes with k times the commanded lengthening, on its far end.
      expect(at(lattice, 2, 4)).toBeCloseTo(100 * grown * commanded(0.2, 0.7, 0.6, 0, t), 9)
      expect(at(lattice, 0, 4)).toBeCloseTo(-100 * grown * commanded(0.1, 1.3, 0.15, 0.07, t), 9)
      for (let i = 0; i < 3; i++) for (const axis of [4, 5]) put(lattice, i, axis, 0)
    }
  })

  test('how steps are split into calls changes no bit, drives and prescribed nodes included', () => {
    const build = () =>
      oscillator(1, 0, 0, 1e-3, {
        struts: [],
        actuators: [
          {
            a: 0,
            b: 1,
            restM: 1,
            stiffnessNpm: 100,
            dampingNspm: 1,
            actuator: 'unlimited',
            group: 0,
            strain: 0.1,
            phaseTurns: 0.2,
          },
        ],
        groups: [{ frequencyHz: 1.7, lagSeconds: 0.05 }, { frequencyHz: 0.9 }],
        prescribed: [{ node: 0, group: 1, amplitudeM: [0.02, 0.01], phaseTurns: 0.4 }],
        drive: { startSeconds: 0.1, rampSeconds: 0.3 },
      })
    const [once, often] = [build(), build()]
    advance(once, 2_000)
    for (let left = 2_000, i = 0; left > 0; i++) {
      const some = Math.min(left, 1 + ((i * 37) % 101))
      advance(often, some)
      left -= some
    }
    expect(often.nodes).toEqual(once.nodes)
    expect(Math.abs(at(once, 1, x))).toBeGreaterThan(1e-4)
  })

  test('drag alone: x = v0 m / b (1 - exp(-b t / m)), converging at first order', () => {
    // Stop distance v0 m / b: m = 0.1, b = 0.5, v0 = 2 gives 0.4 m.
    const stop = (h: number) => {
      const nodes = [{ positionM: [0, 0], velocityMps: [2, 0], massKg: 0.1 }]
      const lattice = buildLattice({ nodes, struts: [], gravityMps2: [0, 0], dragNspm: 0.5, stepSeconds: h })
      advance(lattice, Math.round(0.4 / h))
      return at(lattice, 0, x) - 0.4 * (1 - Math.exp(-2))
    }
    expect(Math.abs(stop(1e-4))).toBeLessThan(3e-4)
    expect(Math.log2(stop(1e-3) / stop(5e-4))).toBeCloseTo(1, 1)
  })
})

describe('choke points', () => {
  test('a state that is no number ends the simulation with reason and time', () => {
    const lattice = chain({ masses: [1, 1], stiffnessNpm: 1, stepSeconds: 0.1, ends: 'free-free' })
    put(lattice, 1, x, at(lattice, 0, x)) // a strut of zero length has no direction
    const fault = advance(lattice, 1_000)
    expect(fault?.reason).toMatch(/node 0 has no finite position/)
    expect(fault?.seconds).toBeGreaterThan(0)
    expect(fault?.seconds).toBeLessThan(10)
    expect(kineticJ(lattice)).toBeNaN()
  })
})
