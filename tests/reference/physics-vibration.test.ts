// The reference simulator against closed forms of vibrations. Formulas are standard handbook material (Harris and
// Piersol, Harris' Shock and Vibration Handbook, 2002; Den Hartog, Mechanical Vibrations, 1956; both from memory);
// all numbers were recomputed independently of this code.

import { EigenvalueDecomposition, Matrix } from 'ml-matrix'
import { describe, expect, test } from 'vitest'
import { advance } from '../../sim/lattice/advance.js'
import { buildLattice } from '../../sim/lattice/build.js'
import { lengthM, momenta } from '../../sim/lattice/observe.js'
import { openBudget, reportBudget, sampleBudget } from '../../sim/measure/energy.js'
import {
  angularFrequency,
  at,
  chain,
  dampingRatio,
  decrement,
  massScaledStiffness,
  orderOf,
  oscillator,
  peaks,
  put,
  record,
  vx,
  vy,
  x,
  y,
} from './physics-bodies.js'

const relative = (value: number, truth: number) => Math.abs(value / truth - 1)

describe('one mass, m = 1 kg, k = 100 N/m', () => {
  // zeta, damped frequency, logarithmic decrement.
  const rows = [
    [0.01, 9.999499987499, 0.0628349949],
    [0.02, 9.99799979996, 0.125688846427],
    [0.05, 9.987492177719, 0.314552702289],
    [0.1, 9.949874371066, 0.6314838834],
    [0.2, 9.797958971133, 1.282549830162],
    [0.5, 8.660254037844, 3.627598728468],
  ] as const
  const swing = (zeta: number, stepSeconds: number) => {
    const lattice = oscillator(1, 100, 20 * zeta, stepSeconds)
    put(lattice, 1, x, 0.01)
    return record(lattice, Math.round(3.3 / stepSeconds), (l) => at(l, 1, x))
  }

  test.each(rows)('zeta %d swings at %d rad/s and decays by %d a period', (zeta, damped, delta) => {
    const h = 1e-4
    const values = swing(zeta, h)
    expect(relative(angularFrequency(values, h), damped)).toBeLessThan(1e-3)
    // The first peak is the start itself, where record() begins: later ones are compared.
    expect(relative(decrement(values, zeta > 0.3 ? 1 : 3), delta)).toBeLessThan(1e-3)
  })

  // Damped period, ratio of successive peaks.
  test.each([
    [0.01, 0.628349949001, 0.939098416934],
    [0.02, 0.628444232136, 0.881889207075],
    [0.05, 0.629105404578, 0.730115380179],
    [0.1, 0.6314838834, 0.531802082944],
    [0.2, 0.641274915081, 0.277329255639],
    [0.5, 0.725519745694, 0.026579933476],
  ])('zeta %d: a period of %d s, each peak %d of the one before', (zeta, seconds, ratio) => {
    const h = 2e-5
    const values = swing(zeta, h)
    expect(relative((2 * Math.PI) / angularFrequency(values, h), seconds)).toBeLessThan(1e-3)
    const heights = peaks(values)
    expect(relative(heights[1]! / heights[0]!, ratio)).toBeLessThan(1e-3)
  })

  test('the decrement converges at first order, as symplectic Euler does with a dashpot', () => {
    const error = (h: number) => Math.abs(decrement(swing(0.1, h), 3) - 0.6314838834)
    expect(Math.abs(orderOf(error(1e-3), error(5e-4)) - 1)).toBeLessThan(0.1)
  })

  test.each([
    [0.1, 0.729247614288],
    [0.2, 0.52662059933],
    [0.5, 0.163033534822],
    [Math.SQRT1_2, 0.043213918264],
  ])('a constant force at zeta %d overshoots by %d', (zeta, overshoot) => {
    const lattice = oscillator(1, 100, 20 * zeta, 2e-5, { gravityMps2: [1, 0] })
    const highest = peaks(record(lattice, 30_000, (l) => at(l, 1, x)))[0]!
    expect(relative(highest / 0.01 - 1, overshoot)).toBeLessThan(1e-3)
  })

  test('creep under a constant force follows (F/k)(1 - exp(-k t / c))', () => {
    // Mass made negligible: m k / c^2 = 2.5e-5.
    const lattice = oscillator(1e-4, 100, 20, 4e-6, { gravityMps2: [1e4, 0] })
    for (const seconds of [0.1, 0.2, 0.4]) {
      advance(lattice, Math.round(seconds / 4e-6) - lattice.step)
      expect(relative(at(lattice, 1, x), 0.01 * (1 - Math.exp(-seconds / 0.2)))).toBeLessThan(1e-3)
    }
  })

  test('creep converges at first order', () => {
    // Against the same mass with its inertia, exactly: two decaying exponentials.
    const [m, k, c] = [1e-2, 100, 20]
    const root = Math.sqrt(c * c - 4 * m * k)
    const [slow, fast] = [(c - root) / (2 * m), (c + root) / (2 * m)]
    const truth = 0.01 * (1 - (fast * Math.exp(-slow * 0.2) - slow * Math.exp(-fast * 0.2)) / (fast - slow))
    const error = (h: number) => {
      const lattice = oscillator(m, k, c, h, { gravityMps2: [1 / m, 0] })
      advance(lattice, Math.round(0.2 / h))
      return Math.abs(at(lattice, 1, x) - truth)
    }
    expect(Math.abs(orderOf(error(1e-4), error(5e-5)) - 1)).toBeLessThan(0.1)
  })

  test.each([
    [0.5, 4],
    [2, 10],
  ])('loss factor of a strut of c = %d at %d rad/s: c w / k', (c, radps) => {
    // Energy lost in a cycle over 2 pi times the most that is stored (any handbook of damping, from memory).
    const lattice = buildLattice({
      nodes: [0, 1].map((place) => ({ positionM: [place, 0], massKg: 1, pinned: place === 0 })),
      struts: [{ a: 0, b: 1, restM: 1, stiffnessNpm: 100, dampingNspm: c }],
      groups: [{ frequencyHz: radps / (2 * Math.PI) }],
      prescribed: [{ node: 1, group: 0, amplitudeM: [0.01, 0], phaseTurns: 0 }],
      gravityMps2: [0, 0],
      stepSeconds: (2 * Math.PI) / radps / 4000,
    })
    const budget = openBudget(lattice)
    for (let i = 0; i < 4000; i++) {
      advance(lattice, 1)
      sampleBudget(lattice, budget)
    }
    const { dashpots } = reportBudget(lattice, budget).joules
    expect(relative(dashpots / (2 * Math.PI * 0.5 * 100 * 0.01 * 0.01), (c * radps) / 100)).toBeLessThan(1e-3)
  })
})

