// What integrators promise: stable steps, frequencies, energies that they keep instead of the true one, order. Hairer,
// Lubich and Wanner, Geometric numerical integration, 2006 (from memory); numbers recomputed independently of this
// code. The lattice moves by symplectic Euler (physics-steps.test.ts holds its step and frequency); walkers and
// hoppers move by the fourth-order Runge-Kutta step of sim/ode; the others stand here for comparison, so that a test
// that knows no order would be noticed.

import { describe, expect, test } from 'vitest'
import { advance } from '../../sim/lattice/advance.js'
import { flow, startMotion } from '../../sim/ode/flow.js'
import { type Method, type Rates, rungeKutta4 } from '../../sim/ode/runge-kutta.js'
import { at, oscillator, put, vx, x } from './physics-bodies.js'

const eulerStep: Method = (rates, size) => {
  const rate = new Float64Array(size)
  return (seconds, h, state, next) => {
    rates(seconds, state, rate)
    for (let i = 0; i < size; i++) next[i] = state[i]! + h * rate[i]!
  }
}
const midpoint: Method = (rates, size) => {
  const rate = new Float64Array(size)
  const half = new Float64Array(size)
  return (seconds, h, state, next) => {
    rates(seconds, state, rate)
    for (let i = 0; i < size; i++) half[i] = state[i]! + 0.5 * h * rate[i]!
    rates(seconds + 0.5 * h, half, rate)
    for (let i = 0; i < size; i++) next[i] = state[i]! + h * rate[i]!
  }
}
// One coordinate and its speed.
const symplecticEuler: Method = (rates) => {
  const rate = new Float64Array(2)
  return (seconds, h, state, next) => {
    rates(seconds, state, rate)
    const speed = state[1]! + h * rate[1]!
    next[0] = state[0]! + h * speed
    next[1] = speed
  }
}
const velocityVerlet: Method = (rates) => {
  const rate = new Float64Array(2)
  return (seconds, h, state, next) => {
    rates(seconds, state, rate)
    const half = state[1]! + 0.5 * h * rate[1]!
    next[0] = state[0]! + h * half
    next[1] = half
    rates(seconds + h, next, rate)
    next[1] = half + 0.5 * h * rate[1]!
  }
}

const harmonic: Rates = (_seconds, state, rate) => {
  rate[0] = state[1]!
  rate[1] = -state[0]!
}

/** All states of a harmonic oscillator of frequency 1, from (1, 0). */
function path(method: Method, h: number, steps: number): (readonly [number, number])[] {
  const step = method(harmonic, 2)
  const state = Float64Array.of(1, 0)
  const states: (readonly [number, number])[] = [[1, 0]]
  for (let i = 0; i < steps; i++) {
    step(0, h, state, state)
    states.push([state[0]!, state[1]!])
  }
  return states
}
const reach = (method: Method, h: number, steps: number) =>
  path(method, h, steps).reduce((most, [q, v]) => Math.max(most, Math.abs(q), Math.abs(v)), 0)

describe('the largest step', () => {
  test.each([
    ['symplectic Euler', symplecticEuler],
    ['velocity Verlet', velocityVerlet],
  ] as const)('%s: h w below 2', (_, method) => {
    expect(reach(method, 1.999, 5_000)).toBeLessThan(100)
    expect(reach(method, 2.001, 2_000)).toBeGreaterThan(1e6)
  })

  test('symplectic Euler at 2 grows in a straight line', () => {
    const states = path(symplecticEuler, 2, 200)
    // The double eigenvalue -1: every second state is farther by the same amount.
    expect(states[200]![0] - states[198]![0]).toBeCloseTo(states[102]![0] - states[100]![0], 9)
    expect(Math.abs(states[200]![0])).toBeGreaterThan(100)
  })

  test('Runge-Kutta 4: h w below 2 sqrt 2', () => {
    expect(reach(rungeKutta4, 2.828, 3_000)).toBeLessThan(2)
    expect(reach(rungeKutta4, 2.829, 30_000)).toBeGreaterThan(100)
  })

  test('explicit Euler: none; it grows by sqrt(1 + (h w)^2) a step', () => {
    const [q, v] = path(eulerStep, 0.01, 1_000).at(-1)!
    expect(Math.hypot(q, v)).toBeCloseTo(1.051268, 6)
    expect(Math.hypot(q, v)).toBeCloseTo((1 + 1e-4) ** 500, 12)
  })
})

