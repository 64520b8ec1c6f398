// Contact and friction of the reference simulator. Laws: Hunt and Crossley, Coefficient of restitution interpreted as
// damping in vibroimpact, 1975 (from memory); Coulomb friction. Numbers recomputed independently of this code.

import { describe, expect, test } from 'vitest'
import { advance } from '../../sim/lattice/advance.js'
import { buildLattice, type Lattice } from '../../sim/lattice/build.js'
import { contactJ, gravitationalJ, kineticJ } from '../../sim/lattice/observe.js'
import type { ContactSpec, LatticeSpec } from '../../sim/lattice/spec.js'
import { at, orderOf, oscillator, put, record, vx, vy, x, y } from './physics-bodies.js'

const g = 9.81
const firm: ContactSpec = { stiffness: 1e5, damping: 1e5, exponent: 1, depthLimitM: 0.01 }

describe('a bilateral spring and dashpot', () => {
  test.each([
    [0.01, 0.969070904],
    [0.05, 0.854467893],
    [0.1, 0.729247614],
    [0.2, 0.526620599],
    [0.3, 0.372326105],
    [0.5, 0.163033535],
    [0.7, 0.04598791],
  ])('zeta %d gives back %d of the speed, after pi / w_d', (zeta, restitution) => {
    // e = exp(-pi zeta / sqrt(1 - zeta^2)) where contact ends at zero depth and may pull (the strut does).
    const h = 5e-6
    const lattice = oscillator(1, 100, 20 * zeta, h)
    put(lattice, 1, vx, -1)
    const seconds = Math.PI / (10 * Math.sqrt(1 - zeta * zeta))
    advance(lattice, Math.round(seconds / h))
    expect(Math.abs(at(lattice, 1, vx) / restitution - 1)).toBeLessThan(1e-3)
    expect(Math.abs(at(lattice, 1, x))).toBeLessThan(1e-4)
  })
})

