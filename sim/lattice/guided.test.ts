// Drives, sensors and guided struts: limits of stroke, rate, force and power, feedback, sweeps. Against hand calculation.

import { describe, expect, test } from 'vitest'
import { actuatorClasses } from '../../shared/making/actuators.js'
import { addForces, advance } from './advance.js'
import { buildLattice } from './build.js'
import { lengthRateMps, powerW, tensionN } from './observe.js'
import { phaseAt } from './reference/drive.js'
import type { GuidedSpec, LatticeSpec } from './spec.js'

const h = 1e-3
const strut = { a: 0, b: 1, restM: 1, stiffnessNpm: 100, dampingNspm: 0, actuator: 'unlimited' } as const
/** Two nodes, 1 m apart, joined by one guided strut; the second one may move. */
function guidedPair(guided: Partial<GuidedSpec>, rest: Partial<LatticeSpec> = {}) {
  return buildLattice({
    nodes: [
      { positionM: [0, 0], massKg: 1, pinned: true },
      { positionM: [1, 0], massKg: 1 },
    ],
    struts: [],
    guided: [{ ...strut, ...guided }],
    gravityMps2: [0, 0],
    stepSeconds: h,
    ...rest,
  })
}

describe('a guided strut', () => {
  test('goes to the wanted strain at its rate and no further than its stroke', () => {
    const lattice = guidedPair({ strainLimit: 0.2, strainRateLimitPerSecond: 0.5 })
    lattice.hostStrain[0] = 0.3
    advance(lattice, 100)
    expect(lattice.guidedStrain[0]).toBeCloseTo(0.05, 12)
    advance(lattice, 400)
    expect(lattice.guidedStrain[0]).toBeCloseTo(0.2, 12)
    lattice.hostStrain[0] = -1
    advance(lattice, 200)
    expect(lattice.guidedStrain[0]).toBeCloseTo(0.1, 12)
    advance(lattice, 2_000)
    expect(lattice.guidedStrain[0]).toBeCloseTo(-0.2, 12)
  })

  test('without limits it does at once what is wanted, and pushes as a strut of that rest length', () => {
    const lattice = guidedPair({})
    lattice.hostStrain[0] = 0.1
    advance(lattice, 1)
    // F = k rest e on 1 kg: v = h 100 0.1.
    expect(lattice.nodes[8]).toBeCloseTo(h * 10, 12)
  })

  test('follows the drive of its group like an active strut, bit for bit where nothing limits it', () => {
    const drive = { group: 0, strain: 0.1, phaseTurns: 0.3 }
    const groups = [{ frequencyHz: 1.3, lagSeconds: 0.05 }]
    const guided = guidedPair(drive, { groups })
    const active = guidedPair({}, { groups, guided: [], actuators: [{ ...strut, ...drive }] })
    advance(guided, 1_500)
    advance(active, 1_500)
    // target - e + e is not e to the bit.
    expect(guided.nodes[6]).toBeCloseTo(active.nodes[6]!, 12)
    expect(Math.abs(active.nodes[6]! - 1)).toBeGreaterThan(1e-3)
  })

  test('keeps within its force, and within its power while it drives', () => {
    const limits = { forceLimitN: 8, powerLimitW: 0.5 }
    const lattice = guidedPair({ ...limits, dampingNspm: 0.5 })
    let [most, pushed, braked] = [0, 0, 0]
    for (let i = 0; i < 3_000; i++) {
      lattice.hostStrain[0] = i % 700 < 350 ? 0.15 : -0.15
      advance(lattice, 1)
      const tension = Math.abs(tensionN(lattice, 0))
      expect(tension).toBeLessThanOrEqual(8 + 1e-12)
      pushed = Math.max(pushed, tension)
      most = Math.max(most, powerW(lattice, 0))
      braked = Math.min(braked, powerW(lattice, 0))
    }
    expect(pushed).toBeGreaterThan(7.9)
    expect(most).toBeLessThanOrEqual(0.5 + 1e-12)
    expect(most).toBeGreaterThan(0.49)
    // Taking power in is not limited.
    expect(braked).toBeLessThan(-0.5)
  })

  test('what observe.tensionN says is the force on the node', () => {
    const lattice = guidedPair({ powerLimitW: 0.3, forceLimitN: 9, dampingNspm: 1 })
    lattice.hostStrain[0] = 0.12
    let limited = 0
    for (let i = 0; i < 500; i++) {
      advance(lattice, 1)
      addForces(lattice)
      // On node 1, along -x for tension.
      expect(-lattice.nodes[10]!).toBeCloseTo(tensionN(lattice, 0), 10)
      if (-tensionN(lattice, 0) * lengthRateMps(lattice, 0) > 0.299) limited++
      for (const at of [4, 5, 10, 11]) lattice.nodes[at] = 0
    }
    expect(limited).toBeGreaterThan(20)
  })
})

