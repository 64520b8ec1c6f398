// Waves in lattices of masses and springs, from the simulator's own force routine: the force constants between a node and
// its neighbours are read off a patch by moving one node, and summed to the dynamical matrix of a wave,
//   D(q) = (1/m) sum over R of Phi(R) cos(q . R)   (every node is a centre of symmetry).
// M. Born and K. Huang, Dynamical theory of crystal lattices, 1954 (from memory); numbers recomputed independently of
// this code. Force constants come from differences of 1e-3 of the spacing, exact but for O(1e-6) of it: 1e-5.

import { describe, expect, test } from 'vitest'
import { addForces } from '../../sim/lattice/advance.js'
import { buildLattice } from '../../sim/lattice/build.js'
import type { LatticeSpec, StrutSpec } from '../../sim/lattice/spec.js'
import { stepBound } from '../../sim/lattice/stability.js'

const relative = (value: number, truth: number) => Math.abs(value / truth - 1)

interface Kind {
  readonly dimensions: 2 | 3
  readonly periods: readonly (readonly number[])[]
  /** Half of the neighbours, as whole numbers of periods, with their springs. */
  readonly springs: readonly { readonly to: readonly number[]; readonly k: number }[]
}

const triangular: Kind = {
  dimensions: 2,
  periods: [
    [1, 0],
    [0.5, Math.sqrt(3) / 2],
  ],
  springs: [
    { to: [1, 0], k: 1 },
    { to: [0, 1], k: 1 },
    { to: [-1, 1], k: 1 },
  ],
}
const square = (k1: number, k2: number): Kind => ({
  dimensions: 2,
  periods: [
    [1, 0],
    [0, 1],
  ],
  springs: [
    { to: [1, 0], k: k1 },
    { to: [0, 1], k: k1 },
    { to: [1, 1], k: k2 },
    { to: [-1, 1], k: k2 },
  ],
})
const cubic: Kind = {
  dimensions: 3,
  periods: [
    [1, 0, 0],
    [0, 1, 0],
    [0, 0, 1],
  ],
  springs: [
    [1, 0, 0],
    [0, 1, 0],
    [0, 0, 1],
    [1, 1, 0],
    [1, -1, 0],
    [1, 0, 1],
    [1, 0, -1],
    [0, 1, 1],
    [0, 1, -1],
  ].map((to) => ({ to, k: 1 })),
}

/** A patch of 5 nodes along each period, mass 1, around the middle one. */
function patch({ dimensions, periods, springs }: Kind): {
  spec: LatticeSpec
  middle: number
  places: number[][]
} {
  const counts = Array.from({ length: 5 ** dimensions }, (_, n) =>
    periods.map((_, axis) => (Math.floor(n / 5 ** axis) % 5) - 2),
  )
  const name = (whole: readonly number[]) => whole.join(' ')
  const index = new Map(counts.map((whole, i) => [name(whole), i]))
  const places = counts.map((whole) =>
    Array.from({ length: dimensions }, (_, x) =>
      whole.reduce((sum, n, axis) => sum + n * periods[axis]![x]!, 0),
    ),
  )
  const struts: StrutSpec[] = []
  for (const [a, whole] of counts.entries()) {
    for (const { to, k } of springs) {
      const b = index.get(name(whole.map((n, axis) => n + to[axis]!)))
      if (b !== undefined) struts.push({ a, b, stiffnessNpm: k, dampingNspm: 0 })
    }
  }
  const spec: LatticeSpec = {
    dimensions,
    nodes: places.map((positionM) => ({ positionM, massKg: 1 })),
    struts,
    gravityMps2: new Array<number>(dimensions).fill(0),
    stepSeconds: 1e-3,
  }
  return { spec, middle: index.get(name(new Array(dimensions).fill(0)))!, places }
}

/** Squares of the angular frequencies of the waves with this wave vector, ascending. */
function branches(kind: Kind): (q: readonly number[]) => number[] {
  const { spec, middle, places } = patch(kind)
  const lattice = buildLattice(spec)
  const { stride, dimensions, nodes } = lattice
  const delta = 1e-3
  // constants[node][i][j]: force on coordinate i of the node for a unit displacement j of the middle one.
  const constants = places.map(() =>
    Array.from({ length: dimensions }, () => new Array<number>(dimensions).fill(0)),
  )
  for (let j = 0; j < dimensions; j++) {
    for (const sign of [1, -1]) {
      nodes[middle * stride + j] = places[middle]![j]! + sign * delta
      addForces(lattice)
      for (const [node, block] of constants.entries()) {
        for (let i = 0; i < dimensions; i++) {
          const at = node * stride + 2 * dimensions + i
          block[i]![j] = block[i]![j]! + (sign * nodes[at]!) / (2 * delta)
          nodes[at] = 0
        }
      }
    }
    nodes[middle * stride + j] = places[middle]![j]!
  }
  return (q) => {
    const matrix = Array.from({ length: dimensions }, () => new Array<number>(dimensions).fill(0))
    for (const [node, block] of constants.entries()) {
      const wave = Math.cos(q.reduce((sum, one, x) => sum + one * places[node]![x]!, 0))
      for (const [i, row] of block.entries()) {
        for (const [j, value] of row.entries()) matrix[i]![j] = matrix[i]![j]! - value * wave
      }
    }
    return eigenvaluesOf(matrix)
  }
}

function eigenvaluesOf(matrix: number[][]): number[] {
  if (matrix.length === 2) {
    const [[a, b], [, d]] = matrix as [[number, number], [number, number]]
    const root = Math.hypot((a - d) / 2, b)
    return [(a + d) / 2 - root, (a + d) / 2 + root]
  }
  return jacobi(matrix)
}