describe('Hunt-Crossley contact', () => {
  // y (1 + e) = ln((1 + y) / (1 - e y)), y = lambda v0 / k: exact, whatever the exponent.
  const rows = [
    [0.01, 0.993377454],
    [0.05, 0.967738579],
    [0.1, 0.93747558],
    [0.15, 0.909015741],
    [0.3, 0.832869792],
    [0.5, 0.748434932],
    [1, 0.59362426],
    [2, 0.410719686],
  ] as const
  const rebound = (strength: number, exponent: 1 | 1.5, h: number) => {
    const contact = { ...firm, stiffness: 1e4, damping: 1e4 * strength, exponent, depthLimitM: 1 }
    const lattice = buildLattice({
      nodes: [{ positionM: [0, 0], velocityMps: [0, -1], massKg: 1 }],
      struts: [],
      gravityMps2: [0, 0],
      ground: { firstXM: -1, spacingM: 1, heightsM: [0, 0, 0] },
      contact,
      stepSeconds: h,
    })
    let deepest = 0
    let pulled = false
    for (let i = 0; i * h < 1 && at(lattice, 0, y) <= 0; i++) {
      const before = at(lattice, 0, vy)
      advance(lattice, 1)
      if (at(lattice, 0, vy) < before) pulled = true
      deepest = Math.max(deepest, -at(lattice, 0, y))
    }
    return { e: at(lattice, 0, vy), deepest, pulled }
  }

  test.each(rows)(
    'y = %d gives back %d of the speed, for n = 1 and n = 1.5, and never pulls',
    (strength, e) => {
      for (const exponent of [1, 1.5] as const) {
        const hit = rebound(strength, exponent, 2e-6)
        expect(Math.abs(hit.e / e - 1)).toBeLessThan(1e-3)
        expect(hit.pulled).toBe(false)
        expect(hit.deepest).toBeGreaterThan(1e-3)
      }
    },
  )

  test.each([1, 1.5] as const)('exponent %d: the rebound converges at that order and one', (exponent) => {
    // Better than the first order of the scheme, because the force grows from zero as d^n and ends there.
    let [low, high] = [0, 1]
    for (let i = 0; i < 60; i++) {
      const e = (low + high) / 2
      if (1 + e > Math.log(2 / (1 - e))) low = e
      else high = e
    }
    const error = (h: number) => Math.abs(rebound(1, exponent, h).e - low)
    // Where the step falls against the end of contact adds a ripple: mean over neighbouring steps.
    const factors = Array.from({ length: 40 }, (_, i) => 1 + i / 400)
    const mean = (h: number) => factors.reduce((sum, f) => sum + error(f * h) / factors.length, 0)
    expect(Math.abs(orderOf(mean(8e-5), mean(4e-5)) - 1 - exponent)).toBeLessThan(0.1)
    expect(mean(4e-5)).toBeLessThan(exponent === 1 ? 1e-6 : 1e-8)
  })

  test.each([
    [0.3, 3.9],
    [0.5, 10.9],
  ])('y = %d: the usual linearisation 1 - 2 y / 3 would be %d hundredths low', (strength, percent) => {
    const { e } = rebound(strength, 1.5, 2e-6)
    expect(Math.abs((1 - (1 - (2 / 3) * strength) / e) * 100 - percent)).toBeLessThan(0.1)
  })

  test('what comes to rest has sunk by m g / k', () => {
    const lattice = buildLattice({
      nodes: [{ positionM: [0, 0.05], massKg: 1 }],
      struts: [],
      gravityMps2: [0, -g],
      ground: { firstXM: -1, spacingM: 1, heightsM: [0, 0, 0] },
      contact: { ...firm, stiffness: 1e4, depthLimitM: 0.1 },
      dragNspm: 5,
      stepSeconds: 1e-4,
    })
    advance(lattice, 120_000)
    expect(Math.abs((at(lattice, 0, y) * 1e4) / -g - 1)).toBeLessThan(1e-10)
  })

  test('ground does not hold back what is torn off it', () => {
    // k + lambda dd/dt = 1e5 (1 - 2) < 0: the law without its clip would pull.
    const lattice = buildLattice({
      nodes: [{ positionM: [0, -0.005], velocityMps: [0, 2], massKg: 1 }],
      struts: [],
      gravityMps2: [0, 0],
      ground: { firstXM: -1, spacingM: 1, heightsM: [0, 0, 0] },
      contact: firm,
      stepSeconds: 1e-4,
    })
    advance(lattice, 100)
    expect(at(lattice, 0, vy)).toBe(2)
  })

  test('what sinks deeper than the contact allows ends the simulation with the depth', () => {
    const lattice = buildLattice({
      nodes: [{ positionM: [0, 0], massKg: 1 }],
      struts: [],
      gravityMps2: [0, -g],
      ground: { firstXM: -1, spacingM: 1, heightsM: [0, 0, 0] },
      contact: { ...firm, stiffness: 100, damping: 10 },
      stepSeconds: 1e-4,
    })
    const fault = advance(lattice, 10_000)
    expect(fault?.reason).toMatch(/node 0 sank 1\d\.\d mm into the ground/)
    expect(fault?.seconds).toBeLessThan(0.1)
  })

  test('a bouncing and sliding mass never gains energy, over kinks of the ground included', () => {
    // No source: the elastic part of the force is the gradient of a continuous potential (sim/lattice/reference/plane-nodes.ts).
    const lattice = buildLattice({
      nodes: [
        { positionM: [0, 0.3], velocityMps: [0.7, 0], massKg: 1, friction: { forward: 0.2, backward: 0.2 } },
      ],
      struts: [],
      gravityMps2: [0, -g],
      ground: { firstXM: 0, spacingM: 0.05, heightsM: [0, 0.02, -0.01, 0.03, 0, 0.05, 0.01, 0.06, 0, 0, 0] },
      contact: { ...firm, stiffness: 1e4, damping: 0, depthLimitM: 0.1 },
      stepSeconds: 1e-5,
    })
    const energy = (l: Lattice) => kineticJ(l) + gravitationalJ(l) + contactJ(l)
    const start = energy(lattice)
    let highest = 0
    for (let i = 0; i < 2_000; i++) {
      advance(lattice, 100)
      highest = Math.max(highest, energy(lattice))
    }
    // Symplectic Euler ripples by h w / 2 of the energy in contact: 1e-5 * 100 / 2.
    expect(highest / start).toBeLessThan(1 + 1e-3)
    expect(energy(lattice)).toBeLessThan(0.8 * start)
  })
})

