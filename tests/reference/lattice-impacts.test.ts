// Impacts of many bodies, slides off a cylinder, and drag that grows with the speed, on the lattice. Any textbook of
// mechanics where no source is named (common practice, no source); numbers recomputed independently of this code.

import { describe, expect, test } from 'vitest'
import { advance } from '../../sim/lattice/advance.js'
import { buildLattice, type Lattice } from '../../sim/lattice/build.js'
import { type EventOf, flow, startMotion } from '../../sim/ode/flow.js'
import { type Rates, rungeKutta4 } from '../../sim/ode/runge-kutta.js'
import { at, orderOf, vx, vy, x, y } from './physics-bodies.js'

const g = 9.81
const relative = (value: number, truth: number) => Math.abs(value / truth - 1)

// Newton's cradle with balls that touch is not ideal: F. Herrmann and M. Seitz, How does the ball-chain work?, 1982 (from
// memory). Speeds after all contacts are over, the striker's being 1; they do not depend on the stiffness. Class: 1e-3.
describe('touching balls in a row, one striker', () => {
  const linear = [
    [-0.1303, 0.1502, 0.98],
    [-0.1323, -0.0753, -0.031, 0.2962, 0.9424],
  ]

  /** Speeds of masses kept apart by springs that only push. */
  const onTheLattice = (count: number, stiffnessNpm: number, stepSeconds: number) => {
    const nodes = Array.from({ length: count }, (_, i) => ({
      positionM: [0.1 * i, 0],
      velocityMps: [i === 0 ? 1 : 0, 0],
      massKg: 1,
    }))
    const keepApart = nodes.slice(1).map((_, i) => ({ a: i, b: i + 1, leastM: 0.1, stiffnessNpm }))
    const lattice = buildLattice({
      nodes,
      struts: [],
      keepApart,
      separateBodies: true,
      gravityMps2: [0, 0],
      stepSeconds,
    })
    advance(lattice, Math.round(40 / Math.sqrt(stiffnessNpm) / stepSeconds))
    return nodes.map((_, i) => at(lattice, i, vx))
  }

  test.each(linear)('on linear springs: %d, %d, %d ...', (...speeds) => {
    for (const stiffnessNpm of [1e4, 1e6]) {
      const found = onTheLattice(speeds.length, stiffnessNpm, 1e-3 / Math.sqrt(stiffnessNpm))
      for (const [i, speed] of speeds.entries()) expect(Math.abs(found[i]! - speed)).toBeLessThan(1e-3)
      expect(Math.abs(found.reduce((sum, v) => sum + v, 0) - 1)).toBeLessThan(1e-12)
    }
  })

  test('two balls exchange their speeds', () => {
    const [first, second] = onTheLattice(2, 1e4, 1e-5)
    expect(Math.abs(first!)).toBeLessThan(1e-3)
    expect(Math.abs(second! - 1)).toBeLessThan(1e-3)
  })

  // Hertz's law between balls is no law of the lattice: the same equations by the integrator of sim/ode.
  test.each([
    [-0.071, 0.0764, 0.9945],
    [-0.0711, -0.0303, -0.0145, 0.127, 0.9888],
  ])("by Hertz's law: %d, %d, %d ...", (...speeds) => {
    const count = speeds.length
    const rates: Rates = (_seconds, state, rate) => {
      rate.fill(0, count)
      for (let i = 0; i < count; i++) rate[i] = state[count + i]!
      for (let i = 0; i + 1 < count; i++) {
        const overlap = Math.max(0, state[i]! - state[i + 1]!)
        const push = 1e4 * overlap * Math.sqrt(overlap)
        rate[count + i]! -= push
        rate[count + i + 1]! += push
      }
    }
    const start = new Float64Array(2 * count)
    start[count] = 1
    const motion = startMotion(rungeKutta4, rates, start, 1e-4)
    flow(motion, 2, [])
    for (const [i, speed] of speeds.entries())
      expect(Math.abs(motion.state[count + i]! - speed)).toBeLessThan(1e-3)
  })
})

describe('a point mass that slides off a cylinder of 1 m', () => {
  // Contact ends where cos q = (2/3) cos q0, 48.189685104 degrees from the top (Landau and Lifshitz, Mechanics, 1976, from
  // memory); from there it flies. The cylinder is a ground of straight pieces. Class: contact, 1 %.
  const start = 0.1
  const gapM = 2e-4
  const leaving = (piecesPerM: number, stiffness: number) => {
    // From the top to where it is well off the ground; farther out the ground would be upright.
    const heightsM = Array.from({ length: 0.95 * piecesPerM + 1 }, (_, i) =>
      Math.sqrt(1 - (i / piecesPerM) ** 2),
    )
    const lattice = buildLattice({
      nodes: [{ positionM: [Math.sin(start), Math.cos(start) - g / stiffness], massKg: 1 }],
      struts: [],
      gravityMps2: [0, -g],
      ground: { firstXM: 0, spacingM: 1 / piecesPerM, heightsM },
      contact: { stiffness, damping: 100 * stiffness, exponent: 1, depthLimitM: 1e-4 },
      stepSeconds: 2e-6,
    })
    for (let i = 0; i < 1_000_000; i++) {
      const fault = advance(lattice, 1)
      if (fault) throw new Error(fault.reason)
      const reach = Math.hypot(at(lattice, 0, x), at(lattice, 0, y))
      if (reach > 1 + gapM) break
    }
    return lattice
  }
  /** Where the flight from the ideal edge is that far above the cylinder: contact itself ends without a mark. */
  const wanted = () => {
    const cosine = (2 / 3) * Math.cos(start)
    const sine = Math.sqrt(1 - cosine * cosine)
    const speed = Math.sqrt(g * cosine)
    for (let t = 0; ; t += 1e-6) {
      const place = [sine + speed * cosine * t, cosine - speed * sine * t - (g * t * t) / 2] as const
      if (Math.hypot(...place) > 1 + gapM) return Math.atan2(...place)
    }
  }

  test('leaves it at cos q = 2/3', () => {
    const lattice = leaving(2_000, 1e6)
    const angle = Math.atan2(at(lattice, 0, x), at(lattice, 0, y))
    expect(relative(Math.cos(angle), Math.cos(wanted()))).toBeLessThan(1e-2)
    // And with the speed of its fall.
    const fallen = Math.cos(start) - at(lattice, 0, y)
    const speed = Math.hypot(at(lattice, 0, vx), at(lattice, 0, vy))
    expect(relative(speed, Math.sqrt(2 * g * fallen))).toBeLessThan(1e-2)
  })
})

