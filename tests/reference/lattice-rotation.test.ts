// Bodies of point masses on stiff struts that turn freely in space, and pendulums at every amplitude of the table. Landau
// and Lifshitz, Mechanics, 1976, sections 11, 36 and 37 (from memory); numbers recomputed independently of this code.
// Class: time stepping 1e-3, and the order where said; what is conserved, to rounding.

import { describe, expect, test } from 'vitest'
import { advance } from '../../sim/lattice/advance.js'
import { buildLattice, type Lattice } from '../../sim/lattice/build.js'
import { kineticJ, momenta } from '../../sim/lattice/observe.js'
import type { NodeSpec } from '../../sim/lattice/spec.js'
import { naturalModes } from '../../sim/measure/modes.js'
import { type EventOf, flow, startMotion } from '../../sim/ode/flow.js'
import { type Rates, rungeKutta4 } from '../../sim/ode/runge-kutta.js'
import { orderOf } from './physics-bodies.js'

const relative = (value: number, truth: number) => Math.abs(value / truth - 1)
const cross = (a: readonly number[], b: readonly number[]) => [
  a[1]! * b[2]! - a[2]! * b[1]!,
  a[2]! * b[0]! - a[0]! * b[2]!,
  a[0]! * b[1]! - a[1]! * b[0]!,
]

interface Spinning {
  /** Sums of m x^2, m y^2, m z^2, kg m^2: the moments of inertia are sums of two of them. */
  readonly spread: readonly [number, number, number]
  readonly spinRadps: readonly [number, number, number]
  readonly stiffnessNpm: number
  /** Damping over stiffness. */
  readonly lossSeconds: number
  readonly stepSeconds: number
}

/** Two masses at +-1 m on each axis, all braced with each other, turning about the origin. */
function spinning({ spread, spinRadps, stiffnessNpm, lossSeconds, stepSeconds }: Spinning): Lattice {
  const nodes = spread.flatMap((sum, axis) =>
    [1, -1].map((sign): NodeSpec => {
      const positionM = [0, 1, 2].map((other) => (other === axis ? sign : 0))
      return { positionM, velocityMps: cross(spinRadps, positionM), massKg: sum / 2 }
    }),
  )
  const struts = nodes.flatMap((_, a) =>
    nodes
      .slice(a + 1)
      .map((_, i) => ({ a, b: a + 1 + i, stiffnessNpm, dampingNspm: stiffnessNpm * lossSeconds })),
  )
  return buildLattice({ dimensions: 3, nodes, struts, gravityMps2: [0, 0, 0], stepSeconds })
}

const axisOf = ({ nodes }: Lattice, axis: number, from = 0) => {
  const [p, q] = [2 * axis * 9 + from, (2 * axis + 1) * 9 + from]
  return [0, 1, 2].map((i) => (nodes[p + i]! - nodes[q + i]!) / 2)
}
const dot = (a: readonly number[], b: readonly number[]) => a.reduce((sum, x, i) => sum + x * b[i]!, 0)

/** Angular momentum. */
const spinOf = (lattice: Lattice) => {
  const { angularX, angularY, angular } = momenta(lattice)
  return [angularX, angularY, angular]
}

