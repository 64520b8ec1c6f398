// Plane waves in a periodic structure: Bloch's theorem turns the infinite lattice into one cell whose neighbours move
// with a phase, u(cell at R) = w e^(i q . R), and the waves of wavevector q are the modes of a Hermitian stiffness:
//   sum over springs of  k (B e^(iqR))* (B e^(iqR)) w = w^2 M w
// solved as a real symmetric problem of twice the size (every frequency comes out twice) with ml-matrix. Gaps between
// bands are frequencies that the structure does not carry. Source: Brillouin, Wave propagation in periodic structures,
// 1946 (from memory).

import { EigenvalueDecomposition, Matrix } from 'ml-matrix'
import { cos, sin } from '../../shared/detmath/trigonometry.js'
import { refuse } from '../../shared/refusals.js'
import { type CellSpec, cellForms } from './cell.js'
import { demandDense } from './linear-model.js'

/**
 * Angular frequencies (rad/s) of the waves with wavevector q (rad/m), from the lowest: as many as coordinates of a cell.
 * Every node needs a mass; beams are refused (their rotations have none). A mode that is unstable or not resisted is 0.
 */
export function bandRadps(cell: CellSpec, wavevectorRadpm: readonly number[]): Float64Array {
  const { dimensions, size, forms } = cellForms(cell)
  demandDense('cell.nodes', 2 * size)
  demand((cell.beams ?? []).length === 0, 'beams', 'beams', 'none: their rotations carry no mass here')
  demand(
    wavevectorRadpm.length === dimensions,
    'wavevectorRadpm',
    `[${wavevectorRadpm}]`,
    `${dimensions} numbers`,
  )
  const perRootKg = cell.nodes.flatMap(({ massKg }, i) => {
    demand(massKg !== undefined, `nodes[${i}].massKg`, 'none', 'a mass')
    return new Array<number>(dimensions).fill(1 / Math.sqrt(massKg))
  })
  const matrix = Matrix.zeros(2 * size, 2 * size)
  const add = (i: number, j: number, value: number) => matrix.set(i, j, matrix.get(i, j) + value)
  for (const { stiffness, terms } of forms) {
    for (const row of terms) {
      for (const column of terms) {
        let angle = 0
        for (const [axis, q] of wavevectorRadpm.entries()) {
          angle += q * (column.offsetM[axis]! - row.offsetM[axis]!)
        }
        const [real, imaginary] = [cos(angle), sin(angle)]
        for (const [a, ca] of row.coefficients.entries()) {
          for (const [b, cb] of column.coefficients.entries()) {
            const [i, j] = [row.at + a, column.at + b]
            const value = stiffness * ca * cb * perRootKg[i]! * perRootKg[j]!
            add(i, j, value * real)
            add(size + i, size + j, value * real)
            add(i, size + j, -value * imaginary)
            add(size + i, j, value * imaginary)
          }
        }
      }
    }
  }
  const { realEigenvalues } = new EigenvalueDecomposition(matrix, { assumeSymmetric: true })
  const squares = realEigenvalues.sort((a, b) => a - b)
  return Float64Array.from({ length: size }, (_, i) => Math.sqrt(Math.max(0, squares[2 * i]!)))
}

function demand(truth: boolean, field: string, found: string, expected: string): asserts truth {
  if (truth) return
  throw refuse('impossible-value', {
    detail: `found ${found}, expected ${expected}.`,
    where: { field: `cell.${field}` },
  })
}