describe('an actuator', () => {
  test('has its stroke made smaller by strain and rate limits, at the frequency of its group', () => {
    const stroke = (limits: object, groups = [{ frequencyHz: 2 }] as LatticeSpec['groups']) => {
      const actuators = [{ ...strut, group: 0, strain: 0.3, phaseTurns: 0, ...limits }]
      return guidedPair({}, { guided: [], actuators, groups: groups! }).strainCos[0]!
    }
    expect(stroke({})).toBeCloseTo(0.3, 14)
    expect(stroke({ strainLimit: 0.25 })).toBeCloseTo(0.25, 14)
    expect(stroke({ strainRateLimitPerSecond: 1.2 })).toBeCloseTo(1.2 / (4 * Math.PI), 14)
    const sweep = [{ frequencyHz: 1, sweep: { toHz: 4, seconds: 1 } }]
    expect(stroke({ strainRateLimitPerSecond: 1.2 }, sweep)).toBeCloseTo(1.2 / (8 * Math.PI), 14)
  })
})

describe('sensors', () => {
  const onGround: Partial<LatticeSpec> = {
    nodes: [
      { positionM: [0, 1], massKg: 1, pinned: true },
      { positionM: [1, -0.001], massKg: 1 },
    ],
    ground: { firstXM: -5, spacingM: 5, heightsM: [0, 0, 0] },
    contact: { stiffness: 9810, damping: 0, exponent: 1, depthLimitM: 0.01 },
    gravityMps2: [0, -9.81],
  }

  test('contact through a filter rises as 1 - (1 - h/T)^n, one step behind the ground', () => {
    const sensors = [
      { kind: 'contact', node: 1, filterSeconds: 0.02 } as const,
      { kind: 'contact', node: 0 } as const,
    ]
    const lattice = guidedPair({ stiffnessNpm: 0 }, { ...onGround, sensors })
    advance(lattice, 31)
    expect(lattice.touching[1]).toBe(1)
    expect(lattice.sensed[0]).toBeCloseTo(1 - 0.95 ** 30, 12)
    expect(lattice.sensed[1]).toBe(0)
  })

  test('strain of a strut drives feedback: target = gain * strain', () => {
    const sensors = [{ kind: 'strain', strut: 0 } as const]
    const feedback = [{ sensor: 0, gain: -0.5 }]
    const lattice = guidedPair({ feedback, stiffnessNpm: 10 }, { sensors })
    lattice.nodes[6] = 1.2
    advance(lattice, 1)
    expect(lattice.sensed[0]).toBeCloseTo(0.2, 12)
    expect(lattice.guidedStrain[0]).toBeCloseTo(-0.1, 12)
  })

  test('with gain g on its own strain the strut is 1 - g times as stiff', () => {
    // k (L - L0 (1 + g (L - L0)/L0)) = k (1 - g)(L - L0): w = sqrt(100 * 1.44) rad/s.
    const sensors = [{ kind: 'strain', strut: 0 } as const]
    const lattice = guidedPair({ feedback: [{ sensor: 0, gain: -0.44 }] }, { sensors, stepSeconds: 1e-4 })
    lattice.nodes[6] = 1.01
    let crossings = 0
    let last = 0.01
    let when = 0
    for (let i = 1; crossings < 21; i++) {
      advance(lattice, 1)
      const now = lattice.nodes[6]! - 1
      if (last >= 0 !== now >= 0) {
        crossings++
        if (crossings === 1 || crossings === 21) when = i * 1e-4 - when
      }
      last = now
    }
    expect(when).toBeCloseTo((20 * Math.PI) / 12, 3)
  })
})

