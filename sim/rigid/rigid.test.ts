// What the adapter promises beside its physics (tests/reference/rigid-*): refusals by name, faults, order, symmetry.

import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { Refusal } from '../../shared/refusals.js'
import { buildRigid, library, withRigid } from './rigid2d.js'
import { buildRigid as buildInSpace, library as libraryOfSpace } from './rigid3d.js'
import type { BodySpec, JointSpec, MotorSpec, RigidSpec, ShapeSpec } from './spec.js'

const material = { friction: 0.5, density: 10 }
const block = (halfM: readonly number[], layer?: string): ShapeSpec => {
  return { outline: { kind: 'box', halfM }, material, ...(layer ? { layer } : {}) }
}
const base: BodySpec = { name: 'base', fixed: true, positionM: [0, 0], shapes: [] }
const arm: BodySpec = { name: 'arm', positionM: [0.5, 0], shapes: [block([0.5, 0.05])] }
const motor: MotorSpec = { stiffness: 100, damping: 10, effortMost: 50, rateMost: 1, powerMostW: 50 }
const pin: JointSpec = {
  name: 'pin',
  kind: 'hinge',
  a: 'base',
  b: 'arm',
  onAM: [0, 0],
  onBM: [-0.5, 0],
  motor,
}
const good: RigidSpec = { gravityMps2: [0, -9.81], stepSeconds: 0.01, bodies: [base, arm], joints: [pin] }

function refusalOf(spec: RigidSpec, build: (spec: RigidSpec) => unknown = buildRigid): Refusal {
  try {
    build(spec)
  } catch (error) {
    if (error instanceof Refusal) return error
    throw error
  }
  throw new Error('nothing was refused')
}
const withArm = (change: Partial<BodySpec>): RigidSpec => ({ ...good, bodies: [base, { ...arm, ...change }] })
const withPin = (change: Partial<JointSpec>): RigidSpec => ({ ...good, joints: [{ ...pin, ...change }] })
const withShape = (change: Partial<ShapeSpec>): RigidSpec =>
  withArm({ shapes: [{ ...block([0.5, 0.05]), ...change }] })

describe('what cannot be built is refused by name', () => {
  const cases: readonly (readonly [string, RigidSpec, string])[] = [
    ['a radius below 0', withShape({ outline: { kind: 'ball', radiusM: -1 } }), 'body arm.shapes[0].radiusM'],
    ['a side of 0', withShape({ outline: { kind: 'box', halfM: [0.5, 0] } }), 'body arm.shapes[0].halfM'],
    [
      'a line on what moves',
      withShape({
        outline: {
          kind: 'line',
          pointsM: [
            [0, 0],
            [1, 0],
          ],
        },
      }),
      'body arm',
    ],
    [
      'points on one line',
      withShape({
        outline: {
          kind: 'hull',
          pointsM: [
            [0, 0],
            [1, 1],
            [2, 2],
          ],
        },
      }),
      'body arm',
    ],
    ['a negative friction', withShape({ material: { friction: -0.1, density: 1 } }), 'friction'],
    [
      'a restitution above 1',
      withShape({ material: { friction: 0, restitution: 1.1, density: 1 } }),
      'restitution',
    ],
    ['a density that is no number', withShape({ material: { friction: 0, density: Number.NaN } }), 'density'],
    ['no mass', withShape({ material: { friction: 0, density: 0 } }), 'body arm'],
    ['a place that is no number', withArm({ positionM: [Number.NaN, 0] }), 'body arm.positionM'],
    ['a place of three numbers', withArm({ positionM: [0, 0, 0] }), 'body arm.positionM'],
    ['a turn that is a quaternion', withArm({ turn: [0, 0, 0, 1] }), 'body arm.turn'],
    ['two bodies of one name', { ...good, bodies: [base, arm, arm] }, 'body arm'],
    ['a joint to nobody', withPin({ b: 'leg' }), 'joint pin.b'],
    ['a joint of a body with itself', withPin({ a: 'arm' }), 'joint pin'],
    ['ends apart', withPin({ onBM: [-0.4, 0] }), 'joint pin'],
    ['a range the wrong way round', withPin({ range: [1, -1] }), 'joint pin.range'],
    ['a slider without direction', withPin({ kind: 'slider' }), 'joint pin.axis'],
    ['a motor in a fixed joint', withPin({ kind: 'fixed' }), 'joint pin.motor'],
    ['a motor without power', withPin({ motor: { ...motor, powerMostW: 0 } }), 'joint pin.motor.powerMostW'],
    ['a step of 0', { ...good, stepSeconds: 0 }, 'stepSeconds'],
    ['half a round of the solver', { ...good, solverRounds: 0.5 }, 'solverRounds'],
    ['an unknown layer', { ...good, apart: [['arm', 'leg']] }, 'apart'],
    ['no bodies', { ...good, bodies: [], joints: [] }, 'bodies'],
  ]
  test.each(cases)('%s', (_name, spec, where) => {
    const refusal = refusalOf(spec)
    expect(refusal.code).toBe('impossible-value')
    expect(refusal.where?.field).toContain(where)
  })

  test('a cylinder in the plane, and a hinge in space whose axis its bodies see differently', () => {
    expect(
      refusalOf(withShape({ outline: { kind: 'cylinder', halfLengthM: 1, radiusM: 1 } })).detail,
    ).toContain('2-D')
    const half = Math.SQRT1_2
    const inSpace: RigidSpec = {
      gravityMps2: [0, 0, 0],
      stepSeconds: 0.01,
      bodies: [
        { ...base, positionM: [0, 0, 0] },
        { name: 'arm', positionM: [0, 0, 0], turn: [half, 0, 0, half], shapes: [block([0.5, 0.5, 0.5])] },
      ],
      joints: [
        {
          name: 'pin',
          kind: 'hinge',
          a: 'base',
          b: 'arm',
          onAM: [0, 0, 0],
          onBM: [0, 0, 0],
          axis: [0, 0, 1],
        },
      ],
    }
    expect(refusalOf(inSpace, buildInSpace).where?.field).toBe('rigid.joint pin')
  })
})

