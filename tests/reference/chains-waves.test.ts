// Chains of masses and springs in motion: waves, what is left of them beyond the cut-off and in a band gap, finite
// chains shaken at one end. Brillouin, Wave propagation in periodic structures, 1946; Kittel, Introduction to solid
// state physics (both from memory); numbers recomputed independently of this code. Units: k = 1 N/m, m = 1 kg, 1 m.
// The same in the frequency domain: measure-modes.test.ts and measure-bands.test.ts.

import { describe, expect, test } from 'vitest'
import { advance } from '../../sim/lattice/advance.js'
import { buildLattice, type Lattice } from '../../sim/lattice/build.js'
import { fitTones } from '../../sim/measure/tones.js'
import { at, orderOf, put, vx, x } from './physics-bodies.js'

const turn = 2 * Math.PI

interface Shaking {
  readonly masses: readonly number[]
  readonly radps: number
  readonly stepSeconds: number
  /** c / 2 of every strut. */
  readonly zeta?: number
}

/** A row of masses along x behind a base that is shaken by 1 mm; node 0 is the base, at the middle of its way. */
function shaken({ masses, radps, stepSeconds, zeta = 0 }: Shaking): Lattice {
  return buildLattice({
    nodes: [1, ...masses].map((massKg, i) => ({ positionM: [i, 0], massKg })),
    struts: masses.map((_, i) => ({ a: i, b: i + 1, restM: 1, stiffnessNpm: 1, dampingNspm: 2 * zeta })),
    groups: [{ frequencyHz: radps / turn }],
    prescribed: [{ node: 0, group: 0, amplitudeM: [1e-3, 0], phaseTurns: 0 }],
    gravityMps2: [0, 0],
    stepSeconds,
  })
}

/**
 * The same in steady motion from the start: every mass at the middle of its way, at the speed of the undamped steady
 * answer, from the equilibrium of forces mass by mass. A start from rest would ring on for ever.
 */
function inSteadyMotion(shaking: Shaking): Lattice {
  const { masses, radps, stepSeconds: h } = shaking
  const lattice = shaken(shaking)
  // Symplectic Euler sees the square of (2/h) sin(w h / 2) where the equation has w^2.
  const squared = ((2 / h) * Math.sin((radps * h) / 2)) ** 2
  // From the free end: u_(n-1) = 2 u_n - u_(n+1) - m w^2 u_n, scaled to 1 at the base in the end.
  const places = [1]
  let beyond = 1
  for (const mass of [...masses].reverse()) {
    const [now] = places as [number]
    places.unshift(2 * now - beyond - mass * squared * now)
    beyond = now
  }
  for (let i = 1; i < places.length; i++) put(lattice, i, vx, (1e-3 * radps * places[i]!) / places[0]!)
  return lattice
}

/** Motion of every node over that of the base, positive in phase, and the largest remainder that fits no sine. */
function answers(lattice: Lattice, radps: number) {
  const h = lattice.stepSeconds
  const every = Math.max(1, Math.round(turn / radps / 24 / h))
  const samples = Math.round((40 * turn) / radps / (every * h))
  const records = Array.from({ length: lattice.nodeCount }, () => new Float64Array(samples))
  for (let n = 0; n < samples; n++) {
    advance(lattice, every)
    for (const [i, record] of records.entries()) record[n] = at(lattice, i, x) - i
  }
  const fits = records.map((record) => fitTones(record, every * h, [radps / turn]))
  const base = fits[0]!.tones[0]!
  const ratios = fits.map(({ tones }) => {
    const ahead = tones[0]!.phaseTurns - base.phaseTurns
    return (tones[0]!.amplitude / base.amplitude) * Math.sign(Math.cos(turn * ahead))
  })
  return { ratios, left: Math.max(...fits.map((fit) => fit.residualRms)) / base.amplitude }
}

