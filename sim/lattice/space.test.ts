// Ground, contact and friction in space: bilinear patches, the friction cone, headings, exact stick.

import { describe, expect, test } from 'vitest'
import { advance } from './advance.js'
import { buildLattice } from './build.js'
import { groundHeightM } from './ground.js'
import type { Lattice } from './layout.js'
import type { FrictionSpec, LatticeSpec, NodeSpec } from './spec.js'

const g = 9.81
const firm = { stiffness: 1e5, damping: 1e5, exponent: 1, depthLimitM: 0.01 } as const
const flat = { firstXM: -5, spacingM: 5, heightsM: [0, 0, 0], rows: 1 }

function onFloor(nodes: readonly NodeSpec[], rest: Partial<LatticeSpec> = {}): Lattice {
  return buildLattice({
    dimensions: 3,
    nodes,
    struts: [],
    gravityMps2: [0, -g, 0],
    ground: flat,
    contact: firm,
    stepSeconds: 1e-4,
    ...rest,
  })
}
const foot = (velocityMps: readonly number[], friction: FrictionSpec): NodeSpec => {
  return { positionM: [0, -g / firm.stiffness, 0], velocityMps, massKg: 1, friction }
}
const same = (mu: number): FrictionSpec => ({ forward: mu, backward: mu })

test('ground is bilinear between its heights and level beyond them, on all sides', () => {
  const ground = { firstXM: 1, spacingM: 2, heightsM: [0, 1, 4, 2, 3, 8], rows: 2, firstZM: -1, spacingZM: 4 }
  const lattice = onFloor([{ positionM: [0, 9, 0], massKg: 1 }], { ground })
  // Corners, edges, the middle of the first patch, and far beyond each side and corner.
  const rows = [
    [1, -1, 0],
    [3, -1, 1],
    [5, 3, 8],
    [2, -1, 0.5],
    [1, 1, 1],
    [2, 1, 1.5],
    [4, 0, 2.5 + 0.25 * 3],
    [-9, -9, 0],
    [90, 90, 8],
    [2, 90, 2.5],
    [90, 1, 6],
  ] as const
  for (const [x, z, height] of rows) expect(groundHeightM(lattice, x, z)).toBeCloseTo(height, 12)
})

test('one profile without rows is the same everywhere along z', () => {
  const ground = { firstXM: 0, spacingM: 1, heightsM: [0, 2, 1] }
  const lattice = onFloor([{ positionM: [0, 9, 0], massKg: 1 }], { ground })
  for (const z of [-7, 0, 0.3, 12]) expect(groundHeightM(lattice, 1.5, z)).toBe(1.5)
})