describe('a sweep', () => {
  const swept = (stepSeconds: number, startSeconds: number) =>
    guidedPair(
      { group: 0 },
      {
        groups: [{ frequencyHz: 2, sweep: { toHz: 11, seconds: 1.7 } }, { frequencyHz: 3.3 }],
        drive: { startSeconds, rampSeconds: 0 },
        stepSeconds,
      },
    )

  test('the phase is 2 pi (f0 t + (f1 - f0) t^2 / 2 T), then goes on at f1; the rotors follow it for 10,000 steps', () => {
    const lattice = swept(5e-4, 0.3)
    const turn = 2 * Math.PI
    const phase = (t: number) =>
      t < 1.7 ? turn * (2 * t + (9 * t * t) / 3.4) : turn * (6.5 * 1.7 + 11 * (t - 1.7))
    let worst = 0
    for (const until of [599, 601, 855, 856, 857, 2_000, 3_999, 4_000, 4_001, 4_057, 6_100, 10_000]) {
      advance(lattice, until - lattice.step)
      const t = (until - 600) * 5e-4
      const [s, c] = t < 0 ? [0, 1] : [Math.sin(phase(t)), Math.cos(phase(t))]
      worst = Math.max(worst, Math.abs(lattice.rotors[0]! - s), Math.abs(lattice.rotors[1]! - c))
      if (t >= 0) {
        expect(phaseAt(lattice, 0, until - 600)).toBeCloseTo(phase(t), 9)
        expect(lattice.rotors[2]).toBeCloseTo(Math.sin(turn * 3.3 * t), 10)
      }
    }
    expect(worst).toBeLessThan(1e-10)
  })

  test('a prescribed node runs up along it, and how calls are split changes no bit', () => {
    const build = () =>
      guidedPair(
        { dampingNspm: 1 },
        {
          groups: [{ frequencyHz: 1, sweep: { toHz: 5, seconds: 0.9 } }],
          prescribed: [{ node: 0, group: 0, amplitudeM: [0.01, 0], phaseTurns: 0 }],
        },
      )
    const [once, often] = [build(), build()]
    advance(once, 2_000)
    for (let i = 0; often.step < 2_000; i++) advance(often, Math.min(1 + ((31 * i) % 97), 2_000 - often.step))
    expect(often.nodes).toEqual(once.nodes)
    // Phase at 2 s: 2 pi (3 * 0.9 + 5 * 1.1).
    expect(once.nodes[0]).toBeCloseTo(0.01 * Math.sin(2 * Math.PI * (2.7 + 5.5)), 12)
  })

  test('a lag is refused with it: it belongs to one frequency', () => {
    const groups = [{ frequencyHz: 1, lagSeconds: 0.1, sweep: { toHz: 2, seconds: 1 } }]
    expect(() => guidedPair({}, { groups })).toThrow(/no lag with a sweep/)
  })
})