describe('frequency and amplitude', () => {
  test.each([
    [0.05, 1.000104195974],
    [0.1, 1.000417136115],
    [0.2, 1.001674211616],
    [0.5, 1.010721020568],
  ])('h w = %d: Verlet and symplectic Euler turn the frequency by %d', (h, ratio) => {
    for (const method of [symplecticEuler, velocityVerlet]) {
      const [[a], [b], [c]] = path(method, h, 2) as unknown as [[number], [number], [number]]
      expect(Math.acos((a + c) / (2 * b)) / h).toBeCloseTo(ratio, 11)
    }
  })

  test('Runge-Kutta 4 loses (h w)^6 / 144 of the amplitude and (h w)^5 / 120 of the phase a step', () => {
    const [q, v] = path(rungeKutta4, 0.1, 1)[1]!
    expect(Math.hypot(q, v) - 1).toBeCloseTo(-6.935764e-9, 14)
    expect(Math.atan2(-v, q) - 0.1).toBeCloseTo(-8.303591e-8, 13)
    const two = path(rungeKutta4, 0.2, 1)[1]!
    expect(Math.log2((Math.hypot(...two) - 1) / (Math.hypot(q, v) - 1))).toBeCloseTo(6, 1)
  })
})

describe('energy that is kept', () => {
  const h = 0.1
  const shadows = [
    [
      'symplectic Euler',
      symplecticEuler,
      (q: number, v: number) => 0.5 * v * v + 0.5 * q * q - 0.5 * h * q * v,
    ],
    [
      'velocity Verlet',
      velocityVerlet,
      (q: number, v: number) => 0.5 * v * v + 0.5 * q * q * (1 - (h * h) / 4),
    ],
  ] as const

  test.each(shadows)('%s keeps its shadow energy over 10,000 steps', (_, method, shadow) => {
    const values = path(method, h, 10_000).map(([q, v]) => shadow(q, v))
    for (const value of values) expect(Math.abs(value / values[0]! - 1)).toBeLessThan(1e-13)
  })

  test.each([
    ['symplectic Euler', symplecticEuler, 0.476190476, 0.526315789],
    ['velocity Verlet', velocityVerlet, 0.49875, 0.5],
  ] as const)('%s: the true energy stays in a band', (_, method, low, high) => {
    const energies = path(method, h, 10_000).map(([q, v]) => 0.5 * v * v + 0.5 * q * q)
    expect(Math.min(...energies)).toBeCloseTo(low, 5)
    expect(Math.max(...energies)).toBeCloseTo(high, 5)
  })

  test('the lattice stays in the band of symplectic Euler', () => {
    const lattice = oscillator(1, 1, 0, h)
    put(lattice, 1, x, 0.5)
    const energies: number[] = []
    for (let i = 0; i < 10_000; i++) {
      const [q, v] = [2 * at(lattice, 1, x), 2 * at(lattice, 1, vx)]
      energies.push(0.5 * v * v + 0.5 * q * q)
      advance(lattice, 1)
    }
    expect(Math.min(...energies)).toBeCloseTo(0.47619, 5)
    expect(Math.max(...energies)).toBeCloseTo(0.526316, 5)
  })
})

describe('order, by Richardson extrapolation', () => {
  const pendulum: Rates = (_seconds, state, rate) => {
    rate[0] = state[1]!
    rate[1] = -Math.sin(state[0]!)
  }
  // q(5) from rest at 1: sin(q/2) = k cd(t, k), k = sin(1/2); elliptic functions, 16 digits.
  const exact = -0.0239512848529275
  const q = (method: Method, h: number) => {
    const motion = startMotion(method, pendulum, [1, 0], h)
    flow(motion, 5, [])
    return motion.state[0]!
  }
  const three = (method: Method) => [0.02, 0.01, 0.005].map((h) => q(method, h)) as [number, number, number]

  test.each([
    ['explicit Euler', eulerStep, 1.107],
    ['symplectic Euler', symplecticEuler, 1.005],
    ['velocity Verlet', velocityVerlet, 2],
    ['midpoint', midpoint, 1.995],
    ['Runge-Kutta 4', rungeKutta4, 3.996],
  ] as const)('%s: %d', (_, method, order) => {
    const [coarse, middle, fine] = three(method)
    expect(Math.log2((coarse - middle) / (middle - fine))).toBeCloseTo(order, 2)
  })

  test('extrapolated, Verlet and Runge-Kutta meet the exact value', () => {
    const [, middle, fine] = three(velocityVerlet)
    expect(fine + (fine - middle) / 3).toBeCloseTo(-0.023951284902, 11)
    const [, middle4, fine4] = three(rungeKutta4)
    expect(fine4 + (fine4 - middle4) / 15).toBeCloseTo(-0.023951284853, 12)
    expect(fine4 + (fine4 - middle4) / 15).toBeCloseTo(exact, 12)
  })
})
