// Effective elasticity of a periodic structure: the cell is given an affine strain, its nodes relax periodically, and
// the energy that is left, per area (2-D) or volume (3-D), is half the strain times the effective stiffness times the strain:
//   C = (1/V) min over w of  sum k (G e + B w)^2,   G e: what the strain alone does to each spring, B w: the nodes.
// First-order periodic homogenisation (e.g. Suquet, Elements of homogenization for inelastic solid mechanics, 1987, from
// memory). Mechanisms of the cell do no harm: the strain does no work on them.
//
// Strains in Voigt's order with engineering shear: 1-D xx; 2-D xx, yy, xy; 3-D xx, yy, zz, yz, xz, xy.

import { type CellForms, type CellSpec, cellForms, cellMeasure, type SpringForm } from './cell.js'
import { condense } from './condense.js'
import { voigtPairs } from './elasticity.js'
import { demandDense } from './linear-model.js'

export interface Homogenised {
  readonly dimensions: number
  /** Effective stiffness in Voigt's order; N in 1-D (a rope's EA), N/m in 2-D, Pa in 3-D. */
  readonly stiffness: readonly (readonly number[])[]
  /** Length (m), area (m^2) or volume (m^3) of the cell. */
  readonly cellSize: number
  /** Periodic motions of the nodes that stretch nothing, besides the translations. */
  readonly mechanisms: number
  /** For each unit strain, how the nodes leave the affine motion, m: node by node, x first. */
  readonly fluctuationsM: readonly Float64Array[]
}

/** Effective stiffness of a periodic cell. Refuses ('impossible-value') a cell that cannot be, naming the field. */
export function homogenise(cell: CellSpec): Homogenised {
  const described = cellForms(cell)
  const { dimensions, size } = described
  demandDense('cell.nodes', size)
  const strains = voigtPairs(dimensions).length
  const { kept, mechanisms, follow } = condense(energyMatrix(described), size + strains, strains)
  const cellSize = cellMeasure(cell.vectorsM)
  return {
    dimensions,
    stiffness: follow.map((_, v) =>
      Array.from(kept.subarray(v * strains, (v + 1) * strains), (k) => k / cellSize),
    ),
    cellSize,
    mechanisms: mechanisms - dimensions,
    fluctuationsM: follow.map((w) => w.slice(0, cell.nodes.length * dimensions)),
  }
}

/**
 * Twice the energy as a matrix, row-major, over the displacements that repeat in every cell, then the mean strains: each
 * spring's e = B w + G e is one row over both, and gives stiffness times the product of that row with itself.
 */
function energyMatrix({ dimensions, size, forms }: CellForms): Float64Array {
  const pairs = voigtPairs(dimensions)
  const all = size + pairs.length
  const matrix = new Float64Array(all * all)
  for (const form of forms) {
    const row = new Map<number, number>()
    for (const { at, coefficients } of form.terms) {
      for (const [i, c] of coefficients.entries()) row.set(at + i, (row.get(at + i) ?? 0) + c)
    }
    for (const [v, [p, q]] of pairs.entries()) row.set(size + v, underStrain(form, p, q))
    for (const [i, ci] of row) for (const [j, cj] of row) matrix[i * all + j]! += form.stiffness * ci * cj
  }
  return matrix
}

/** e of a spring when every place moves by the unit strain of the axes p, q (engineering shear when they differ). */
function underStrain({ terms }: SpringForm, p: number, q: number): number {
  let sum = 0
  for (const { coefficients: c, placeM } of terms) {
    if (!placeM) continue
    sum += p === q ? c[p]! * placeM[p]! : (c[p]! * placeM[q]! + c[q]! * placeM[p]!) / 2
  }
  return sum
}
