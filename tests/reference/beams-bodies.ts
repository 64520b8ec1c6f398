// Straight beams as frameworks, and the generalised eigenvalues of their matrices.

import { CholeskyDecomposition, EigenvalueDecomposition, Matrix } from 'ml-matrix'
import { type BarSpec, buildFramework, type Framework, type Point } from '../../sim/frames/index.js'

export interface BeamOptions {
  readonly pieces: number
  /** Along y instead of x. */
  readonly upright?: boolean
  readonly wall?: Partial<BarSpec>
}

/** A beam of length 1, E I = 1, mass 1 a length, very stiff in stretching, from the origin along x (or y). */
export function beam({ pieces, upright = false, wall = {} }: BeamOptions): Framework {
  const nodes = Array.from({ length: pieces + 1 }, (_, i): Point => {
    return upright ? [0, i / pieces] : [i / pieces, 0]
  })
  const bars = Array.from({ length: pieces }, (_, i): BarSpec => {
    return { a: i, b: i + 1, axialN: 1e6, bendingNm2: 1, massKgpm: 1, ...wall }
  })
  return buildFramework({ nodes, bars })
}

export type End = 'free' | 'pinned' | 'clamped'

/** Unknowns across the beam and its turns, without those that the ends hold. Displacements along it are left out. */
export function bendingUnknowns(framework: Framework, ends: readonly [End, End], upright = false): number[] {
  const last = framework.nodeUnknown.length - 1
  const endOf = (node: number): End => (node === 0 ? ends[0] : node === last ? ends[1] : 'free')
  return Array.from(framework.nodeUnknown).flatMap((unknown, node) => {
    const across = unknown + (upright ? 0 : 1)
    const turn = framework.turnOf(node)
    return { free: [across, turn], pinned: [turn], clamped: [] }[endOf(node)]
  })
}

/** The rows and columns `chosen` of a full matrix. */
export function partOf(matrix: Float64Array, size: number, chosen: readonly number[]): Matrix {
  return new Matrix(chosen.map((i) => chosen.map((j) => matrix[i * size + j]!)))
}

/** Eigenvalues of A x = w B x, ascending; B positive definite. */
export function eigenvaluesOf(a: Matrix, b: Matrix): number[] {
  const l = new CholeskyDecomposition(Matrix.add(b, b.transpose()).mul(0.5)).lowerTriangularMatrix
  // L^-1 A L^-T by two forward substitutions.
  const half = forward(l, a)
  const whole = forward(l, half.transpose())
  const symmetric = Matrix.add(whole, whole.transpose()).mul(0.5)
  return new EigenvalueDecomposition(symmetric, { assumeSymmetric: true }).realEigenvalues.sort(
    (x, y) => x - y,
  )
}

function forward(l: Matrix, right: Matrix): Matrix {
  const x = right.clone()
  for (let i = 0; i < l.rows; i++) {
    for (let c = 0; c < x.columns; c++) {
      let sum = x.get(i, c)
      for (let k = 0; k < i; k++) sum -= l.get(i, k) * x.get(k, c)
      x.set(i, c, sum / l.get(i, i))
    }
  }
  return x
}

/** Observed order of convergence from the errors at h and h/2. */
export function orderOf(errorAtH: number, errorAtHalf: number): number {
  return Math.log2(errorAtH / errorAtHalf)
}

/** Richardson's extrapolation of values at h, h/2, h/4, ... whose errors have these orders in h (one fewer than values). */
export function extrapolate(values: readonly number[], orders: readonly number[]): number {
  return orders.reduce(
    (row, order) => row.slice(1).map((fine, i) => fine + (fine - row[i]!) / (2 ** order - 1)),
    [...values],
  )[0]!
}