describe('drag', () => {
  const falling = (stepSeconds: number): Lattice =>
    buildLattice({
      nodes: [{ positionM: [0, 0], massKg: 1 }],
      struts: [],
      gravityMps2: [0, -g],
      stepSeconds,
    })

  test('in proportion to the square of the speed, set by the caller step by step: m = 1, b = 0.5', () => {
    // v_t = sqrt(m g / b), v = v_t tanh(g t / v_t), x = (m / b) ln cosh(g t / v_t). The lattice has linear drag only;
    // its coefficient may change between steps.
    const fall = (h: number, seconds: number) => {
      const lattice = falling(h)
      for (let i = 0; i < Math.round(seconds / h); i++) {
        lattice.dragNspm = 0.5 * Math.abs(at(lattice, 0, vy))
        advance(lattice, 1)
      }
      return { v: -at(lattice, 0, vy), x: -at(lattice, 0, y) }
    }
    expect(relative(fall(1e-4, 1).v, 4.325083450811)).toBeLessThan(1e-3)
    expect(relative(fall(1e-4, 1).x, 3.06685372656)).toBeLessThan(1e-3)
    expect(relative(fall(1e-3, 10).v, 4.42944691807)).toBeLessThan(1e-10)
    const error = (h: number) => Math.abs(fall(h, 1).x - 3.06685372656)
    expect(Math.abs(orderOf(error(2e-3), error(1e-3)) - 1)).toBeLessThan(0.1)
  })

  test('linear, m = 1, b = 2: ends at 4.905 m/s', () => {
    const lattice = falling(1e-3)
    lattice.dragNspm = 2
    advance(lattice, 20_000)
    expect(relative(-at(lattice, 0, vy), 4.905)).toBeLessThan(1e-10)
  })

  test('of a sphere of 10 micrometres in water, 50 kg/m^3 heavier than it: sinks at 1.09e-5 m/s', () => {
    // 6 pi mu a (Stokes, On the effect of the internal friction of fluids on the motion of pendulums, 1851, from memory).
    const [radiusM, viscosity] = [1e-5, 1e-3]
    const dragNspm = 6 * Math.PI * viscosity * radiusM
    expect(relative(dragNspm, 1.884955592e-7)).toBeLessThan(1e-9)
    const volumeM3 = (4 / 3) * Math.PI * radiusM ** 3
    const massKg = 1050 * volumeM3
    const lattice = buildLattice({
      nodes: [{ positionM: [0, 0], massKg }],
      struts: [],
      // Weight less what the water carries.
      gravityMps2: [0, (-g * 50) / 1050],
      dragNspm,
      stepSeconds: 1e-6,
    })
    advance(lattice, 2_000)
    // Three digits are published.
    expect(Math.abs(-at(lattice, 0, vy) - 1.09e-5)).toBeLessThan(5e-8)
  })
})

describe('a ball that bounces until it lies, to the event', () => {
  // e = 0.5 ... 0.9 at every bounce, drop of 1 m, t0 = sqrt(2 h / g) = 0.451523640986: heights e^(2 n), time
  // t0 (1 + e)/(1 - e), path h (1 + e^2)/(1 - e^2). The lattice's contact and impulse engines only come near to it
  // (lattice-contact and rigid-contact); here every impact is an event of sim/ode.
  const rates: Rates = (_seconds, state, rate) => {
    rate[0] = state[1]!
    rate[1] = -g
  }
  const ground: EventOf = { value: (_seconds, state) => state[0]!, direction: -1 }

  test.each([
    [0.5, 1.354570922957, 1.666667],
    [0.7, 2.558633965586, 2.921569],
    [0.8, 4.063712768872, 4.555556],
    [0.9, 8.578949178729, 9.526316],
  ])('e = %d lies after %d s and a way of %d m', (e, seconds, way) => {
    const motion = startMotion(rungeKutta4, rates, [1, 0], 1e-3)
    let path = 1
    for (let bounce = 0; ; bounce++) {
      expect(flow(motion, 20, [ground])?.event).toBe(0)
      if (bounce === 0) expect(relative(motion.seconds, 0.451523640986)).toBeLessThan(1e-10)
      const up = -e * motion.state[1]!
      const height = (up * up) / (2 * g)
      if (bounce < 8) expect(relative(height, e ** (2 * bounce + 2))).toBeLessThan(1e-8)
      // A bounce lower than this is over within a few steps: the rest is the geometric series.
      if (height < 1e-4) {
        expect(relative(motion.seconds + (2 * up) / g / (1 - e), seconds)).toBeLessThan(1e-8)
        expect(Math.abs(path + (2 * height) / (1 - e * e) - way)).toBeLessThan(1e-6)
        return
      }
      path += 2 * height
      motion.state[0] = 0
      motion.state[1] = up
    }
  })
})