describe('without limits of its own', () => {
  const plain = { a: 0, b: 1, restM: 0.1, stiffnessNpm: 100, dampingNspm: 0 }
  const drive = { group: 0, strain: 0.9, phaseTurns: 0 }
  const nodes = [0, 0.1].map((place) => ({ positionM: [place, 0], massKg: 1 }))
  const spec: LatticeSpec = {
    nodes,
    struts: [],
    groups: [{ frequencyHz: 0.5 }],
    gravityMps2: [0, 0],
    stepSeconds: h,
  }
  const { bellows, memoryWire, wormGearedMotor } = actuatorClasses
  // The row's numbers, written out: 50 kPa on a bore of 12 mm, a quarter of the length, 1.2 a second, and a quarter of
  // force times rate.
  const forceN = 50e3 * Math.PI * 0.006 * 0.006

  test('an active and a guided strut have those of the small bellows: force, stroke, rate, power', () => {
    const lattice = buildLattice({
      ...spec,
      actuators: [{ ...plain, ...drive }],
      guided: [{ ...plain, ...drive }],
    })
    for (let j = 0; j < 2; j++) {
      expect(lattice.limitN[j]).toBeCloseTo(forceN, 12)
      expect(lattice.powerMostW[j]).toBeCloseTo((0.1 * forceN * 1.2) / 4, 12)
    }
    // 0.25 needs a rate of 0.785 a second at 0.5 Hz, which it has.
    expect(lattice.strainCos[0]).toBeCloseTo(0.25, 12)
    expect(lattice.strokeMost[0]).toBe(0.25)
    expect(lattice.strainStepMost[0]).toBeCloseTo(1.2 * h, 15)
    const fast = buildLattice({ ...spec, groups: [{ frequencyHz: 2 }], actuators: [{ ...plain, ...drive }] })
    expect(fast.strainCos[0]).toBeCloseTo(1.2 / (4 * Math.PI), 12)
  })

  test('those of the class that is named hold, and single numbers in their place', () => {
    const wire = { ...plain, ...drive, actuator: memoryWire }
    const lattice = buildLattice({
      ...spec,
      actuators: [wire, { ...wire, powerLimitW: 3, strainLimit: 0.01 }],
    })
    expect(lattice.limitN[0]).toBe(memoryWire.forceMost)
    // 0.04 a second at 0.5 Hz allow 0.0127.
    expect(lattice.strainCos[0]).toBeCloseTo(0.04 / Math.PI, 12)
    expect(lattice.powerMostW[0]).toBeCloseTo(0.1 * memoryWire.powerMost, 15)
    expect([lattice.powerMostW[1], lattice.strainCos[1]]).toEqual([3, expect.closeTo(0.01, 12)])
  })

  test('nothing limits what says so, and a motor that turns is refused by name', () => {
    const free = { ...plain, ...drive, actuator: 'unlimited' } as const
    const lattice = buildLattice({ ...spec, actuators: [free], guided: [free] })
    expect(Array.from(lattice.limitN)).toEqual([Number.POSITIVE_INFINITY, Number.POSITIVE_INFINITY])
    expect(Array.from(lattice.powerMostW)).toEqual([Number.POSITIVE_INFINITY, Number.POSITIVE_INFINITY])
    expect(lattice.strokeMost[0]).toBe(Number.POSITIVE_INFINITY)
    expect(lattice.strainCos[0]).toBeCloseTo(0.9, 12)
    const turning = () =>
      buildLattice({ ...spec, actuators: [{ ...plain, ...drive, actuator: wormGearedMotor }] })
    expect(turning).toThrow(/worm-geared/)
  })

  test('an active strut keeps within its power while it drives, takes more in, and tells it', () => {
    const actuators = [{ ...plain, ...drive, strain: 0.2, actuator: bellows, powerLimitW: 0.01 }]
    const lattice = buildLattice({ ...spec, groups: [{ frequencyHz: 0.9 }], actuators })
    let [most, braked, limited] = [0, 0, 0]
    for (let i = 0; i < 3000; i++) {
      advance(lattice, 1)
      most = Math.max(most, powerW(lattice, 0))
      braked = Math.min(braked, powerW(lattice, 0))
      addForces(lattice)
      // On node 1, along -x for tension.
      expect(-lattice.nodes[10]!).toBeCloseTo(tensionN(lattice, 0), 10)
      if (powerW(lattice, 0) > 0.00999) limited++
      for (const at of [4, 5, 10, 11]) lattice.nodes[at] = 0
    }
    expect(most).toBeLessThanOrEqual(0.01 + 1e-12)
    expect(limited).toBeGreaterThan(20)
    expect(braked).toBeLessThan(-0.011)
  })
})
