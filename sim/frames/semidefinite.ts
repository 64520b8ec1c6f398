// Elimination of unknowns from a symmetric matrix that may be singular: a stiffness with mechanisms. Diagonal pivoting
// (the largest that is left first), which reveals the rank of a positive semidefinite matrix; rows and columns are
// first scaled to a unit diagonal, so that metres and radians weigh alike. (N. J. Higham, Analysis of the Cholesky
// decomposition of a semi-definite matrix, 1990; from memory.)

export interface Eliminated {
  /** Schur complement of the last `keep` unknowns, row by row. */
  readonly kept: Float64Array
  /** Unknowns that no stiffness held: independent mechanisms among those eliminated. */
  readonly mechanisms: number
}

/** A scaled pivot this small means a mechanism; walls a thousandth as thick as long still give 1e-6. */
const pivotLeast = 1e-11

/** Minimises 1/2 x^T A x over the first size - keep unknowns. `matrix` (row by row, full) is used up. */
export function eliminate(matrix: Float64Array, size: number, keep: number): Eliminated {
  const inner = size - keep
  scaleToUnitDiagonal(matrix, size, inner)
  const done = new Uint8Array(inner)
  let rank = 0
  for (; rank < inner; rank++) {
    let pivot = -1
    for (let i = 0; i < inner; i++) {
      if (!done[i] && (pivot < 0 || matrix[i * size + i]! > matrix[pivot * size + pivot]!)) pivot = i
    }
    const value = matrix[pivot * size + pivot]!
    if (!(value > pivotLeast)) break
    done[pivot] = 1
    for (let i = 0; i < size; i++) {
      if (i < inner && done[i]) continue
      const factor = matrix[i * size + pivot]! / value
      if (factor === 0) continue
      for (let j = 0; j < size; j++) {
        matrix[i * size + j] = matrix[i * size + j]! - factor * matrix[pivot * size + j]!
      }
    }
  }
  const kept = new Float64Array(keep * keep)
  for (let i = 0; i < keep; i++) {
    for (let j = 0; j < keep; j++) kept[i * keep + j] = matrix[(inner + i) * size + inner + j]!
  }
  return { kept, mechanisms: inner - rank }
}

/** Rows without any stiffness stay as they are: nothing holds them. */
function scaleToUnitDiagonal(matrix: Float64Array, size: number, inner: number): void {
  for (let i = 0; i < inner; i++) {
    const diagonal = matrix[i * size + i]!
    if (!(diagonal > 0)) continue
    const factor = 1 / Math.sqrt(diagonal)
    for (let j = 0; j < size; j++) {
      matrix[i * size + j] = matrix[i * size + j]! * factor
      matrix[j * size + i] = matrix[j * size + i]! * factor
    }
  }
}
