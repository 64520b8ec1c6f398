// Linear equations with a symmetric positive semidefinite matrix: stiffness matrices of bodies that may float or
// hold mechanisms. Cholesky factorisation with diagonal pivoting (Higham, Analysis of the Cholesky decomposition
// of a semi-definite matrix, 1990, from memory): at each step the largest remaining diagonal entry is the pivot,
// and when it is negligible the rest is zero and the rank is known. ml-matrix has no factorisation that stands
// singular matrices and is cheaper than eigenvalues; this one needs only + - * / and square root, like it.
//
// The matrix is scaled to ones on its diagonal first, so that metres, radians and stiff and soft parts count alike.

/** A pivot below this, after scaling, is a zero mode: 1e12 times softer than the parts around it. */
export const negligiblePivot = 1e-12

export interface Factorisation {
  readonly size: number
  /** Number of coordinates with stiffness of their own; `size - rank` is the number of zero modes. */
  readonly rank: number
  /** The smallest pivot that counted, 1 at most: rounding errors of the solution are magnified by up to its inverse. */
  readonly leastPivot: number
  /**
   * One solution x of A x = b, the coordinates that are free to float held at zero. Meaningful when b does no work
   * on the zero modes; `residual` says by how much it does.
   */
  solve(right: ArrayLike<number>): Float64Array
  /** Largest |A x - b| over largest |b|, 0 when b is zero. */
  residual(solution: ArrayLike<number>, right: ArrayLike<number>): number
}

/**
 * Factorises the symmetric matrix (row-major, size * size, only its lower triangle is read). A diagonal entry of at
 * most `floor` times the largest is rounding, and its coordinate has no stiffness.
 */
export function factorise(matrix: Float64Array, size: number, floor = 1e-20): Factorisation {
  let largest = 0
  for (let i = 0; i < size; i++) largest = Math.max(largest, matrix[i * size + i]!)
  const scale = new Float64Array(size)
  for (let i = 0; i < size; i++) {
    const diagonal = matrix[i * size + i]!
    scale[i] = diagonal > floor * largest ? 1 / Math.sqrt(diagonal) : 0
  }
  const lower = new Float64Array(size * size)
  for (let i = 0; i < size; i++) {
    for (let j = 0; j <= i; j++) lower[i * size + j] = matrix[i * size + j]! * scale[i]! * scale[j]!
  }
  const order = Int32Array.from({ length: size }, (_, i) => i)
  const rank = eliminate(lower, size, order)
  const last = rank === 0 ? 1 : lower[(rank - 1) * size + rank - 1]!
  const solve = (right: ArrayLike<number>) => substitute(lower, size, order, rank, scale, right)
  return {
    size,
    rank,
    leastPivot: last * last,
    solve,
    residual: (solution, right) => residualOf(matrix, size, solution, right),
  }
}

/** In place: rows and columns are exchanged so that pivots fall; returns how many pivots there were. */
function eliminate(a: Float64Array, n: number, order: Int32Array): number {
  for (let k = 0; k < n; k++) {
    let best = k
    for (let i = k + 1; i < n; i++) if (a[i * n + i]! > a[best * n + best]!) best = i
    if (!(a[best * n + best]! > negligiblePivot)) return k
    if (best !== k) exchange(a, n, order, k, best)
    const pivot = Math.sqrt(a[k * n + k]!)
    a[k * n + k] = pivot
    for (let i = k + 1; i < n; i++) a[i * n + k]! /= pivot
    for (let i = k + 1; i < n; i++) {
      const factor = a[i * n + k]!
      if (factor === 0) continue
      for (let j = k + 1; j <= i; j++) a[i * n + j]! -= factor * a[j * n + k]!
    }
  }
  return n
}

/** Exchanges rows and columns k < m of a symmetric matrix of which the lower triangle is kept. */
function exchange(a: Float64Array, n: number, order: Int32Array, k: number, m: number): void {
  const swap = (x: number, y: number) => {
    const kept = a[x]!
    a[x] = a[y]!
    a[y] = kept
  }
  for (let j = 0; j < k; j++) swap(k * n + j, m * n + j)
  swap(k * n + k, m * n + m)
  for (let j = k + 1; j < m; j++) swap(j * n + k, m * n + j)
  for (let i = m + 1; i < n; i++) swap(i * n + k, i * n + m)
  const kept = order[k]!
  order[k] = order[m]!
  order[m] = kept
}

function substitute(
  lower: Float64Array,
  n: number,
  order: Int32Array,
  rank: number,
  scale: Float64Array,
  right: ArrayLike<number>,
): Float64Array {
  const y = new Float64Array(rank)
  for (let i = 0; i < rank; i++) {
    let sum = right[order[i]!]! * scale[order[i]!]!
    for (let j = 0; j < i; j++) sum -= lower[i * n + j]! * y[j]!
    y[i] = sum / lower[i * n + i]!
  }
  for (let i = rank - 1; i >= 0; i--) {
    let sum = y[i]!
    for (let j = i + 1; j < rank; j++) sum -= lower[j * n + i]! * y[j]!
    y[i] = sum / lower[i * n + i]!
  }
  const x = new Float64Array(n)
  for (let i = 0; i < rank; i++) x[order[i]!] = y[i]! * scale[order[i]!]!
  return x
}

function residualOf(
  matrix: Float64Array,
  n: number,
  solution: ArrayLike<number>,
  right: ArrayLike<number>,
): number {
  let worst = 0
  let largest = 0
  for (let i = 0; i < n; i++) {
    let sum = 0
    for (let j = 0; j < n; j++) {
      const entry = j <= i ? matrix[i * n + j]! : matrix[j * n + i]!
      sum += entry * solution[j]!
    }
    worst = Math.max(worst, Math.abs(sum - right[i]!))
    largest = Math.max(largest, Math.abs(right[i]!))
  }
  return largest === 0 ? worst : worst / largest
}