describe('steady answers', () => {
  /** Amplitude of node 1 over the last of `periods` periods. */
  const amplitude = (lattice: ReturnType<typeof oscillator>, angularRadps: number, periods: number) => {
    const steps = Math.round((2 * Math.PI) / angularRadps / lattice.stepSeconds)
    advance(lattice, steps * periods)
    const values = record(lattice, steps + 2, (l) => at(l, 1, x))
    return peaks(values).at(-1)!
  }
  const groupsAt = (r: number) => [{ frequencyHz: (10 * r) / (2 * Math.PI) }]

  test.each([
    [0.5, 1.328228949],
    [1, 5.099019514],
    [Math.SQRT2, 1],
    [2, 0.355861707],
    [3, 0.14536553],
  ])('base motion at r = %d, zeta 0.1, is transmitted by %d', (r, truth) => {
    // Displacement transmissibility (Ogata, System Dynamics, 2004, eq. 9-14, as cited by others).
    const prescribed = [{ node: 0, group: 0, amplitudeM: [0.01, 0], phaseTurns: 0 }]
    const lattice = oscillator(1, 100, 2, 5e-5, { groups: groupsAt(r), prescribed })
    expect(relative(amplitude(lattice, 10 * r, Math.ceil(20 * r)) / 0.01, truth)).toBeLessThan(1e-3)
  })

  test.each([
    [1, 5],
    [2, 0.3304093],
  ])('an active strut at r = %d, zeta 0.1, moves its mass by %d of its stroke', (r, truth) => {
    // The dashpot acts on the total length (our choice, see sim/lattice/spec.ts), so this is the magnification of a
    // force, 1 / sqrt((1 - r^2)^2 + (2 zeta r)^2), and not the transmissibility.
    const strut = { a: 0, b: 1, restM: 1, stiffnessNpm: 100, dampingNspm: 2 }
    const lattice = oscillator(1, 0, 0, 5e-5, {
      struts: [],
      actuators: [{ ...strut, actuator: 'unlimited', group: 0, strain: 0.01, phaseTurns: 0.3 }],
      groups: groupsAt(r),
    })
    expect(relative(amplitude(lattice, 10 * r, Math.ceil(20 * r)) / 0.01, truth)).toBeLessThan(1e-3)
  })

  test('a first-order lag makes the steady stroke smaller by cos d, tan d = w tau', () => {
    const strut = { a: 0, b: 1, restM: 1, stiffnessNpm: 100, dampingNspm: 2 }
    const lattice = oscillator(1, 0, 0, 5e-5, {
      struts: [],
      actuators: [{ ...strut, actuator: 'unlimited', group: 0, strain: 0.01, phaseTurns: 0 }],
      groups: [{ frequencyHz: 20 / (2 * Math.PI), lagSeconds: 0.05 }],
    })
    expect(relative(amplitude(lattice, 20, 40) / 0.01, 0.3304093 / Math.SQRT2)).toBeLessThan(1e-3)
  })
})

