// Periodic homogenisation against closed forms of lattices and honeycombs. Springs: Ostoja-Starzewski, Lattice models
// in micromechanics, 2002 (from memory), and Born and Huang, Dynamical theory of crystal lattices, 1954 (from memory);
// honeycombs: Gibson and Ashby, Cellular solids, 1997, chapter 4 (from memory). All numbers were recomputed
// independently of this code.

import { describe, expect, test } from 'vitest'
import type { CellNode, CellSpec } from '../../sim/measure/cell.js'
import { planeConstants, planeRotation, turnedStiffness, uniaxial } from '../../sim/measure/elasticity.js'
import { homogenise } from '../../sim/measure/homogenise.js'

const root3 = Math.sqrt(3)
const near = (value: number | undefined, truth: number) =>
  expect(Math.abs(value! - truth)).toBeLessThan(1e-10 * Math.max(1, Math.abs(truth)))
const origin: CellNode[] = [{ positionM: [0, 0] }]
const spring = (a: number, b: number, shift: number[], stiffnessNpm = 1) => ({ a, b, shift, stiffnessNpm })

describe('triangular lattice of equal springs', () => {
  const cell: CellSpec = {
    vectorsM: [
      [1, 0],
      [0.5, root3 / 2],
    ],
    nodes: origin,
    struts: [spring(0, 0, [1, 0]), spring(0, 0, [0, 1]), spring(0, 0, [-1, 1])],
  }
  const { stiffness, mechanisms } = homogenise(cell)

  test('has the moduli of the isotropic continuum', () => {
    const c = planeConstants(stiffness)
    near(c.C11, 1.299038105677)
    near(c.C12, 0.433012701892)
    near(c.C66, 0.433012701892)
    near(c.E1, 1.154700538379)
    near(c.nu12, 1 / 3)
    near(c.areaModulus, 0.866025403784)
    near(c.zener, 1)
    expect(mechanisms).toBe(0)
  })

  test('has them along every axis, and at every size', () => {
    for (const turns of [0.05, 0.13, 0.41]) {
      const rotation = planeRotation(Math.cos(2 * Math.PI * turns), Math.sin(2 * Math.PI * turns))
      near(uniaxial(turnedStiffness(stiffness, rotation), 0).modulus, 1.154700538379)
    }
    const small = homogenise({ ...cell, vectorsM: cell.vectorsM.map((v) => v.map((x) => x / 1000)) })
    near(small.stiffness[0]![0], 1.299038105677)
  })

  test('does not depend on how large a cell is chosen', () => {
    const pair: CellSpec = {
      vectorsM: [
        [2, 0],
        [0.5, root3 / 2],
      ],
      nodes: [{ positionM: [0, 0] }, { positionM: [1, 0] }],
      struts: [
        spring(0, 1, [0, 0]),
        spring(1, 0, [1, 0]),
        spring(0, 0, [0, 1]),
        spring(1, 1, [0, 1]),
        spring(1, 0, [0, 1]),
        spring(0, 1, [-1, 1]),
      ],
    }
    const c = planeConstants(homogenise(pair).stiffness)
    near(c.E1, 1.154700538379)
    near(c.nu21, 1 / 3)
  })
})

describe('square lattice with both diagonals', () => {
  const square = (k1: number, k2: number): CellSpec => ({
    vectorsM: [
      [1, 0],
      [0, 1],
    ],
    nodes: origin,
    struts: [
      spring(0, 0, [1, 0], k1),
      spring(0, 0, [0, 1], k1),
      spring(0, 0, [1, 1], k2),
      spring(0, 0, [-1, 1], k2),
    ],
  })

  // k1, k2, E, nu, Zener's ratio, E and nu along the diagonal.
  test.each([
    [1, 0.5, 4 / 3, 1 / 3, 1, 4 / 3, 1 / 3],
    [1, 1, 3 / 2, 1 / 2, 2, 2.4, 0.2],
    [1, Math.SQRT1_2, Math.SQRT2, 0.414213562373, Math.SQRT2, 1.783611624891, 0.261203874964],
  ])('k1 = %d, k2 = %d', (k1, k2, modulus, poisson, zener, modulus45, poisson45) => {
    const { stiffness } = homogenise(square(k1, k2))
    const c = planeConstants(stiffness)
    near(c.E1, modulus)
    near(c.nu12, poisson)
    near(c.zener, zener)
    const diagonal = uniaxial(turnedStiffness(stiffness, planeRotation(Math.SQRT1_2, Math.SQRT1_2)), 0)
    near(diagonal.modulus, modulus45)
    near(diagonal.poisson[0], poisson45)
  })

  test('without diagonals shears freely, and its other moduli stay what they are', () => {
    const c = planeConstants(homogenise(square(1, 0)).stiffness)
    expect([c.E1, c.nu12, c.G12, c.C66]).toEqual([1, 0, 0, 0])
  })
})

