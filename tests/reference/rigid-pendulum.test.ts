// Pendulums and driven joints of the rigid-body adapter. Periods: Landau and Lifshitz, Mechanics, 1976, section 11 (from
// memory), numbers recomputed independently by the arithmetic-geometric mean. Class: time stepping, 1e-3 and first order.

import { describe, expect, test } from 'vitest'
import type { BodySpec, RigidSpec } from '../../sim/rigid/spec.js'
import { ball, box, degree, fixed, g, orderOf, pass, periodRatio, run } from './rigid-bodies.js'

function pendulum(body: BodySpec, onBM: readonly number[], stepSeconds: number): RigidSpec {
  const pin = { name: 'pin', kind: 'hinge', a: 'base', b: body.name, onAM: [0, 0], onBM } as const
  return { gravityMps2: [0, -g], stepSeconds, bodies: [fixed('base', []), body], joints: [pin] }
}

/** A body that hangs from the origin by a point this far above its own origin, let go at an angle. */
function hung(armM: number, angle: number, rest: Omit<BodySpec, 'name' | 'positionM' | 'turn'>): BodySpec {
  return { name: 'bob', positionM: [armM * Math.sin(angle), -armM * Math.cos(angle)], turn: angle, ...rest }
}

/** Four times the time to the lowest point, from rest. */
function periodFromFirstQuarter(spec: RigidSpec): number {
  return run(spec, (world) => {
    for (let before = world.placeOf(0); ; ) {
      pass(world, world.stepSeconds)
      const now = world.placeOf(0)
      if (now <= 0) return 4 * (world.steps - 1 + before / (before - now)) * world.stepSeconds
      before = now
    }
  })
}

describe('a point mass on a rod', () => {
  const rows = [
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
  ] as const
  const mass = { shapes: [], extra: { massKg: 1, centreM: [0, 0], inertiaKgm2: 1e-6 } }
  const errorOf = (angle: number, ratio: number, h: number) => {
    const exact = 2 * Math.PI * Math.sqrt(1 / g) * ratio
    return periodFromFirstQuarter(pendulum(hung(1, angle * degree, mass), [0, 1], h)) / exact - 1
  }

  test.each(rows)('from %d degrees swings %d times as long as from none', (angle, ratio) => {
    expect(Math.abs(periodRatio(angle * degree) / ratio - 1)).toBeLessThan(1e-10)
    expect(Math.abs(errorOf(angle, ratio, 1 / 480))).toBeLessThan(1e-3)
  })

  test('nears the period at first order', () => {
    const order = orderOf((h) => Math.abs(errorOf(30, rows[3][1], h)), [1 / 120, 1 / 960])
    expect(Math.abs(order - 1)).toBeLessThan(0.1)
  })

  test('loses energy to the joint solver, less with smaller steps: 3 to 4 % of a swing from 90 degrees at 1/120 s', () => {
    // Not the physics of a pin: the library's own damping, stated so that nobody takes it for friction.
    const lost = (h: number) =>
      run(pendulum(hung(1, 90 * degree, mass), [0, 1], h), (world) => {
        const before = world.kineticJ() + world.gravitationalJ()
        pass(world, 2 * Math.PI * Math.sqrt(1 / g) * rows[6][1])
        return (before - world.kineticJ() - world.gravitationalJ()) / g
      })
    expect(lost(1 / 120)).toBeGreaterThan(0)
    expect(lost(1 / 120)).toBeLessThan(0.05)
    expect(lost(1 / 480) / lost(1 / 120)).toBeLessThan(0.35)
  })
})

describe('compound pendulums', () => {
  test.each([
    ['a rod of 1 m about its end', box([0.002, 0.5]), 0.5, 1.637946585913],
    ['a disc of radius 1 m about its rim', ball(1), 1, 2.45691987887],
  ] as const)('%s', (_name, shape, armM, seconds) => {
    const period = periodFromFirstQuarter(pendulum(hung(armM, 0.02, { shapes: [shape] }), [0, armM], 1 / 960))
    // The table is for small swings: 0.02 rad add 2.5e-5.
    expect(Math.abs(period / seconds - 1)).toBeLessThan(1e-3)
  })
})