describe('two masses', () => {
  const h = 1e-4

  test.each([
    ['in phase', 1, 10],
    ['in opposite phase', -1, 14.142135623731],
  ])('wall-100-m-50-m-100-wall swings %s', (_, sign, truth) => {
    const wall = { massKg: 1, pinned: true }
    const strut = (a: number, stiffnessNpm: number) => ({
      a,
      b: a + 1,
      restM: 1,
      stiffnessNpm,
      dampingNspm: 0,
    })
    const lattice = buildLattice({
      nodes: [
        { positionM: [-1, 0], ...wall },
        { positionM: [0, 0], massKg: 1 },
        { positionM: [1, 0], massKg: 1 },
        { positionM: [2, 0], ...wall },
      ],
      struts: [strut(0, 100), strut(1, 50), strut(2, 100)],
      gravityMps2: [0, 0],
      stepSeconds: h,
    })
    put(lattice, 1, x, 0.01)
    put(lattice, 2, x, 1 + sign * 0.01)
    const values = record(lattice, 20_000, (l) => at(l, 1, x))
    expect(relative(angularFrequency(values, h), truth)).toBeLessThan(1e-5)
  })

  test('displacing one of them gives beats of 1.51689511835 s', () => {
    // x1 = A/2 (cos w1 t + cos w2 t): the squared envelope has period 2 pi / (w2 - w1).
    const nodes = [-1, 0, 1, 2].map((place, i) => ({ positionM: [place, 0], massKg: 1, pinned: i % 3 === 0 }))
    const struts = [100, 50, 100].map((stiffnessNpm, a) => {
      return { a, b: a + 1, restM: 1, stiffnessNpm, dampingNspm: 0 }
    })
    const lattice = buildLattice({ nodes, struts, gravityMps2: [0, 0], stepSeconds: h })
    put(lattice, 1, x, 0.01)
    for (const seconds of [1.51689511835 / 2, 1.51689511835, 3.0337902367]) {
      advance(lattice, Math.round(seconds / h) - lattice.step)
      const t = lattice.step * h
      const truth = 0.005 * (Math.cos(10 * t) + Math.cos(14.142135623731 * t))
      expect(Math.abs(at(lattice, 1, x) - truth)).toBeLessThan(1e-5)
    }
  })

  test('a free pair of 1 kg and 2 kg swings at 12.247448713916 rad/s', () => {
    const lattice = chain({ masses: [1, 2], stiffnessNpm: 100, stepSeconds: h, ends: 'free-free' })
    put(lattice, 1, x, 1.01)
    const values = record(lattice, 20_000, (l) => at(l, 1, x) - at(l, 0, x) - 1)
    expect(relative(angularFrequency(values, h), 12.247448713916)).toBeLessThan(1e-5)
  })
})

