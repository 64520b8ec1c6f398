import { describe, expect, test } from 'vitest'
import { Refusal } from '../../shared/refusals.js'
import { blockModuli } from './block.js'
import type { CellSpec } from './cell.js'
import { planeConstants, uniaxial } from './elasticity.js'
import { homogenise } from './homogenise.js'
import { coordinatesMost, linearModel } from './linear-model.js'
import { naturalModes } from './modes.js'
import { factorise } from './semidefinite.js'

const strut = { a: 0, b: 0, shift: [1, 0], stiffnessNpm: 1 }
const sound: CellSpec = {
  vectorsM: [
    [1, 0],
    [0, 1],
  ],
  nodes: [{ positionM: [0, 0] }, { positionM: [0.5, 0.2] }],
  struts: [strut],
}

function fieldOf(work: () => unknown): string | undefined {
  try {
    work()
  } catch (error) {
    if (error instanceof Refusal) return error.where?.field
    throw error
  }
  return 'nothing was refused'
}

describe('a cell that cannot be is refused, and the field named', () => {
  const rows: readonly (readonly [string, Partial<CellSpec>, string])[] = [
    ['no lattice vectors', { vectorsM: [] }, 'vectorsM'],
    [
      'a vector of three in a sheet',
      {
        vectorsM: [
          [1, 0, 0],
          [0, 1],
        ],
      },
      'vectorsM[0]',
    ],
    [
      'vectors along each other',
      {
        vectorsM: [
          [1, 1],
          [2, 2],
        ],
      },
      'vectorsM',
    ],
    ['no nodes', { nodes: [] }, 'nodes'],
    ['a place that is no number', { nodes: [{ positionM: [Number.NaN, 0] }] }, 'nodes[0].positionM'],
    ['a mass of 0', { nodes: [{ positionM: [0, 0], massKg: 0 }] }, 'nodes[0].massKg'],
    ['a strut to an unknown node', { struts: [{ ...strut, b: 7 }] }, 'struts[0]'],
    ['a strut to itself', { struts: [{ ...strut, shift: [0, 0] }] }, 'struts[0]'],
    ['half a cell of shift', { struts: [{ ...strut, shift: [0.5, 0] }] }, 'struts[0]'],
    ['a negative stiffness', { struts: [{ ...strut, stiffnessNpm: -1 }] }, 'struts[0].stiffnessNpm'],
    [
      'a hinge whose arm has no length',
      { hinges: [{ at: 0, left: { node: 0 }, right: { node: 1 }, stiffnessNmprad: 1 }] },
      'hinges[0].left',
    ],
    [
      'a flat triangle',
      {
        areas: [
          { corners: [{ node: 0 }, { node: 0, shift: [1, 0] }, { node: 0, shift: [2, 0] }], stiffnessNpm: 1 },
        ],
      },
      'areas[0].corners',
    ],
    [
      'a beam in a chain',
      {
        vectorsM: [[1]],
        nodes: [{ positionM: [0] }],
        struts: [],
        beams: [{ a: 0, b: 0, shift: [1], stretchN: 1, bendingNm2: 1 }],
      },
      'beams',
    ],
  ]
  test.each(rows)('%s', (_, change, field) => {
    expect(fieldOf(() => homogenise({ ...sound, ...change }))).toBe(`cell.${field}`)
  })
})