describe('a symmetric top, I = (2, 2, 3), turning at (1, 0, 5)', () => {
  const top = (stepSeconds: number) =>
    spinning({
      spread: [1.5, 1.5, 0.5],
      spinRadps: [1, 0, 5],
      stiffnessNpm: 2e6,
      lossSeconds: 1e-4,
      stepSeconds,
    })
  /** Turns of a direction that circles about `pole`, by the time it has come round `count` times. */
  const secondsAround = (lattice: Lattice, count: number, angleNow: () => number) => {
    let [turned, before] = [0, angleNow()]
    for (;;) {
      expect(advance(lattice, 10)).toBeUndefined()
      const now = angleNow()
      const step = now - before - 2 * Math.PI * Math.round((now - before) / (2 * Math.PI))
      if (Math.abs(turned + step) >= 2 * Math.PI * count) {
        const part = (2 * Math.PI * count - Math.abs(turned)) / Math.abs(step)
        return (lattice.step - 10 + 10 * part) * lattice.stepSeconds
      }
      turned += step
      before = now
    }
  }
  const along = [2, 0, 15].map((x) => x / Math.hypot(2, 15))
  const side = cross([0, 1, 0], along)

  test('its axis goes round the angular momentum at 7.566372975211 rad/s, on a cone of 7.594643368591 degrees', () => {
    const lattice = top(1e-4)
    let [least, most] = [180, 0]
    const seconds = secondsAround(lattice, 5, () => {
      const axis = axisOf(lattice, 2)
      const size = Math.sqrt(dot(axis, axis))
      const cone = (Math.acos(dot(axis, along) / size) * 180) / Math.PI
      least = Math.min(least, cone)
      most = Math.max(most, cone)
      return Math.atan2(axis[1]!, dot(axis, side))
    })
    expect(relative((10 * Math.PI) / seconds, 7.566372975211)).toBeLessThan(1e-3)
    expect(relative(least, 7.594643368591)).toBeLessThan(1e-3)
    expect(relative(most, 7.594643368591)).toBeLessThan(1e-3)
  })

  test('seen from the body its spin goes round the axis at (I3 - I1) w3 / I1 = 2.5 rad/s: 2.513274122872 s', () => {
    const lattice = top(1e-4)
    // Angular momentum along the body's first and second axis is I1 times the spin along them.
    const seconds = secondsAround(lattice, 2, () => {
      const spin = spinOf(lattice)
      return Math.atan2(dot(spin, axisOf(lattice, 1)), dot(spin, axisOf(lattice, 0)))
    })
    expect(relative(seconds / 2, 2.513274122872)).toBeLessThan(1e-3)
  })

  test('keeps its angular momentum to rounding and its energy to the stretch of the struts', () => {
    const lattice = top(1e-4)
    const [spin, energy] = [spinOf(lattice), kineticJ(lattice)]
    advance(lattice, 50_000)
    for (const [i, value] of spinOf(lattice).entries()) expect(Math.abs(value - spin[i]!)).toBeLessThan(1e-11)
    expect(relative(kineticJ(lattice), energy)).toBeLessThan(1e-4)
  })
})

describe('about the middle axis, I = (1, 2, 3): turning over and over', () => {
  // Exact period 4 K(k) sqrt(I1 I2 I3 / ((I3 - I2) (L^2 - 2 E I1))) (the branch of L^2 above 2 E I2; below it 1 and 3
  // change places). A flat body has I1 + I2 = I3; two masses of a ten-thousandth across it brace it.
  const across = 1e-4
  const period = (spinRadps: readonly [number, number, number], stepSeconds: number) => {
    const lattice = spinning({
      spread: [2 - across / 2, 1 - across / 2, across],
      spinRadps,
      stiffnessNpm: 1e4,
      lossSeconds: 2e-6,
      stepSeconds,
    })
    const zeros: number[] = []
    let before = 1
    while (zeros.length < 2) {
      const fault = advance(lattice, 50)
      if (fault) throw new Error(fault.reason)
      const now = dot(spinOf(lattice), axisOf(lattice, 1))
      if (before > 0 && now <= 0) {
        zeros.push((lattice.step - 50 + (50 * before) / (before - now)) * stepSeconds)
      }
      before = now
    }
    return zeros[1]! - zeros[0]!
  }

  test.each([
    [[0.1, 1, 0.1], 22.996262944123],
    [[0.01, 1, 0], 41.509219529307],
    [[0, 1, 0.01], 37.702071587382],
  ] as const)('from %s every %d s', (spin, truth) => {
    expect(relative(period(spin, 2e-5), truth)).toBeLessThan(1e-3)
  })

  test('small deviations grow by exp(0.577350269190) a second', () => {
    // sqrt((I2 - I1)(I3 - I2) / (I1 I3)) w2, while they are small.
    const rate = Math.sqrt(1 / 3)
    // On the growing direction of the linear equations: w1' = (I2 - I3)/I1 w2 w3 = -w3, w3' = (I1 - I2)/I3 w2 w1 = -w1/3.
    const small = 1e-3
    const lattice = spinning({
      spread: [2 - across / 2, 1 - across / 2, across],
      spinRadps: [small, 1, -small * rate],
      stiffnessNpm: 1e4,
      lossSeconds: 2e-6,
      stepSeconds: 2e-5,
    })
    const deviation = () => dot(spinOf(lattice), axisOf(lattice, 0))
    advance(lattice, 50_000)
    const first = deviation()
    advance(lattice, 100_000)
    expect(relative(Math.log(deviation() / first) / 2, 0.57735026919)).toBeLessThan(1e-3)
  })
})

// T / T0 = 2 K / pi = 1 / AGM(1, cos(a / 2)).
const swings = [
  [5, 1.00047617249],
  [10, 1.00190718814],
  [20, 1.00766902579],
  [30, 1.0174087976],
  [45, 1.0399733432],
  [60, 1.07318200715],
  [90, 1.18034059902],
  [120, 1.37288050062],
  [150, 1.7622037295],
  [170, 2.43936271967],
  [179, 3.90106516039],
] as const