test('a state that is not finite is a fault with its body and time, not a silent stop', () => {
  withRigid(good, (world) => {
    expect(world.advance(32)).toBeUndefined()
    world.load(world.body('arm'), [Number.NaN, 0], [0])
    expect(world.advance(16)).toEqual({ reason: 'the state of body arm is not finite', seconds: 0.48 })
  })
})

test('a body at the speed where the library cuts off is a fault; so is one that leaves the world', () => {
  const free = (change: Partial<BodySpec>): RigidSpec => ({ ...withArm(change), joints: [] })
  expect(refusalOf(free({ velocityMps: [401, 0] })).where?.field).toBe('rigid.body arm.velocityMps')
  expect(refusalOf(free({ spinRadps: 80 })).where?.field).toBe('rigid.body arm.spinRadps')
  withRigid(free({}), (world) => {
    world.load(1, [1e6, 0], [0])
    expect(world.advance(1_000)?.reason).toBe('body arm is faster than 400 m/s')
  })
  withRigid(free({}), (world) => {
    world.load(1, [0, 0], [1e4])
    expect(world.advance(1_000)?.reason).toBe('body arm turns by more than an eighth of a turn a step')
  })
  withRigid({ ...free({ positionM: [9_990, 0], velocityMps: [300, 0] }) }, (world) => {
    expect(world.advance(1_000)?.reason).toBe('body arm has left the world')
  })
})

test('libraries are named with their versions', () => {
  expect(library).toBe('rapier2d-deterministic-0.20.0')
  expect(libraryOfSpace).toBe('rapier3d-deterministic-0.21.0')
})

test('layers named as apart pass through each other, others do not', () => {
  const world = (apart: RigidSpec['apart']): RigidSpec => ({
    gravityMps2: [0, -9.81],
    stepSeconds: 0.01,
    bodies: [
      { ...base, positionM: [0, -0.5], shapes: [block([5, 0.5], 'floor')] },
      { name: 'tine', positionM: [-1, 0.1], shapes: [block([0.1, 0.1], 'tines')] },
      { name: 'stone', positionM: [1, 0.1], shapes: [block([0.1, 0.1], 'stones')] },
    ],
    ...(apart ? { apart } : {}),
  })
  withRigid(world([['tines', 'floor']]), (one) => {
    one.advance(100)
    expect(one.pose(1)[1]!).toBeLessThan(-3)
    expect(one.pose(2)[1]!).toBeGreaterThan(0.09)
  })
  withRigid(world([]), (one) => {
    one.advance(100)
    expect(one.pose(1)[1]!).toBeGreaterThan(0.09)
  })
})

