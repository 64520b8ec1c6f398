// The force laws against hand calculation: drag of rods, areas, volumes, pairs and contact as gradients of their energies.

import { describe, expect, test } from 'vitest'
import { stream } from '../../shared/streams.js'
import { addForces, advance } from './advance.js'
import { buildLattice } from './build.js'
import type { Lattice } from './layout.js'
import { apartJ, contactJ, fillJ, fillSize } from './observe.js'
import type { LatticeSpec, NodeSpec } from './spec.js'
import { stepBound } from './stability.js'

const still = { struts: [], stepSeconds: 1e-4 }
const node = (...positionM: number[]): NodeSpec => ({ positionM, massKg: 1 })

/** Forces at this instant, node after node; the force fields are zero again afterwards. */
function forcesOf(lattice: Lattice): number[] {
  addForces(lattice)
  const { stride, dimensions, nodes } = lattice
  const forces: number[] = []
  for (let o = 0; o < nodes.length; o += stride) {
    for (let axis = 0; axis < dimensions; axis++) {
      forces.push(nodes[o + 2 * dimensions + axis]!)
      nodes[o + 2 * dimensions + axis] = 0
    }
  }
  return forces
}

/** -dU/dx of every coordinate by central differences. */
function slopes(lattice: Lattice, energyJ: (lattice: Lattice) => number, deltaM: number): number[] {
  const { stride, dimensions, nodes } = lattice
  const result: number[] = []
  for (let o = 0; o < nodes.length; o += stride) {
    for (let axis = 0; axis < dimensions; axis++) {
      const start = nodes[o + axis]!
      nodes[o + axis] = start + deltaM
      const above = energyJ(lattice)
      nodes[o + axis] = start - deltaM
      result.push((energyJ(lattice) - above) / (2 * deltaM))
      nodes[o + axis] = start
    }
  }
  return result
}

function expectClose(found: readonly number[], truth: readonly number[], tolerance: number): void {
  const size = Math.max(...truth.map(Math.abs))
  expect(size).toBeGreaterThan(0)
  for (const [i, value] of found.entries()) {
    expect(Math.abs(value - truth[i]!)).toBeLessThan(tolerance * size)
  }
}

describe('drag of a rod of 2 m, 3 N s/m^2 across and 1 along', () => {
  const rod = { a: 0, b: 1, normalNspm2: 3, tangentNspm2: 1 }
  const plane = (va: readonly number[], vb: readonly number[]) =>
    forcesOf(
      buildLattice({
        ...still,
        nodes: [
          { ...node(-1, 0), velocityMps: va },
          { ...node(1, 0), velocityMps: vb },
        ],
        dragStruts: [rod],
        gravityMps2: [0, 0],
      }),
    )

  test('moving across: 6 N s/m in all, half to each end; moving along: 2', () => {
    expectClose(plane([0, 1], [0, 1]), [0, -3, 0, -3], 1e-14)
    expectClose(plane([1, 0], [1, 0]), [-1, 0, -1, 0], 1e-14)
  })

  test('turning: the torque of a rod about its middle, cn w L^3 / 12 = 2', () => {
    expectClose(plane([0, -1], [0, 1]), [0, 1, 0, -1], 1e-14)
  })

  test('the power lost is the integral of v C v along the rod', () => {
    const [va, vb] = [
      [0.3, -0.7],
      [-0.2, 0.4],
    ] as const
    const forces = plane(va, vb)
    const power = forces[0]! * va[0] + forces[1]! * va[1] + forces[2]! * vb[0] + forces[3]! * vb[1]
    // Simpson's rule is exact for the square of a linear function.
    const lost = (s: number) => {
      const [x, y] = [va[0] + s * (vb[0] - va[0]), va[1] + s * (vb[1] - va[1])]
      return x * x + 3 * y * y
    }
    expect(power).toBeCloseTo((-2 * (lost(0) + 4 * lost(0.5) + lost(1))) / 6, 12)
  })

  test('in space, askew: the same by rotation', () => {
    // Axis (1, 2, 2)/3; a velocity along it and one across it, (2, 1, -2)/3.
    const at = [1 / 3, 2 / 3, 2 / 3]
    const across = [2 / 3, 1 / 3, -2 / 3]
    const run = (v: readonly number[]) =>
      forcesOf(
        buildLattice({
          ...still,
          dimensions: 3,
          nodes: [-1, 1].map((s) => ({ ...node(...at.map((c) => s * c)), velocityMps: v })),
          dragStruts: [rod],
          gravityMps2: [0, 0, 0],
        }),
      )
    expectClose(
      run(at),
      [...at, ...at].map((c) => -c),
      1e-14,
    )
    expectClose(
      run(across),
      [...across, ...across].map((c) => -3 * c),
      1e-14,
    )
  })
})