describe('isotropic friction is a cone, not a pyramid', () => {
  test('a mass slides as far in every direction, to 1e-6', () => {
    const distance = (degrees: number) => {
      const angle = (degrees * Math.PI) / 180
      const lattice = onFloor([foot([Math.cos(angle), 0, Math.sin(angle)], same(0.5))])
      advance(lattice, 4_000)
      const [x, z] = [lattice.nodes[0]!, lattice.nodes[2]!]
      expect(Math.abs(z * Math.cos(angle) - x * Math.sin(angle))).toBeLessThan(1e-12)
      return Math.sqrt(x * x + z * z)
    }
    const along = distance(0)
    // v^2 / (2 mu g).
    expect(Math.abs(along * g - 1)).toBeLessThan(1e-2)
    for (const degrees of [7, 30, 45, 61, 90, 135, 180, 222, 270, 333]) {
      expect(Math.abs(distance(degrees) / along - 1)).toBeLessThan(1e-6)
    }
  })

  test.each([
    [20, 0.1, 2.433379145033834],
    [30, 0.3, 2.356287236662397],
    [30, 0.5, 0.657145394437328],
    [45, 0.5, 3.46835876172001],
  ])(
    '%d degrees, mu %d: slides at %d m/s^2 down a slope along x, along z and between',
    (degrees, mu, truth) => {
      // a = g (sin - mu cos): Coulomb's law, any textbook of mechanics.
      const slope = Math.tan((degrees * Math.PI) / 180)
      for (const turn of [0, 90, 180, 37]) {
        const [dx, dz] = [Math.cos((turn * Math.PI) / 180), Math.sin((turn * Math.PI) / 180)]
        const height = (x: number, z: number) => -slope * (x * dx + z * dz)
        const ground = {
          firstXM: -50,
          spacingM: 100,
          heightsM: [height(-50, -50), height(50, -50), height(-50, 50), height(50, 50)],
          rows: 2,
          firstZM: -50,
          spacingZM: 100,
        }
        const cosine = Math.cos((degrees * Math.PI) / 180)
        const down = [cosine * dx, -cosine * slope, cosine * dz]
        const node = { ...foot(down, same(mu)), positionM: [0, (-g * cosine * cosine) / firm.stiffness, 0] }
        const lattice = onFloor([node], { ground, stepSeconds: 5e-5 })
        advance(lattice, 10_000)
        const [vx, vy, vz] = [lattice.nodes[3]!, lattice.nodes[4]!, lattice.nodes[5]!]
        const speed = Math.sqrt(vx * vx + vy * vy + vz * vz)
        expect(Math.abs((speed - 1) / 0.5 / truth - 1)).toBeLessThan(1e-6)
      }
    },
  )

  test('a held foot does not creep on a slope across both axes, at any step size', () => {
    const tilt = 0.26 // steepest 20.2 degrees at 45 degrees between the axes; mu = 0.5 holds 26.6
    const heightsM = [-1, 1].flatMap((z) => [-1, 1].map((x) => -tilt * (x + z)))
    const ground = { firstXM: -1, spacingM: 2, heightsM, rows: 2, firstZM: -1 }
    for (const stepSeconds of [1e-5, 1e-4, 1e-3]) {
      const contact = { ...firm, stiffness: 1e4, damping: 1e4 }
      const node = { ...foot([0, 0, 0], same(0.5)), positionM: [0, -g / (1 + 2 * tilt * tilt) / 1e4, 0] }
      const lattice = onFloor([node], { ground, contact, stepSeconds })
      advance(lattice, 3_000)
      const [x, , z, vx, vy, vz] = lattice.nodes
      expect(Math.sqrt(vx! * vx! + vy! * vy! + vz! * vz!)).toBeLessThan(1e-9)
      expect(Math.max(Math.abs(x!), Math.abs(z!))).toBeLessThan(1e-6)
    }
  })
})