test('a hinge counts the whole turns that its bodies are built with', () => {
  for (const turn of [-3.5, 0, 4, 7]) {
    const turned = { ...arm, turn, positionM: [0.5 * Math.cos(turn), 0.5 * Math.sin(turn)] }
    withRigid({ ...good, gravityMps2: [0, 0], bodies: [base, turned] }, (world) => {
      world.command(0, turn)
      world.advance(100)
      expect(world.placeOf(0)).toBeCloseTo(turn, 4)
      expect(world.driveOf(0).workGivenJ).toBeLessThan(1e-3)
    })
  }
})

test('a fixed joint keeps two bodies as they were built, turned against each other too', () => {
  const bodies = [
    { ...arm, name: 'one', positionM: [0, 0] },
    { ...arm, name: 'two', positionM: [0.5, 0.5], turn: Math.PI / 2 },
  ]
  const weld: JointSpec = { name: 'weld', kind: 'fixed', a: 'one', b: 'two', onAM: [0.5, 0], onBM: [-0.5, 0] }
  withRigid({ gravityMps2: [0, -9.81], stepSeconds: 0.01, bodies, joints: [weld] }, (world) => {
    world.load(0, [0, 0], [5])
    world.advance(100)
    expect(
      world.pose(1)[2]! -
        world.pose(0)[2]! -
        2 * Math.PI * Math.round((world.pose(1)[2]! - world.pose(0)[2]!) / (2 * Math.PI)),
    ).toBeCloseTo(Math.PI / 2, 3)
  })
})

describe('order and symmetry', () => {
  /** Blocks, tumbling, above a floor; mirrored where asked. */
  const heap = (places: readonly (readonly [number, number, number])[], side: 1 | -1): RigidSpec => ({
    gravityMps2: [0, -9.81],
    stepSeconds: 1 / 120,
    bodies: [
      { ...base, positionM: [0, -0.5], shapes: [block([5, 0.5])] },
      ...places.map(([x, y, turn], i) => ({
        name: `block ${i}`,
        positionM: [side * x, y + 0.6 * i],
        turn: side * turn,
        shapes: [block([0.2, 0.1])],
      })),
    ],
  })
  const place = fc.tuple(
    fc.double({ min: -0.3, max: 0.3, noNaN: true }),
    fc.double({ min: 0.3, max: 0.5, noNaN: true }),
    fc.double({ min: -1, max: 1, noNaN: true }),
  )

  test('two runs in one process are equal to the bit, whatever else ran between', () => {
    fc.assert(
      fc.property(fc.array(place, { minLength: 2, maxLength: 5 }), (places) => {
        const once = () =>
          withRigid(heap(places, 1), (world) => {
            world.advance(120)
            return [world.digest(), world.innerDigest()]
          })
        const first = once()
        withRigid(good, (world) => world.advance(7))
        expect(once()).toEqual(first)
      }),
      { numRuns: 10, seed: 20261201 },
    )
  })

  test('a mirrored heap does the mirror image before it touches anything, to single precision', () => {
    // After contact it need not: the solver takes contacts in an order of its own, and heaps are chaotic.
    const flights = ([1, -1] as const).map((side) =>
      withRigid(heap([[0.2, 0.4, 0.3]], side), (world) => {
        world.advance(20)
        return [...world.pose(1)]
      }),
    )
    expect(flights[1]![0]).toBeCloseTo(-flights[0]![0]!, 6)
    expect(flights[1]![1]).toBeCloseTo(flights[0]![1]!, 6)
    expect(flights[1]![2]).toBeCloseTo(-flights[0]![2]!, 6)
  })

  test('bodies that only meet each other keep momentum, and angular momentum, to single precision', () => {
    fc.assert(
      fc.property(fc.array(place, { minLength: 2, maxLength: 4 }), (places) => {
        const bodies = places.map(([x, y, turn], i) => ({
          name: `block ${i}`,
          positionM: [0.5 * i, y],
          turn,
          velocityMps: [-x - 0.4 * i, x],
          spinRadps: turn,
          shapes: [block([0.2, 0.1])],
        }))
        withRigid({ gravityMps2: [0, 0], stepSeconds: 1 / 120, bodies }, (world) => {
          const before = world.momenta()
          world.advance(240)
          const after = world.momenta()
          for (const k of [0, 1]) expect(Math.abs(after.linear[k]! - before.linear[k]!)).toBeLessThan(1e-5)
          // A contact acts at one point for both; its place moves within a step: measured below 1e-3.
          expect(Math.abs(after.angular[0]! - before.angular[0]!)).toBeLessThan(5e-3)
        })
      }),
      { numRuns: 20, seed: 20261201 },
    )
  })
})
