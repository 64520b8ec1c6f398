// Effective elasticity of a periodic structure: the cell is given an affine strain, its nodes relax periodically, and
// the energy that is left, per area (2-D) or volume (3-D), is half the strain times the effective stiffness times the strain:
//   C = (1/V) min over w of  sum k (G e + B w)^2,   G e: what the strain alone does to each spring, B w: the nodes.
// First-order periodic homogenisation (e.g. Suquet, Elements of homogenization for inelastic solid mechanics, 1987, from
// memory). Mechanisms of the cell do no harm: the strain does no work on them.
//
// Strains in Voigt's order with engineering shear: 1-D xx; 2-D xx, yy, xy; 3-D xx, yy, zz, yz, xz, xy.

import { type CellForms, type CellSpec, cellForms, cellMeasure, type SpringForm } from './cell.js'
import { voigtPairs } from './elasticity.js'
import { demandDense } from './linear-model.js'
import { factorise } from './semidefinite.js'

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
  const { dimensions, size, forms } = described
  demandDense('cell.nodes', size)
  const pairs = voigtPairs(dimensions)
  const strained = forms.map((form) => pairs.map(([p, q]) => underStrain(form, p, q)))
  const solver = factorise(periodicStiffness(described), size)
  const relaxed = pairs.map((_, v) => {
    const right = new Float64Array(size)
    for (const [f, form] of forms.entries()) addTransposed(form, -form.stiffness * strained[f]![v]!, right)
    return solver.solve(right)
  })
  const cellSize = cellMeasure(cell.vectorsM)
  // Each spring's e = G e + B w for every unit strain; C is their energy product.
  const total = forms.map((form, f) => pairs.map((_, v) => strained[f]![v]! + applied(form, relaxed[v]!)))
  const stiffness = pairs.map((_, v) =>
    pairs.map((_, w) => {
      let sum = 0
      for (const [f, form] of forms.entries()) sum += form.stiffness * total[f]![v]! * total[f]![w]!
      return sum / cellSize
    }),
  )
  return {
    dimensions,
    stiffness,
    cellSize,
    mechanisms: size - solver.rank - dimensions,
    fluctuationsM: relaxed.map((w) => w.slice(0, cell.nodes.length * dimensions)),
  }
}

/** Stiffness of the cell against displacements that repeat in every cell, row-major. */
function periodicStiffness({ size, forms }: CellForms): Float64Array {
  const matrix = new Float64Array(size * size)
  for (const { stiffness, terms } of forms) {
    for (const row of terms) {
      for (const column of terms) {
        for (const [i, ci] of row.coefficients.entries()) {
          for (const [j, cj] of column.coefficients.entries()) {
            matrix[(row.at + i) * size + column.at + j]! += stiffness * ci * cj
          }
        }
      }
    }
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

function applied({ terms }: SpringForm, coordinates: Float64Array): number {
  let sum = 0
  for (const { at, coefficients } of terms) {
    for (const [i, c] of coefficients.entries()) sum += c * coordinates[at + i]!
  }
  return sum
}

function addTransposed({ terms }: SpringForm, factor: number, into: Float64Array): void {
  for (const { at, coefficients } of terms) {
    for (const [i, c] of coefficients.entries()) into[at + i]! += factor * c
  }
}