describe('cubic lattices', () => {
  const shifts = (nonzero: number) => {
    const all = [-1, 0, 1].flatMap((x) => [-1, 0, 1].flatMap((y) => [-1, 0, 1].map((z) => [x, y, z])))
    // One of each pair of opposite ones.
    return all.filter((s) => s.filter((i) => i !== 0).length === nonzero && s.find((i) => i !== 0)! > 0)
  }
  const cubic = (k: readonly number[]): CellSpec => ({
    vectorsM: [
      [1, 0, 0],
      [0, 1, 0],
      [0, 0, 1],
    ],
    nodes: [{ positionM: [0, 0, 0] }],
    struts: k.flatMap((stiffness, i) => shifts(i + 1).map((shift) => spring(0, 0, shift, stiffness))),
  })

  // k1 (edges), k2 (face diagonals), k3 (body diagonals), C11, C12 = C44, E along an edge, nu.
  test.each([
    [1, 1, 0, 3, 1, 2.5, 0.25],
    [1, 0, 3 / 8, 1.5, 0.5, 1.25, 0.25],
    [1, 0.5, 0, 2, 0.5, 1.8, 0.2],
    [1, 1, 1, 13 / 3, 7 / 3, 2.7, 0.35],
  ])('k = %d, %d, %d', (k1, k2, k3, c11, c12, modulus, poisson) => {
    const { stiffness } = homogenise(cubic([k1, k2, k3]))
    near(stiffness[0]![0], c11)
    near(stiffness[0]![1], c12)
    near(stiffness[3]![3], c12)
    const pull = uniaxial(stiffness, 2)
    near(pull.modulus, modulus)
    near(pull.poisson[0], poisson)
    near(pull.poisson[1], poisson)
    // Zener's ratio 2 C44 / (C11 - C12), and the bulk modulus (C11 + 2 C12) / 3 of the first: 5/3.
    const zener = (2 * stiffness[3]![3]!) / (stiffness[0]![0]! - stiffness[0]![1]!)
    near(zener, (2 * c12) / (c11 - c12))
    const published = k3 === 1 ? 7 / 3 : k2 === 0.5 ? 2 / 3 : 1
    near(zener, published)
    if (k3 === 0 && k2 === 1) near((stiffness[0]![0]! + 2 * stiffness[0]![1]!) / 3, 5 / 3)
  })

  test.each([
    [1.5, 1.5, 0],
    [1, 0, 3 / 8],
    [2, 1, 3 / 8],
  ])('isotropic, with nu = 1/4, where k1 = k2 + 8 k3 / 3: %d, %d, %d; not beside it', (k1, k2, k3) => {
    const of = (first: number) => homogenise(cubic([first, k2, k3])).stiffness
    const zener = (c: readonly (readonly number[])[]) => (2 * c[3]![3]!) / (c[0]![0]! - c[0]![1]!)
    near(zener(of(k1)), 1)
    near(uniaxial(of(k1), 0).poisson[0], 0.25)
    expect(zener(of(1.1 * k1))).toBeLessThan(0.99)
  })

  test('k = 1, 1, 0 is isotropic: any rotation leaves it as it is', () => {
    const { stiffness } = homogenise(cubic([1, 1, 0]))
    const [s, c] = [0.6, 0.8]
    // Two rotations after each other, so that every component is stirred.
    const about = turnedStiffness(stiffness, [
      [c, s, 0],
      [-s, c, 0],
      [0, 0, 1],
    ])
    const again = turnedStiffness(about, [
      [1, 0, 0],
      [0, c, s],
      [0, -s, c],
    ])
    for (const [i, row] of again.entries()) for (const [j, x] of row.entries()) near(x, stiffness[i]![j]!)
  })

  test('face-centred cubic, nearest neighbours', () => {
    const half = [
      [0, 0.5, 0.5],
      [0.5, 0, 0.5],
      [0.5, 0.5, 0],
    ]
    const neighbours = [
      [1, 0, 0],
      [0, 1, 0],
      [0, 0, 1],
      [1, -1, 0],
      [1, 0, -1],
      [0, 1, -1],
    ]
    const { stiffness } = homogenise({
      vectorsM: half,
      nodes: [{ positionM: [0, 0, 0] }],
      struts: neighbours.map((shift) => spring(0, 0, shift)),
    })
    near(stiffness[0]![0], 2)
    near(stiffness[0]![1], 1)
    near(stiffness[5]![5], 1)
    near((2 * stiffness[5]![5]!) / (stiffness[0]![0]! - stiffness[0]![1]!), 2)
    near(uniaxial(stiffness, 0).modulus, 4 / 3)
    near(uniaxial(stiffness, 0).poisson[0], 1 / 3)
  })
})