describe('a driven joint', () => {
  const motor = { stiffness: 8000, damping: 400, effortMost: 400, rateMost: 1, powerMostW: 1000 }
  const arm = (h: number, limits: Partial<typeof motor> = {}): RigidSpec => ({
    gravityMps2: [0, -g],
    stepSeconds: h,
    bodies: [
      fixed('base', []),
      { name: 'arm', positionM: [0.5, 0], shapes: [box([0.5, 0.04], { density: 100 })] },
      { name: 'forearm', positionM: [1.5, 0], shapes: [box([0.5, 0.04], { density: 50 })] },
    ],
    joints: [
      {
        name: 'shoulder',
        kind: 'hinge',
        a: 'base',
        b: 'arm',
        onAM: [0, 0],
        onBM: [-0.5, 0],
        motor: { ...motor, ...limits },
      },
      {
        name: 'elbow',
        kind: 'hinge',
        a: 'arm',
        b: 'forearm',
        onAM: [0.5, 0],
        onBM: [-0.5, 0],
        motor: { ...motor, ...limits },
      },
    ],
  })

  test.each([1 / 60, 1 / 240])(
    'holds what statics asks, and sags by effort over stiffness, at steps of %d s',
    (h) => {
      run(arm(h), (world) => {
        pass(world, 6)
        const [shoulder, elbow] = [world.placeOf(0), world.placeOf(1)]
        const [upperKg, lowerKg] = [world.massOf(1).massKg, world.massOf(2).massKg]
        const lower = lowerKg * g * 0.5 * Math.cos(shoulder + elbow)
        const upper = (upperKg * 0.5 + lowerKg) * g * Math.cos(shoulder) + lower
        expect(Math.abs(world.driveOf(0).effort / upper - 1)).toBeLessThan(1e-3)
        expect(Math.abs(world.driveOf(1).effort / lower - 1)).toBeLessThan(1e-3)
        expect(Math.abs((-shoulder * motor.stiffness) / upper - 1)).toBeLessThan(1e-3)
        expect(Math.abs((-elbow * motor.stiffness) / lower - 1)).toBeLessThan(1e-3)
      })
    },
  )

  test('gives as much work as the links gain, 0.5 % at 1/120 s and better at 1/480 s', () => {
    // Energy balance: common practice, no source.
    const miss = (h: number) =>
      run(arm(h), (world) => {
        const before = world.kineticJ() + world.gravitationalJ()
        for (let i = 0; i * h < 3; i++) {
          world.command(0, 0.5 * Math.sin(2 * i * h))
          world.command(1, -0.8 * Math.sin(3 * i * h))
          pass(world, h)
        }
        const gained = world.kineticJ() + world.gravitationalJ() - before
        const given = world.driveOf(0).workGivenJ + world.driveOf(1).workGivenJ
        return Math.abs(world.driveOf(0).workJ + world.driveOf(1).workJ - gained) / given
      })
    expect(miss(1 / 120)).toBeLessThan(5e-3)
    expect(miss(1 / 480)).toBeLessThan(0.5 * miss(1 / 120))
  })

  test('stays within effort, rate and power', () => {
    run(arm(1 / 120, { effortMost: 120, rateMost: 0.5, powerMostW: 30 }), (world) => {
      for (let i = 0; i < 480; i++) {
        world.command(0, i % 240 < 120 ? 0.6 : -0.6)
        const before = world.rateOf(0)
        pass(world, 1 / 120)
        const { effort } = world.driveOf(0)
        expect(Math.abs(effort)).toBeLessThanOrEqual(120)
        expect((effort * (before + world.rateOf(0))) / 2).toBeLessThan(30 * 1.02)
      }
      expect(world.driveOf(0).peakEffort).toBeGreaterThan(100)
      expect(world.driveOf(0).peakPowerW).toBeLessThan(30 * 1.02)
    })
  })

  test('a slider lifts with the weight, and its work is the weight times the way', () => {
    const spec: RigidSpec = {
      gravityMps2: [0, -g],
      stepSeconds: 1 / 120,
      bodies: [
        fixed('base', []),
        { name: 'load', positionM: [0, 0], shapes: [box([0.1, 0.1], { density: 100 })] },
      ],
      joints: [
        {
          name: 'lift',
          kind: 'slider',
          a: 'base',
          b: 'load',
          onAM: [0, 0],
          onBM: [0, 0],
          axis: [0, 1],
          motor: { stiffness: 5000, damping: 500, effortMost: 100, rateMost: 0.2, powerMostW: 100 },
        },
      ],
    }
    run(spec, (world) => {
      pass(world, 2)
      const [start, workJ] = [world.placeOf(0), world.driveOf(0).workJ]
      const weightN = world.massOf(1).massKg * g
      expect(Math.abs(world.driveOf(0).effort / weightN - 1)).toBeLessThan(1e-3)
      world.command(0, 0.5)
      pass(world, 5)
      expect(
        Math.abs((world.driveOf(0).workJ - workJ) / (weightN * (world.placeOf(0) - start)) - 1),
      ).toBeLessThan(1e-2)
    })
  })
})