describe('waves in a chain of equal masses', () => {
  test.each([
    [0.1, 0.31286893008],
    [0.25, 0.76536686473],
    [0.5, Math.SQRT2],
    [0.75, 1.847759065023],
    [1, 2],
  ])('q a = %d pi swings at %d sqrt(k/m)', (part, radps) => {
    // A standing wave in 40 masses with free ends: a whole number of half waves.
    const count = 40
    const lattice = buildLattice({
      nodes: Array.from({ length: count }, (_, i) => ({ positionM: [i, 0], massKg: 1 })),
      struts: Array.from({ length: count - 1 }, (_, i) => ({
        a: i,
        b: i + 1,
        restM: 1,
        stiffnessNpm: 1,
        dampingNspm: 0,
      })),
      gravityMps2: [0, 0],
      stepSeconds: 0.01,
    })
    const q = part === 1 ? (39 / 40) * Math.PI : part * Math.PI
    const truth = 2 * Math.sin(q / 2)
    for (let i = 0; i < count; i++) put(lattice, i, x, i + 1e-4 * Math.cos(q * (i + 0.5)))
    const start = at(lattice, 0, x)
    const places = [start]
    for (let n = 0; n < 2; n++) {
      advance(lattice, 20)
      places.push(at(lattice, 0, x))
    }
    // Samples of a sine: x0 + x2 = 2 cos(w t) x1; symplectic Euler turns w into (2/h) asin(w h / 2).
    const found = Math.acos((places[0]! + places[2]!) / (2 * places[1]!)) / 0.2
    expect(found / ((2 / 0.01) * Math.asin((truth * 0.01) / 2))).toBeCloseTo(1, 7)
    if (part < 1) expect(found / radps).toBeCloseTo(1, 4)
    else expect(truth).toBeLessThan(2)
  })

  test('a pulse of long waves runs at a sqrt(k/m)', () => {
    // A smooth pulse, 40 masses wide: dispersion slows it by (qa)^2/8, about 1e-3.
    const count = 400
    const lattice = buildLattice({
      nodes: Array.from({ length: count }, (_, i) => ({ positionM: [i, 0], massKg: 1 })),
      struts: Array.from({ length: count - 1 }, (_, i) => ({
        a: i,
        b: i + 1,
        restM: 1,
        stiffnessNpm: 1,
        dampingNspm: 0,
      })),
      gravityMps2: [0, 0],
      stepSeconds: 0.02,
    })
    for (let i = 0; i < count; i++) {
      const s = (i - 80) / 20
      put(lattice, i, x, i + 1e-3 * Math.exp(-s * s))
      put(lattice, i, vx, ((1e-3 * 2 * s) / 20) * Math.exp(-s * s))
    }
    const centre = () => {
      let [sum, weighted] = [0, 0]
      for (let i = 0; i < count; i++) {
        const moved = at(lattice, i, x) - i
        sum += moved
        weighted += i * moved
      }
      return weighted / sum
    }
    const before = centre()
    advance(lattice, 10_000)
    expect((centre() - before) / 200).toBeCloseTo(1, 3)
  })
})

describe('beyond the cut-off', () => {
  test.each([
    [1.1, 0.41183334711],
    [1.25, 0.25],
    [1.5, 0.14589803375],
    [2, 0.071796769724],
  ])('at %d times the cut-off the motion alternates and shrinks to %d a mass', (ratio, decay) => {
    const radps = 2 * ratio
    const { ratios, left } = answers(
      inSteadyMotion({ masses: Array(30).fill(1), radps, stepSeconds: 2e-3 }),
      radps,
    )
    for (const i of [1, 2, 3]) expect(ratios[i + 1]! / ratios[i]! / -decay).toBeCloseTo(1, 3)
    expect(left).toBeLessThan(1e-4)
  })
})

describe('a finite chain shaken at one end, the other free', () => {
  // u_N / u_0 = cos(qa/2) / cos((N + 1/2) qa), beyond the cut-off (-1)^N sinh(kappa/2) / sinh((N + 1/2) kappa).
  test.each([
    [5, 0.7, -1.33317791163],
    [10, 1.3, -1.149731485727],
    [10, 2.2, 8.254969952274e-5],
  ])('N = %d at %d: the end moves by %d', (count, radps, truth) => {
    const lattice = inSteadyMotion({ masses: Array(count).fill(1), radps, stepSeconds: 1e-3 })
    const { ratios, left } = answers(lattice, radps)
    expect(ratios[count]! / truth).toBeCloseTo(1, 3)
    expect(left).toBeLessThan(1e-4)
  })

  test('it gets there with the square of the step', () => {
    const error = (stepSeconds: number) => {
      const shaking = { masses: Array(5).fill(1), radps: 0.7, stepSeconds }
      return answers(inSteadyMotion(shaking), 0.7).ratios[5]! + 1.33317791163
    }
    expect(Math.abs(orderOf(error(0.2), error(0.1)) - 2)).toBeLessThan(0.1)
  })
})

describe('in the gap of a chain of 1 and 2 kg', () => {
  const cells = (count: number) => Array.from({ length: 2 * count }, (_, i) => 1 + (i % 2))

  test.each([
    [1.2, 4, 0.06116141424496, 0.502415484],
    [1.2, 8, 3.896358264068e-3, 0.502415484],
    [1.2, 16, 1.581840602811e-5, 0.502415484],
    [1.3, 4, 0.08668823124, 0.525747975],
    [1.3, 8, 6.628450044e-3, 0.525747975],
  ])('at %d, %d cells let %d through, each cell %d', (radps, count, through, each) => {
    const { ratios, left } = answers(
      inSteadyMotion({ masses: cells(count), radps, stepSeconds: 1e-3 }),
      radps,
    )
    expect(Math.abs(ratios.at(-1)!) / through).toBeCloseTo(1, 3)
    if (count >= 8) expect(Math.abs(ratios[5]! / ratios[3]!) / each).toBeCloseTo(1, 2)
    expect(left).toBeLessThan(1e-4)
  })

  test.each([
    [0.01, -0.006],
    [0.05, -0.13],
  ])('from rest, dashpots of c = 2 x %d change what 4 cells let through by %d', (zeta, change) => {
    const lattice = shaken({ masses: cells(4), radps: 1.2, stepSeconds: 5e-3, zeta })
    // The slowest mode, about 0.24 rad/s, dies out as exp(-zeta w^2 t).
    advance(lattice, Math.round(9 / zeta / 0.05 / 5e-3))
    const through = Math.abs(answers(lattice, 1.2).ratios[8]!)
    expect(through / 0.06116141424496 - 1).toBeCloseTo(change, 2.5)
  })
})