describe('parts of cells', () => {
  test('an area spring alone resists the change of area only: C11 = C22 = C12, no shear', () => {
    // Two triangles fill the unit cell: energy 1/2 kappa (strain of area)^2 for the whole of it.
    const corner = (x: number, y: number) => ({ node: 0, shift: [x, y] })
    const { stiffness } = homogenise({
      vectorsM: [
        [1, 0],
        [0, 1],
      ],
      nodes: [{ positionM: [0, 0] }],
      areas: [
        { corners: [corner(0, 0), corner(1, 0), corner(0, 1)], stiffnessNpm: 5 },
        { corners: [corner(1, 0), corner(1, 1), corner(0, 1)], stiffnessNpm: 5 },
      ],
    })
    const truth = [
      [5, 5, 0],
      [5, 5, 0],
      [0, 0, 0],
    ]
    for (const [i, row] of truth.entries()) {
      for (const [j, value] of row.entries()) expect(stiffness[i]![j]).toBeCloseTo(value, 12)
    }
    // Nothing resists a pull: modulus 0, the sides close in as much as the pull opens.
    const constants = planeConstants(stiffness)
    expect(constants.E1).toBeCloseTo(0, 12)
    expect(constants.nu12).toBeCloseTo(1, 12)
  })

  test('hinges between the struts of a square give it their shear stiffness and nothing else', () => {
    // A shear turns one arm of each of 4 hinges by gamma: 4 kappa gamma^2 / 2 in a cell of area 1.
    const arms = [
      [1, 0],
      [0, 1],
      [-1, 0],
      [0, -1],
    ].map((shift) => ({ node: 0, shift }))
    const { stiffness, mechanisms } = homogenise({
      vectorsM: [
        [1, 0],
        [0, 1],
      ],
      nodes: [{ positionM: [0, 0] }],
      struts: [strut, { ...strut, shift: [0, 1] }],
      hinges: arms.map((left, i) => ({ at: 0, left, right: arms[(i + 1) % 4]!, stiffnessNmprad: 0.01 })),
    })
    const truth = [
      [1, 0, 0],
      [0, 1, 0],
      [0, 0, 0.04],
    ]
    for (const [i, row] of truth.entries()) {
      for (const [j, value] of row.entries()) expect(stiffness[i]![j]).toBeCloseTo(value, 12)
    }
    expect(mechanisms).toBe(0)
  })

  test('springs of a cell that hang one behind the other add their compliances', () => {
    const { stiffness, mechanisms } = homogenise({
      vectorsM: [[2]],
      nodes: [{ positionM: [0] }, { positionM: [0.7] }],
      struts: [
        { a: 0, b: 1, stiffnessNpm: 3 },
        { a: 1, b: 0, shift: [1], stiffnessNpm: 6 },
      ],
    })
    // 1 / (1/3 + 1/6) = 2 N/m over a length of 2 m.
    expect(stiffness[0]![0]).toBeCloseTo(4, 12)
    expect(mechanisms).toBe(0)
  })

  test("a ratio that nothing determines is undefined: a rope's sideways strain", () => {
    const { stiffness } = homogenise({ ...sound, nodes: [{ positionM: [0, 0] }] })
    expect(uniaxial(stiffness, 0)).toEqual({ modulus: 1, poisson: [undefined] })
    expect(uniaxial(stiffness, 1).modulus).toBe(0)
  })

  test('a loose node is a mechanism of two coordinates and does not disturb', () => {
    expect(homogenise(sound).mechanisms).toBe(2)
    expect(homogenise(sound).stiffness[0]![0]).toBe(1)
  })
})

describe('semidefinite equations', () => {
  const gram = (rows: readonly (readonly number[])[], size: number) => {
    const matrix = new Float64Array(size * size)
    for (const row of rows) {
      for (let i = 0; i < size; i++) for (let j = 0; j < size; j++) matrix[i * size + j]! += row[i]! * row[j]!
    }
    return matrix
  }

  test('random sums of squares: rank and solution for right sides that do no work on zero modes', () => {
    // Numbers of a simple congruential sequence; 9 unknowns, 5 springs.
    let seed = 7
    const draw = () => {
      seed = (seed * 16807) % 2147483647
      return seed / 2147483647 - 0.5
    }
    for (let trial = 0; trial < 50; trial++) {
      const rows = Array.from({ length: 5 }, () => Array.from({ length: 9 }, draw))
      const matrix = gram(rows, 9)
      const solver = factorise(matrix, 9)
      expect(solver.rank).toBe(5)
      const right = Array.from({ length: 9 }, (_, i) =>
        rows.reduce((sum, row, r) => sum + (r + 1) * row[i]!, 0),
      )
      expect(solver.residual(solver.solve(right), right)).toBeLessThan(1e-10)
      // A right side that pulls at a zero mode cannot be met, and the residual says so.
      const outside = right.map((value) => value + draw())
      expect(solver.residual(solver.solve(outside), outside)).toBeGreaterThan(1e-3)
    }
  })

  test('stiffnesses of very different size count alike', () => {
    const matrix = gram(
      [
        [1e6, -1e6, 0],
        [0, 1e-3, -1e-3],
      ],
      3,
    )
    expect(factorise(matrix, 3).rank).toBe(2)
  })
})

test('a lattice that is too large for dense matrices, and an axis that is not there, are refused', () => {
  const row = (nodes: number, dy: number) => ({
    nodes: Array.from({ length: nodes }, (_, i) => ({ positionM: [i, i * dy], massKg: 1 })),
    struts: Array.from({ length: nodes - 1 }, (_, a) => ({ a, b: a + 1, stiffnessNpm: 1, dampingNspm: 0 })),
    gravityMps2: [0, 0],
    stepSeconds: 'auto' as const,
  })
  expect(fieldOf(() => linearModel(row(coordinatesMost / 2 + 1, 0)))).toBe('lattice.nodes')
  expect(fieldOf(() => blockModuli(row(2, 1), 2))).toBe('axis')
  expect(fieldOf(() => blockModuli(row(3, 0), 0))).toBe('lattice.nodes')
  const strutToNowhere = { ...row(2, 1), struts: [{ a: 0, b: 5, stiffnessNpm: 1, dampingNspm: 0 }] }
  expect(fieldOf(() => naturalModes(strutToNowhere))).toBe('lattice.struts[0].b')
})