describe('directional friction', () => {
  const pad = { forward: 0.2, backward: 0.8, sideways: 0.5 }
  /** Deceleration over g of a foot sliding in direction `degrees` from +x towards +z. */
  const coefficient = (degrees: number, friction: FrictionSpec, headingDegrees?: number) => {
    const angle = (degrees * Math.PI) / 180
    const nodes: NodeSpec[] = [foot([Math.cos(angle), 0, Math.sin(angle)], friction)]
    if (headingDegrees !== undefined) {
      // Far ahead and above: only the horizontal direction counts.
      const heading = (headingDegrees * Math.PI) / 180
      const positionM = [1e6 * Math.cos(heading), 3e5, 1e6 * Math.sin(heading)]
      nodes[0] = { ...nodes[0]!, headingNode: 1 }
      nodes.push({ positionM, massKg: 1, pinned: true })
    }
    const lattice = onFloor(nodes, { separateBodies: true })
    advance(lattice, 1)
    const [vx, vz] = [lattice.nodes[3]!, lattice.nodes[5]!]
    return (1 - Math.sqrt(vx * vx + vz * vz)) / (1e-4 * g)
  }

  test('forwards, backwards, sideways, and an ellipse between', () => {
    expect(coefficient(0, pad)).toBeCloseTo(0.2, 9)
    expect(coefficient(180, pad)).toBeCloseTo(0.8, 9)
    expect(coefficient(90, pad)).toBeCloseTo(0.5, 9)
    expect(coefficient(270, pad)).toBeCloseTo(0.5, 9)
    const c = Math.cos((40 * Math.PI) / 180)
    expect(coefficient(40, pad)).toBeCloseTo(Math.sqrt((0.2 * c) ** 2 + 0.25 * (1 - c * c)), 9)
    expect(coefficient(140, pad)).toBeCloseTo(Math.sqrt((0.8 * c) ** 2 + 0.25 * (1 - c * c)), 9)
    // Sideways is the larger of the other two where nothing is said.
    expect(coefficient(90, { forward: 0.2, backward: 0.8 })).toBeCloseTo(0.8, 9)
  })

  test('turns with the heading of the node', () => {
    for (const heading of [0, 33, 90, 200, 315]) {
      for (const relative of [0, 40, 90, 140, 180]) {
        expect(coefficient(heading + relative, pad, heading)).toBeCloseTo(coefficient(relative, pad), 6)
      }
    }
  })

  test('straight up a slope is forwards, not a little sideways', () => {
    const ground = { firstXM: -50, spacingM: 100, heightsM: [-25, 25] }
    const node = { ...foot([1, 0.5, 0], pad), positionM: [0, -g / 1.25 / firm.stiffness, 0] }
    const lattice = onFloor([node], { ground })
    advance(lattice, 1)
    // Along the slope: -g sin - mu g cos, times h.
    const speed = Math.sqrt(lattice.nodes[3]! ** 2 + lattice.nodes[4]! ** 2)
    const cosine = 1 / Math.sqrt(1.25)
    expect(((Math.sqrt(1.25) - speed) / 1e-4 / g - 0.5 * cosine) / cosine).toBeCloseTo(0.2, 6)
  })

  test('a heading straight up has no direction: the foot rubs as sideways', () => {
    const nodes = [
      { ...foot([1, 0, 0], pad), headingNode: 1 },
      { positionM: [0, 1, 0], massKg: 1, pinned: true },
    ]
    const lattice = onFloor(nodes, { separateBodies: true })
    advance(lattice, 1)
    expect((1 - lattice.nodes[3]!) / (1e-4 * g)).toBeCloseTo(0.5, 9)
  })
})

test('space with nothing happening across is the plane: the same crawl to 1e-12', () => {
  const pad = { forward: 0.3, backward: 0.9 }
  const places = [
    [0, 0],
    [0.1, 0],
    [0, 0.1],
    [0.1, 0.1],
  ]
  const bars = [
    [0, 2],
    [1, 3],
    [2, 3],
    [0, 3],
    [1, 2],
  ] as const
  const build = (dimensions: 2 | 3) => {
    const vector = ([x, y]: readonly number[]) => (dimensions === 2 ? [x!, y!] : [x!, y!, 0])
    return buildLattice({
      dimensions,
      nodes: places.map((place) => ({ positionM: vector(place), massKg: 0.02, friction: pad })),
      struts: bars.map(([a, b]) => ({ a, b, stiffnessNpm: 200, dampingNspm: 0.2 })),
      actuators: [
        {
          a: 0,
          b: 1,
          stiffnessNpm: 200,
          dampingNspm: 0.2,
          group: 0,
          strain: 0.2,
          phaseTurns: 0,
          forceLimitN: 3,
        },
      ],
      groups: [{ frequencyHz: 2 }],
      gravityMps2: vector([0, -g]),
      ground: {
        firstXM: -1,
        spacingM: 0.05,
        heightsM: Array.from({ length: 60 }, (_, i) => (i % 3) * 0.002),
      },
      contact: { stiffness: 2000, damping: 2000, exponent: 1, depthLimitM: 0.02 },
      stepSeconds: 2e-4,
    })
  }
  const [plane, space] = [build(2), build(3)]
  expect(advance(plane, 10_000)).toBeUndefined()
  expect(advance(space, 10_000)).toBeUndefined()
  expect(plane.nodes[0]).toBeGreaterThan(0.05)
  for (let i = 0; i < 4; i++) {
    expect(Math.abs(space.nodes[9 * i]! - plane.nodes[6 * i]!)).toBeLessThan(1e-12)
    expect(Math.abs(space.nodes[9 * i + 1]! - plane.nodes[6 * i + 1]!)).toBeLessThan(1e-12)
    expect(space.nodes[9 * i + 2]).toBe(0)
  }
})