describe('chains of equal masses', () => {
  const modes = (n: number, ends: 'fixed-fixed' | 'fixed-free' | 'free-free') => {
    const lattice = chain({ masses: new Array<number>(n).fill(1), stiffnessNpm: 1, stepSeconds: 0.1, ends })
    const { realEigenvalues } = new EigenvalueDecomposition(new Matrix(massScaledStiffness(lattice, [x])))
    return realEigenvalues.sort((a, b) => a - b).map((square) => Math.sqrt(Math.max(0, square)))
  }
  // Closed forms (any textbook of lattice dynamics, e.g. Kittel, Introduction to Solid State Physics, from memory).
  const closed = {
    'fixed-fixed': (p: number, n: number) => 2 * Math.sin((p * Math.PI) / (2 * (n + 1))),
    'free-free': (p: number, n: number) => 2 * Math.sin(((p - 1) * Math.PI) / (2 * n)),
    'fixed-free': (p: number, n: number) => 2 * Math.sin(((2 * p - 1) * Math.PI) / (2 * (2 * n + 1))),
  }

  test.each(['fixed-fixed', 'free-free', 'fixed-free'] as const)(
    '%s: eigenvalues of the own forces',
    (ends) => {
      // Second opinion on the eigenvalues: ml-matrix.
      for (const n of [3, 5, 10]) {
        for (const [i, omega] of modes(n, ends).entries()) {
          // A zero mode is the root of a rounding error.
          const truth = closed[ends](i + 1, n)
          expect(Math.abs(omega * omega - truth * truth)).toBeLessThan(1e-9)
        }
      }
    },
  )

  test('published samples', () => {
    expect(modes(5, 'fixed-fixed')[0]).toBeCloseTo(0.517638090205041, 9)
    expect(modes(3, 'fixed-free')[2]).toBeCloseTo(1.801937735804838, 9)
    expect(modes(10, 'fixed-fixed')[9]).toBeCloseTo(1.979642883761865, 9)
  })

  test('in time, each mode of n = 5 keeps its shape and its frequency (2/h) asin(w h / 2)', () => {
    const h = 0.02
    for (let p = 1; p <= 5; p++) {
      const lattice = chain({ masses: [1, 1, 1, 1, 1], stiffnessNpm: 1, stepSeconds: h, ends: 'fixed-fixed' })
      for (let i = 1; i <= 5; i++) put(lattice, i, x, i - 1 + 1e-3 * Math.sin((i * p * Math.PI) / 6))
      const values = record(lattice, 5_000, (l) => at(l, 1, x))
      const omega = closed['fixed-fixed'](p, 5)
      expect(relative(angularFrequency(values, h), (2 / h) * Math.asin((omega * h) / 2))).toBeLessThan(1e-6)
    }
  })

  test('struts damp in proportion to stiffness: zeta_p = c w_p / (2 k)', () => {
    const truths = [0.01294095, 0.025, 0.03535534, 0.04330127, 0.04829629]
    for (const [i, truth] of truths.entries()) {
      const p = i + 1
      const h = 4e-5
      const lattice = chain({
        masses: [1, 1, 1, 1, 1],
        stiffnessNpm: 100,
        dampingNspm: 0.5,
        stepSeconds: h,
        ends: 'fixed-fixed',
      })
      for (let n = 1; n <= 5; n++) put(lattice, n, x, n - 1 + 0.01 * Math.sin((n * p * Math.PI) / 6))
      const values = record(lattice, 100_000, (l) => at(l, 1, x))
      expect(relative(dampingRatio(decrement(values, 2)), truth)).toBeLessThan(1e-3)
    }
  })

  test('drag on every mass damps slow modes more: zeta_p = b / (2 m w_p)', () => {
    for (const p of [1, 3, 5]) {
      const h = 4e-5
      const omega = 10 * closed['fixed-fixed'](p, 5)
      const lattice = chain({
        masses: [1, 1, 1, 1, 1],
        stiffnessNpm: 100,
        stepSeconds: h,
        ends: 'fixed-fixed',
        rest: { dragNspm: 0.4 },
      })
      for (let n = 1; n <= 5; n++) put(lattice, n, x, n - 1 + 0.01 * Math.sin((n * p * Math.PI) / 6))
      const values = record(lattice, 100_000, (l) => at(l, 1, x))
      expect(relative(dampingRatio(decrement(values, 2)), 0.4 / (2 * omega))).toBeLessThan(1e-3)
    }
  })

  test.each([
    [5, 15],
    [10, 55],
    [20, 210],
  ])('a hanging chain of %d sags by %d m g / k at its tip', (n, truth) => {
    const lattice = chain({
      masses: new Array<number>(n).fill(1),
      stiffnessNpm: 1000,
      stepSeconds: 0.01,
      ends: 'fixed-free',
      rest: { gravityMps2: [1, 0], dragNspm: 5 },
    })
    expect(advance(lattice, 8_000)).toBeUndefined()
    expect(relative((at(lattice, n, x) - (n - 1)) * 1000, truth)).toBeLessThan(1e-10)
  })
})