test('kagome lattice of equal springs: isotropic although it is only just rigid', () => {
  const vectors = [
    [2, 0],
    [1, root3],
  ]
  const { stiffness, mechanisms } = homogenise({
    vectorsM: vectors,
    nodes: [{ positionM: [0, 0] }, { positionM: [1, 0] }, { positionM: [0.5, root3 / 2] }],
    struts: [
      spring(0, 1, [0, 0]),
      spring(1, 2, [0, 0]),
      spring(2, 0, [0, 0]),
      spring(1, 0, [1, 0]),
      spring(2, 0, [0, 1]),
      spring(1, 2, [1, -1]),
    ],
  })
  const c = planeConstants(stiffness)
  near(c.E1, 0.57735026919)
  near(c.nu12, 1 / 3)
  near(c.C66, 0.216506350946)
  // The triangles turn against each other (Maxwell's count: 6 springs, 6 coordinates, one self-stress beyond).
  expect(mechanisms).toBe(1)
})

describe('honeycombs of welded beams', () => {
  const radians = Math.PI / 180
  /** Vertical walls of length h, oblique ones of length 1 at the angle from the horizontal; thickness t, Es = 1. */
  const honeycomb = (degrees: number, h: number, t: number, stretchy: boolean): CellSpec => {
    const [c, s] = [Math.cos(degrees * radians), Math.sin(degrees * radians)]
    // Without stretching the walls are made so stiff along their axis that it does not show.
    const beam = { stretchN: stretchy ? t : 1e8 * t ** 3, bendingNm2: t ** 3 / 12 }
    return {
      vectorsM: [
        [2 * c, 0],
        [c, h + s],
      ],
      nodes: [{ positionM: [0, 0] }, { positionM: [0, h] }],
      beams: [
        { a: 0, b: 1, ...beam },
        { a: 1, b: 0, shift: [0, 1], ...beam },
        { a: 1, b: 0, shift: [-1, 1], ...beam },
      ],
    }
  }

  // Angle, h/l, then E1, E2 and G12 over Es (t/l)^3, nu12, nu21; 1 is across the vertical walls.
  test.each([
    [30, 1, 2.309401077, 2.309401077, 0.577350269, 1, 1],
    [-10, 2, 17.882430945, 1.912185697, 0.092726312, -3.058075797, -0.327003013],
    [-20, 1.5, 6.937155704, 1.395544069, 0.136921825, -2.229558867, -0.448519218],
    [-30, 2, 2.309401077, 2.309401077, 0.08660254, -1, -1],
    [45, 1, 0.828427125, 4.828427125, 0.804737854, 0.414213562, 2.414213562],
  ])('angle %d, h/l = %d, walls that only bend', (degrees, h, e1, e2, g12, nu12, nu21) => {
    const t = 0.01
    const found = planeConstants(homogenise(honeycomb(degrees, h, t, false)).stiffness)
    const values = [found.E1 / t ** 3, found.E2 / t ** 3, found.G12 / t ** 3, found.nu12!, found.nu21!]
    for (const [i, truth] of [e1, e2, g12, nu12, nu21].entries()) {
      expect(Math.abs(values[i]! / truth - 1)).toBeLessThan(1e-6)
    }
  })

  test.each([
    [30, 1, 2.242136968, 2.242136968, 0.961165049, 0.961165049],
    [-30, 2, 2.242136968, 2.185553069, -0.961165049, -0.936908517],
  ])('angle %d, h/l = %d, walls that stretch too, t/l = 0.1', (degrees, h, e1, e2, nu12, nu21) => {
    const found = planeConstants(homogenise(honeycomb(degrees, h, 0.1, true)).stiffness)
    expect(Math.abs(found.E1 / 1e-3 - e1)).toBeLessThan(1e-9)
    expect(Math.abs(found.E2 / 1e-3 - e2)).toBeLessThan(1e-9)
    expect(Math.abs(found.nu12! - nu12)).toBeLessThan(1e-9)
    expect(Math.abs(found.nu21! - nu21)).toBeLessThan(1e-9)
  })

  test('welded triangular frame, t/l = 0.1', () => {
    const t = 0.1
    const beam = { stretchN: t, bendingNm2: t ** 3 / 12 }
    const { stiffness } = homogenise({
      vectorsM: [
        [1, 0],
        [0.5, root3 / 2],
      ],
      nodes: origin,
      beams: [
        { a: 0, b: 0, shift: [1, 0], ...beam },
        { a: 0, b: 0, shift: [0, 1], ...beam },
        { a: 0, b: 0, shift: [-1, 1], ...beam },
      ],
    })
    const c = planeConstants(stiffness)
    near(c.E1, 0.116237296721)
    near(c.nu12, 0.328903654485)
  })
})