describe('Coulomb friction on a slope', () => {
  /** A mass laid on a long slope falling towards +x, at the depth where the contact bears it. */
  const slide = (degrees: number, mu: number, speedMps: number, h: number, contact = firm): Lattice => {
    const slope = Math.tan((degrees * Math.PI) / 180)
    const cosine = Math.cos((degrees * Math.PI) / 180)
    const spec: LatticeSpec = {
      nodes: [
        {
          positionM: [0, (-g * cosine * cosine) / contact.stiffness],
          velocityMps: [speedMps * cosine, -speedMps * cosine * slope],
          massKg: 1,
          friction: { forward: mu, backward: mu },
        },
      ],
      struts: [],
      gravityMps2: [0, -g],
      ground: { firstXM: -50, spacingM: 100, heightsM: [50 * slope, -50 * slope] },
      contact,
      stepSeconds: h,
    }
    return buildLattice(spec)
  }
  const speed = (lattice: Lattice) => Math.sqrt(at(lattice, 0, vx) ** 2 + at(lattice, 0, vy) ** 2)
  const acceleration = (degrees: number, mu: number, h: number) => {
    const lattice = slide(degrees, mu, 1, h)
    advance(lattice, Math.round(0.5 / h))
    return (speed(lattice) - 1) / 0.5
  }

  test.each([
    [20, 0.1, 2.433379145033834],
    [30, 0.3, 2.356287236662397],
    [30, 0.5, 0.657145394437328],
    [45, 0.5, 3.46835876172001],
  ])('%d degrees, mu %d: slides at %d m/s^2', (degrees, mu, truth) => {
    // a = g (sin - mu cos). Straight sliding has no error of its own in this scheme.
    expect(Math.abs(acceleration(degrees, mu, 5e-5) / truth - 1)).toBeLessThan(1e-6)
  })

  test.each([
    [0.1, 5.7105931375],
    [0.3, 16.699244233994],
    [0.5, 26.565051177078],
    [0.8, 38.65980825409],
    [1, 45],
  ])('mu %d: slides above %d degrees and sticks below, to a hundredth of it', (mu, degrees) => {
    const after = (angle: number) => {
      const lattice = slide(angle, mu, 0, 5e-5)
      advance(lattice, 20_000)
      return speed(lattice)
    }
    const [above, below] = [1.01 * degrees, 0.99 * degrees]
    const [s, c] = [Math.sin((above * Math.PI) / 180), Math.cos((above * Math.PI) / 180)]
    // After 1 s, from rest.
    expect(Math.abs(after(above) / (g * (s - mu * c)) - 1)).toBeLessThan(1e-2)
    expect(after(below)).toBeLessThan(1e-9)
  })

  test('a held foot does not creep, at any step size', () => {
    // Regularised laws creep at a speed that grows with the load (0.7 to 0.9 of their threshold at 20 degrees, mu 0.5);
    // this one must not, also where one step's load, h g sin, is as large as 3 mm/s.
    for (const h of [1e-5, 1e-4, 1e-3]) {
      const lattice = slide(20, 0.5, 0, h, { ...firm, stiffness: 1e4, damping: 1e4 })
      advance(lattice, 3_000)
      expect(speed(lattice)).toBeLessThan(1e-9)
      expect(Math.abs(at(lattice, 0, x))).toBeLessThan(1e-6)
    }
  })

  test('flat stop: v = 2 m/s, mu = 0.5 takes 0.407747 m and 0.407747 s', () => {
    const stop = (h: number) => {
      const lattice = slide(0, 0.5, 2, h)
      const speeds = record(lattice, Math.round(0.6 / h), (l) => at(l, 0, vx))
      return {
        distance: at(lattice, 0, x),
        seconds: speeds.findIndex((v) => v < 0.01) * h + 0.01 / (0.5 * g),
      }
    }
    const truth = 0.407747196738
    expect(Math.abs(stop(5e-5).distance / truth - 1)).toBeLessThan(1e-2)
    expect(Math.abs(stop(5e-5).seconds / truth - 1)).toBeLessThan(1e-2)
    const error = (h: number) => Math.abs(stop(h).distance / truth - 1)
    expect(Math.abs(orderOf(error(8e-5), error(4e-5)) - 1)).toBeLessThan(0.1)
  })

  test('a directional foot stops sooner against its pad', () => {
    const stop = (speedMps: number) => {
      const lattice = buildLattice({
        nodes: [
          {
            positionM: [0, -g / firm.stiffness],
            velocityMps: [speedMps, 0],
            massKg: 1,
            friction: { forward: 0.2, backward: 0.8 },
          },
        ],
        struts: [],
        gravityMps2: [0, -g],
        ground: { firstXM: -1, spacingM: 1, heightsM: [0, 0, 0] },
        contact: firm,
        stepSeconds: 1e-4,
      })
      advance(lattice, 10_000)
      return at(lattice, 0, x)
    }
    // v^2 / (2 mu g) each way.
    expect(Math.abs(stop(1) / (1 / (0.4 * g)) - 1)).toBeLessThan(1e-2)
    expect(Math.abs(stop(-1) / (-1 / (1.6 * g)) - 1)).toBeLessThan(1e-2)
  })
})