describe('in the plane', () => {
  const strip = (braced: boolean) => {
    const nodes = Array.from({ length: 8 }, (_, i) => ({ positionM: [i >> 1, i % 2], massKg: 1 }))
    const pairs: [number, number][] = []
    for (let i = 0; i < 8; i += 2) {
      pairs.push([i, i + 1])
      if (i < 6) pairs.push([i, i + 2], [i + 1, i + 3])
      if (i < 4 || (i < 6 && braced)) pairs.push([i, i + 3])
    }
    const struts = pairs.map(([a, b]) => ({ a, b, stiffnessNpm: 1, dampingNspm: 0 }))
    return buildLattice({ nodes, struts, gravityMps2: [0, 0], stepSeconds: 0.1 })
  }

  test('a braced free body has exactly three zero modes, one more for a missing diagonal', () => {
    // Maxwell, On the calculation of the equilibrium and stiffness of frames, 1864: the count.
    for (const [braced, zeros] of [
      [true, 3],
      [false, 4],
    ] as const) {
      const matrix = new Matrix(massScaledStiffness(strip(braced), [x, y]))
      const { realEigenvalues } = new EigenvalueDecomposition(matrix)
      expect(realEigenvalues.filter((square) => Math.abs(square) < 1e-6)).toHaveLength(zeros)
    }
  })

  test.each([
    [5, 1.142857142857],
    [10, 2],
  ])(
    'a strut spinning at %d rad/s is %d times as long, and its dashpot does not slow it',
    (omega, stretch) => {
      const lattice = chain({
        masses: [1, 1],
        stiffnessNpm: 100,
        dampingNspm: 5,
        stepSeconds: 1e-4,
        ends: 'free-free',
      })
      const half = stretch / 2
      for (const [node, sign] of [
        [0, -1],
        [1, 1],
      ] as const) {
        put(lattice, node, x, sign * half)
        put(lattice, node, vy, sign * omega * half)
      }
      const before = momenta(lattice).angular
      expect(advance(lattice, 20_000)).toBeUndefined()
      expect(relative(lengthM(lattice, 0), stretch)).toBeLessThan(1e-3)
      expect(relative(momenta(lattice).angular, before)).toBeLessThan(1e-12)
    },
  )

  test('a mass between two slack-free springs swings sideways in 7.41629870920549 (L/A) sqrt(m/k)', () => {
    // 4 K(1/2) with the parameter m = k^2 = 1/2; small A, so that only the cubic term counts.
    const amplitude = 0.02
    const h = 1e-3
    const lattice = chain({ masses: [1], stiffnessNpm: 100, stepSeconds: h, ends: 'fixed-fixed' })
    put(lattice, 1, y, amplitude)
    const values = record(lattice, 120_000, (l) => at(l, 1, y))
    const period = (7.41629870920549 / amplitude) * 0.1
    expect(relative(angularFrequency(values, h), (2 * Math.PI) / period)).toBeLessThan(1e-3)
  })

  test('under tension T it swings sideways at sqrt(2 T / (m L))', () => {
    const h = 1e-3
    const strut = { restM: 0.8, stiffnessNpm: 100, dampingNspm: 0 }
    const lattice = chain({
      masses: [1],
      stiffnessNpm: 0,
      stepSeconds: h,
      ends: 'fixed-fixed',
      rest: {
        struts: [
          { a: 0, b: 1, ...strut },
          { a: 1, b: 2, ...strut },
        ],
      },
    })
    put(lattice, 1, y, 1e-3)
    const values = record(lattice, 20_000, (l) => at(l, 1, y))
    expect(relative(angularFrequency(values, h), Math.sqrt(40))).toBeLessThan(1e-4)
  })

  test('a free body keeps its momenta to rounding, dashpots and all', () => {
    // Forces in pairs along the strut: no source needed.
    const lattice = strip(true)
    for (let i = 0; i < 8; i++) {
      put(lattice, i, vx, 0.03 * Math.cos(7 * i))
      put(lattice, i, vy, 0.05 * Math.sin(3 * i))
    }
    const before = momenta(lattice)
    advance(lattice, 10_000)
    const after = momenta(lattice)
    for (const name of ['px', 'py', 'angular'] as const) {
      expect(Math.abs(after[name] - before[name])).toBeLessThan(1e-11)
    }
  })
})