describe('areas and volumes', () => {
  const triangle: LatticeSpec = {
    ...still,
    nodes: [node(0, 0), node(0.9, 0.1), node(0.3, 1.1)],
    areas: [{ nodes: [0, 1, 2], stiffnessNpm: 40, restM2: 0.5 }],
    gravityMps2: [0, 0],
  }
  const tetrahedron: LatticeSpec = {
    ...still,
    dimensions: 3,
    nodes: [node(0, 0, 0), node(1.1, 0.1, 0), node(0.2, 0.9, 0.1), node(0.1, 0.2, 1.2)],
    volumes: [{ nodes: [0, 1, 2, 3], stiffnessPa: 700, restM3: 1 / 6 }],
    gravityMps2: [0, 0, 0],
  }

  test.each([
    ['area', triangle],
    ['volume', tetrahedron],
  ])('the forces of an %s are minus the gradient of its energy, and cancel', (_, spec) => {
    const lattice = buildLattice(spec)
    const forces = forcesOf(lattice)
    expectClose(forces, slopes(lattice, fillJ, 1e-5), 1e-8)
    for (let axis = 0; axis < lattice.dimensions; axis++) {
      let sum = 0
      for (let i = axis; i < forces.length; i += lattice.dimensions) sum += forces[i]!
      expect(Math.abs(sum)).toBeLessThan(1e-13)
    }
  })

  test('a unit right triangle squeezed to half its area pushes its far corners outwards with kappa / 4 each', () => {
    // A = 1/4, A0 = 1/2: -kappa (A - A0) / A0 = kappa / 2 a unit of area; dA/dp = 1/2 and 1/4.
    const lattice = buildLattice({
      ...triangle,
      nodes: [node(0, 0), node(1, 0), node(0, 0.5)],
      areas: [{ nodes: [0, 1, 2], stiffnessNpm: 8, restM2: 0.5 }],
    })
    expectClose(forcesOf(lattice), [-1, -2, 1, 0, 0, 2], 1e-14)
    expect(fillSize(lattice, 0)).toBe(0.25)
    expect(fillJ(lattice)).toBeCloseTo(0.5 * 8 * 0.0625 * 2, 14)
  })

  test('a nearly incompressible block keeps its area where a bare one does not', () => {
    // A square of two triangles, pulled along x: springs alone keep nu = 0.2 for equal struts (single braced cell).
    const strut = (a: number, b: number) => ({ a, b, stiffnessNpm: 100, dampingNspm: 2 })
    const pull = (stiffnessNpm: number) => {
      const lattice = buildLattice({
        nodes: [node(0, 0), node(1, 0), node(0, 1), node(1, 1)].map((n, i) => ({ ...n, pinned: i === 0 })),
        struts: [strut(0, 1), strut(2, 3), strut(0, 2), strut(1, 3), strut(0, 3), strut(1, 2)],
        areas: [
          { nodes: [0, 1, 2], stiffnessNpm },
          { nodes: [1, 3, 2], stiffnessNpm },
        ],
        gravityMps2: [2, 0],
        dragNspm: 4,
        stepSeconds: 'auto',
      })
      advance(lattice, Math.round(60 / lattice.stepSeconds))
      return fillSize(lattice, 0) + fillSize(lattice, 1) - 1
    }
    expect(Math.abs(pull(0))).toBeGreaterThan(5e-3)
    expect(Math.abs(pull(1e5))).toBeLessThan(Math.abs(pull(0)) / 50)
  })
})

describe('keep-apart pairs', () => {
  const pair = (distanceM: number) =>
    buildLattice({
      ...still,
      nodes: [node(0, 0), node(distanceM * 0.6, distanceM * 0.8)],
      keepApart: [{ a: 0, b: 1, leastM: 0.1, stiffnessNpm: 50 }],
      separateBodies: true,
      gravityMps2: [0, 0],
    })

  test('k (least - L) along the line while closer, nothing beyond, and the gradient of the energy', () => {
    expectClose(forcesOf(pair(0.06)), [-1.2, -1.6, 1.2, 1.6], 1e-13)
    expectClose(forcesOf(pair(0.06)), slopes(pair(0.06), apartJ, 1e-7), 1e-6)
    for (const force of forcesOf(pair(0.11))) expect(force).toBe(0)
  })

  test('two masses that run into each other part again with the speeds of an elastic impact', () => {
    const lattice = buildLattice({
      nodes: [
        { positionM: [0, 0], velocityMps: [1, 0], massKg: 1 },
        { positionM: [0.15, 0], massKg: 3 },
      ],
      struts: [],
      keepApart: [{ a: 0, b: 1, leastM: 0.1, stiffnessNpm: 2000 }],
      separateBodies: true,
      gravityMps2: [0, 0],
      stepSeconds: 1e-5,
    })
    advance(lattice, 20_000)
    expect(lattice.nodes[2]).toBeCloseTo(-0.5, 3)
    expect(lattice.nodes[8]).toBeCloseTo(0.5, 3)
  })
})