/** Jacobi's rotations for the 3 x 3 case. */
function jacobi(a: number[][]): number[] {
  for (let sweep = 0; sweep < 30; sweep++) {
    for (const [p, q] of [
      [0, 1],
      [0, 2],
      [1, 2],
    ] as const) {
      if (Math.abs(a[p]![q]!) < 1e-300) continue
      const theta = (a[q]![q]! - a[p]![p]!) / (2 * a[p]![q]!)
      const t = (theta >= 0 ? 1 : -1) / (Math.abs(theta) + Math.hypot(theta, 1))
      const c = 1 / Math.hypot(t, 1)
      for (let k = 0; k < 3; k++) {
        const [kp, kq] = [a[k]![p]!, a[k]![q]!]
        a[k]![p] = c * kp - t * c * kq
        a[k]![q] = t * c * kp + c * kq
      }
      for (let k = 0; k < 3; k++) {
        const [pk, qk] = [a[p]![k]!, a[q]![k]!]
        a[p]![k] = c * pk - t * c * qk
        a[q]![k] = t * c * pk + c * qk
      }
    }
  }
  return [a[0]![0]!, a[1]![1]!, a[2]![2]!].sort((x, y) => x - y)
}

/** Phase speeds of long waves along a direction, ascending, in spacing sqrt(k/m). */
function longWaveSpeeds(kind: Kind, direction: readonly number[]): number[] {
  const size = Math.hypot(...direction)
  const wave = 0.02
  return branches(kind)(direction.map((x) => (wave * x) / size)).map((squared) => Math.sqrt(squared) / wave)
}

/** Largest square of a frequency over a grid of wave vectors. */
function highest(kind: Kind, steps: number): number {
  const squares = branches(kind)
  let most = 0
  const cells = steps ** kind.dimensions
  for (let n = 0; n < cells; n++) {
    const q = kind.periods.map((_, axis) => (2 * Math.PI * (Math.floor(n / steps ** axis) % steps)) / steps)
    // Wave vector from phases along the periods.
    const phases = wavevector(kind, q)
    most = Math.max(most, squares(phases).at(-1)!)
  }
  return most
}

/** q with q . period_i = phase_i; periods here are triangular arrays, solved from the first on. */
function wavevector({ periods }: Kind, phases: readonly number[]): number[] {
  const q: number[] = []
  for (const [i, period] of periods.entries()) {
    const known = q.reduce((sum, one, x) => sum + one * period[x]!, 0)
    q.push((phases[i]! - known) / period[i]!)
  }
  return q
}

describe('long waves', () => {
  test.each([[[1, 0]], [[0.3, 1]], [[-0.7, 0.2]]])(
    'triangular lattice along %s: sqrt(9/8) and sqrt(3/8), ratio sqrt(3), in every direction',
    (direction) => {
      const [transverse, longitudinal] = longWaveSpeeds(triangular, direction)
      expect(relative(longitudinal!, 1.06066017178)).toBeLessThan(1e-4)
      expect(relative(transverse!, 0.612372435696)).toBeLessThan(1e-4)
      expect(relative(longitudinal! / transverse!, Math.sqrt(3))).toBeLessThan(1e-4)
    },
  )

  test('square lattice, k2 = 1/2, along [10]: sqrt(1.5) and sqrt(0.5)', () => {
    const [transverse, longitudinal] = longWaveSpeeds(square(1, 0.5), [1, 0])
    expect(relative(longitudinal!, Math.sqrt(1.5))).toBeLessThan(1e-4)
    expect(relative(transverse!, Math.sqrt(0.5))).toBeLessThan(1e-4)
  })

  test('cubic lattice with face diagonals along [100]: sqrt(C11) = sqrt(3) and sqrt(C44) = 1 twice', () => {
    const [one, other, longitudinal] = longWaveSpeeds(cubic, [1, 0, 0])
    expect(relative(longitudinal!, Math.sqrt(3))).toBeLessThan(1e-4)
    for (const transverse of [one!, other!]) expect(relative(transverse, 1)).toBeLessThan(1e-4)
  })
})

describe('the highest frequency', () => {
  test.each([
    ['triangular: 6 k/m', triangular, 12, 6],
    ['square, k1 = 1, k2 = 1/2: 4 (k1 + k2)/m', square(1, 0.5), 12, 6],
    ['square, k1 = 2, k2 = 1/3: 4 (k1 + k2)/m', square(2, 1 / 3), 12, 28 / 3],
    ['cubic with face diagonals, k = 1: 12 k/m', cubic, 8, 12],
  ] as const)('%s', (_, kind, steps, squared) => {
    const found = highest(kind, steps)
    expect(found).toBeLessThan(squared * (1 + 1e-5))
    expect(found).toBeGreaterThan(squared * (1 - 1e-5))
  })

  test('square: it is reached at q = (pi, 0)', () => {
    expect(relative(branches(square(1, 0.5))([Math.PI, 0])[1]!, 6)).toBeLessThan(1e-5)
  })

  test.each([triangular, square(1, 0.5), cubic])(
    'the simulator bounds it from above, and not by far',
    (kind) => {
      const squared = highest(kind, kind.dimensions === 2 ? 12 : 8)
      const bound = stepBound(patch(kind).spec)
      // w^2 <= 2 max_i sum_j k_ij / m_i for any lattice (Gershgorin's circles): 2 and 3 times too much here.
      const times = (bound.highestRadps * bound.highestRadps) / squared
      expect(times).toBeGreaterThan(1)
      expect(times).toBeLessThan(3 + 1e-5)
    },
  )
})