describe('a pendulum let go at an angle', () => {
  test.each(swings)(
    'of %d degrees takes %d times as long as in small swings, by the event of its lowest point',
    (degrees, ratio) => {
      const rates: Rates = (_seconds, state, rate) => {
        rate[0] = state[1]!
        rate[1] = -Math.sin(state[0]!)
      }
      const lowest: EventOf = { value: (_seconds, state) => state[0]!, direction: -1 }
      const quarter = (h: number) => {
        const motion = startMotion(rungeKutta4, rates, [(degrees * Math.PI) / 180, 0], h)
        return flow(motion, 20, [lowest])!.seconds
      }
      expect(relative((quarter(1e-3) * 2) / Math.PI, ratio)).toBeLessThan(1e-10)
      const error = (h: number) => Math.abs((quarter(h) * 2) / Math.PI - ratio)
      if (degrees >= 60) expect(Math.abs(orderOf(error(0.08), error(0.04)) - 4)).toBeLessThan(0.2)
    },
  )

  test.each(swings)('of %d degrees, a mass on a stiff strut: %d', (degrees, ratio) => {
    const h = 2.5e-4
    const reach = (degrees * Math.PI) / 180
    const stiffnessNpm = 1e6
    // Stretched as its weight asks at the start, so that it does not ring; pushed above the pin.
    const start = 1 + Math.cos(reach) / stiffnessNpm
    const lattice = buildLattice({
      nodes: [
        { positionM: [0, 0], massKg: 1, pinned: true },
        { positionM: [start * Math.sin(reach), -start * Math.cos(reach)], massKg: 1 },
      ],
      struts: [{ a: 0, b: 1, restM: 1, stiffnessNpm, dampingNspm: 20 }],
      gravityMps2: [0, -1],
      stepSeconds: h,
    })
    // From one passage to the right to the next: a whole swing.
    const passages: number[] = []
    let before = lattice.nodes[6]!
    while (passages.length < 2) {
      advance(lattice, 1)
      const now = lattice.nodes[6]!
      if (before < 0 && now >= 0) passages.push((lattice.step - now / (now - before)) * h)
      before = now
    }
    expect(relative((passages[1]! - passages[0]!) / (2 * Math.PI), ratio)).toBeLessThan(1e-3)
  })
})

describe('a body on two springy legs at +-0.2 m, 1 kg', () => {
  // Bounce sqrt(2 k / m), pitch sqrt(2 k d^2 / I): any vibration handbook (from memory). The lattice: four masses, stiffly
  // braced, on two struts of 200 N/m.
  const modes = (inertia: number) => {
    const high = 0.1
    // 2 m1 + 2 m2 = 1, 2 m1 0.2^2 + 2 m2 0.1^2 = I.
    const outer = (inertia - high * high) / (2 * (0.04 - high * high))
    const places = [
      [-0.2, 0],
      [0.2, 0],
      [0, high],
      [0, -high],
    ]
    const nodes: NodeSpec[] = places.map((positionM, i) => ({
      positionM,
      massKg: i < 2 ? outer : 0.5 - outer,
    }))
    for (const x of [-0.2, 0.2]) nodes.push({ positionM: [x, -1], massKg: 1, pinned: true })
    const stiff = [0, 1, 2, 3].flatMap((a) =>
      [1, 2, 3].filter((b) => b > a).map((b) => ({ a, b, stiffnessNpm: 2e9, dampingNspm: 0 })),
    )
    const legs = [0, 1].map((a) => ({ a, b: a + 4, stiffnessNpm: 200, dampingNspm: 0 }))
    const found = naturalModes({
      nodes,
      struts: [...stiff, ...legs],
      gravityMps2: [0, 0],
      stepSeconds: 'auto',
    })
    return found.modes.map(({ radps }) => radps).filter((w) => w > 1 && w < 1000)
  }

  test('I = 0.02 kg m^2, j = 0.5: 20 and 28.284271247462 rad/s', () => {
    const [bounce, pitch] = modes(0.02)
    expect(relative(bounce!, 20)).toBeLessThan(1e-6)
    expect(relative(pitch!, 28.284271247462)).toBeLessThan(1e-6)
  })

  test('equal when j = I / (m d^2) = 1', () => {
    const [bounce, pitch] = modes(0.0399)
    expect(relative(pitch! / bounce!, Math.sqrt(0.04 / 0.0399))).toBeLessThan(1e-6)
  })
})
