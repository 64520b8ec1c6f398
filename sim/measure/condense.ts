// The one step behind every periodic homogenisation, whatever a cell is made of: the elastic energy of the cell is a
// quadratic form of the movements of its nodes and of the mean strains; the nodes find their least energy, and what is
// left belongs to the strains. (Static condensation: Guyan, Reduction of stiffness and mass matrices, 1965, from
// memory.) The cells of springs (homogenise.ts) and of beams (../frames/homogenise.ts) only say what their energy is.

import { factorise } from './semidefinite.js'

export interface Condensed {
  /** Stiffness against the kept coordinates, row-major, the others at their least energy. */
  readonly kept: Float64Array
  /** Movements of the others that nothing resists. */
  readonly mechanisms: number
  /** Where the others go for a unit of each kept coordinate; those that are free to float stay. */
  readonly follow: readonly Float64Array[]
}

/**
 * Minimises 1/2 x'A x over all but the last `keep` of the coordinates; A symmetric, positive semidefinite, row-major, full.
 * The energy is taken at the minimum itself, where an error of the movements counts only squared.
 */
export function condense(matrix: Float64Array, size: number, keep: number): Condensed {
  const inner = size - keep
  const own = new Float64Array(inner * inner)
  for (let i = 0; i < inner; i++) own.set(matrix.subarray(i * size, i * size + inner), i * inner)
  const solver = factorise(own, inner)
  const follow: Float64Array[] = []
  for (let v = inner; v < size; v++) {
    follow.push(solver.solve(Float64Array.from({ length: inner }, (_, i) => -matrix[i * size + v]!)))
  }
  const kept = new Float64Array(keep * keep)
  for (let w = 0; w < keep; w++) {
    const held = appliedTo(matrix, size, follow[w]!, inner + w)
    for (let v = 0; v < keep; v++) {
      let sum = held[inner + v]!
      for (let i = 0; i < inner; i++) sum += follow[v]![i]! * held[i]!
      kept[v * keep + w] = sum
    }
  }
  return { kept, mechanisms: inner - solver.rank, follow }
}

/** A x of x = (follow, one at `at`): the forces that are left. */
function appliedTo(matrix: Float64Array, size: number, follow: Float64Array, at: number): Float64Array {
  const forces = new Float64Array(size)
  for (let i = 0; i < size; i++) {
    let sum = matrix[i * size + at]!
    for (let j = 0; j < follow.length; j++) sum += matrix[i * size + j]! * follow[j]!
    forces[i] = sum
  }
  return forces
}