describe('contact in space', () => {
  test.each([1, 1.5] as const)('exponent %d: the force is minus the gradient of its energy', (exponent) => {
    const draw = stream(20_261_201, 'spare', 8, 2, 0)
    const heightsM = Array.from({ length: 20 }, () => 0.1 * draw.uniform())
    let touched = 0
    for (let trial = 0; trial < 40; trial++) {
      const spec: LatticeSpec = {
        dimensions: 3,
        nodes: [node(0.9 * draw.uniform(), 0.04 * draw.uniform(), 0.7 * draw.uniform())],
        struts: [],
        gravityMps2: [0, 0, 0],
        ground: { firstXM: 0.1, spacingM: 0.2, heightsM, rows: 4, firstZM: 0.05, spacingZM: 0.21 },
        contact: { stiffness: 1000, damping: 50, exponent, depthLimitM: 0.2 },
        stepSeconds: 1e-4,
      }
      const lattice = buildLattice(spec)
      const truth = slopes(lattice, contactJ, 1e-7)
      advance(lattice, 1)
      // From rest, without friction: v = h f / m.
      const forces = [3, 4, 5].map((at) => lattice.nodes[at]! / 1e-4)
      if (truth[1] === 0) expect(forces).toEqual([0, 0, 0])
      else {
        touched++
        expectClose(forces, truth, 1e-5)
      }
    }
    expect(touched).toBeGreaterThan(10)
  })
})

describe('the bound of the step knows all of it', () => {
  test('a rod in honey: damping alone, h < 2 m / (row sum)', () => {
    const spec: LatticeSpec = {
      nodes: [node(-1, 0), node(1, 0)],
      struts: [],
      dragStruts: [{ a: 0, b: 1, normalNspm2: 300, tangentNspm2: 100 }],
      gravityMps2: [0, 0],
      stepSeconds: 1e-3,
    }
    // Rows of (L/6) cn [2 1; 1 2]: L cn / 2 = 300 N s/m on 1 kg.
    expect(stepBound(spec).limitSeconds).toBeCloseTo(2 / 300, 12)
    // Exact for the rod that moves across as a whole: factor 1 - 300 h a step.
    const stays = (stepSeconds: number) => {
      const lattice = buildLattice({ ...spec, stepSeconds })
      for (const at of [3, 9]) lattice.nodes[at] = 1e-9
      advance(lattice, 400)
      return Math.abs(lattice.nodes[3]!)
    }
    expect(stays(0.999 * (2 / 300))).toBeLessThan(1e-9)
    expect(() => stays(1.001 * (2 / 300))).toThrow(/at node 0/)
  })

  test('areas, volumes and pairs raise the highest frequency at least to the true one', () => {
    // Equilateral triangle of side s: one area mode, kappa/A0 |g|^2 summed: 3 (kappa/A0) (s/2)^2 on unit masses.
    const kappa = 90
    const corners = [node(0, 0), node(1, 0), node(0.5, Math.sqrt(0.75))]
    const spec: LatticeSpec = {
      nodes: corners,
      struts: [],
      areas: [{ nodes: [0, 1, 2], stiffnessNpm: kappa }],
      gravityMps2: [0, 0],
      stepSeconds: 1e-3,
    }
    const truth = Math.sqrt((3 * kappa) / Math.sqrt(3 / 16) / 4)
    expect(stepBound(spec).highestRadps).toBeCloseTo(truth, 9)
    const pairs = { ...spec, areas: [], keepApart: [{ a: 0, b: 1, leastM: 1, stiffnessNpm: 50 }] }
    expect(stepBound(pairs).highestRadps).toBeCloseTo(10, 9)
    const tetrahedron: LatticeSpec = {
      dimensions: 3,
      nodes: [node(0, 0, 0), node(1, 0, 0), node(0, 1, 0), node(0, 0, 1)],
      struts: [],
      volumes: [{ nodes: [0, 1, 2, 3], stiffnessPa: 60 }],
      gravityMps2: [0, 0, 0],
      stepSeconds: 1e-3,
    }
    // kappa/V0 sum |dV/dp|^2, |dV/dp| = 1/6 for three corners and sqrt(3)/6 for the first.
    const volumeMode = Math.sqrt((60 * 6 * 6) / 36)
    expect(stepBound(tetrahedron).highestRadps).toBeGreaterThan(volumeMode)
    expect(stepBound(tetrahedron).highestRadps).toBeLessThan(1.6 * volumeMode)
  })
})