describe('the simplest crawler', () => {
  test.each([
    [2000, 0.199],
    [100, 0.18],
    [20, 0.1],
    [10, 0],
  ])('two feet on a link of %d N/m advance p - 2 F+ / k = %d m a cycle', (stiffnessNpm, truth) => {
    // Two contacts with directional friction, quasi-static (the family of DeSimone and Tatone, Crawling motility
    // through the analysis of model locomotors, 2012; formula derived anew): F+ = 1 N, F- = 3 N, p = 0.2 m.
    const massKg = 1 / g
    const foot = { massKg, friction: { forward: 1, backward: 3 } }
    const depthM = -1 / 1e3
    const lattice = buildLattice({
      nodes: [
        { positionM: [-1, depthM], ...foot },
        { positionM: [0, depthM], ...foot },
      ],
      struts: [],
      actuators: [
        {
          a: 0,
          b: 1,
          restM: 1,
          stiffnessNpm,
          dampingNspm: 1,
          actuator: 'unlimited',
          group: 0,
          strain: 0.1,
          phaseTurns: 0,
        },
      ],
      groups: [{ frequencyHz: 0.1 }],
      gravityMps2: [0, -g],
      ground: { firstXM: -5, spacingM: 5, heightsM: [0, 0, 0] },
      contact: { stiffness: 1e3, damping: 1e3, exponent: 1, depthLimitM: 0.01 },
      stepSeconds: 2e-4,
    })
    const cycle = 50_000
    advance(lattice, 2 * cycle)
    const before = at(lattice, 0, x) + at(lattice, 1, x)
    advance(lattice, cycle)
    const advanceM = (at(lattice, 0, x) + at(lattice, 1, x) - before) / 2
    expect(Math.abs(advanceM - truth)).toBeLessThan(0.01 * 0.2)
  })
})
