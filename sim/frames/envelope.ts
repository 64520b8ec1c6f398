// Symmetric matrices stored row by row from their first entry to the diagonal, and L D L^T in place (Jennings' envelope
// method: nothing outside the envelope ever becomes nonzero). No pivoting: for stiffness matrices, whose negative
// pivots count the unstable directions (Sylvester's law of inertia). Only + - x /, in a fixed order.

export interface Envelope {
  readonly size: number
  /** First column of every row. */
  readonly first: Int32Array
  /** Place of (i, j) in values is base[i] + j, for first[i] <= j <= i. */
  readonly base: Int32Array
  readonly values: Float64Array
}

/** An envelope of zeros whose row i begins at column first[i] <= i. */
export function envelope(first: Int32Array): Envelope {
  const size = first.length
  const base = new Int32Array(size)
  let used = 0
  for (let i = 0; i < size; i++) {
    base[i] = used - first[i]!
    used += i - first[i]! + 1
  }
  return { size, first, base, values: new Float64Array(used) }
}

/** Pivots below zero, and the first row whose pivot was lost (not finite, or zero within round-off); -1 if none. */
export interface Inertia {
  readonly negative: number
  readonly lost: number
}

/** A pivot this small against its own diagonal entry is round-off. */
const pivotLeast = 1e-14

/**
 * Replaces the matrix by its factors L (below) and D (on the diagonal). Zeros inside the envelope stay zeros for long
 * where walls are in pieces, so each row keeps a list of its other entries.
 */
export function factorise({ size, first, base, values }: Envelope): Inertia {
  const filled = new Int32Array(size)
  let negative = 0
  for (let i = 0; i < size; i++) {
    const row = base[i]!
    const diagonal = values[row + i]!
    let count = 0
    for (let j = first[i]!; j < i; j++) {
      const other = base[j]!
      const from = first[j]!
      let sum = values[row + j]!
      for (let t = count - 1; t >= 0; t--) {
        const k = filled[t]!
        if (k < from) break
        sum -= values[row + k]! * values[other + k]!
      }
      values[row + j] = sum
      if (sum !== 0) filled[count++] = j
    }
    let pivot = diagonal
    for (let t = 0; t < count; t++) {
      const j = filled[t]!
      const scaled = values[row + j]! / values[base[j]! + j]!
      pivot -= scaled * values[row + j]!
      values[row + j] = scaled
    }
    values[row + i] = pivot
    // The negation catches NaN too.
    if (!(Math.abs(pivot) > pivotLeast * Math.abs(diagonal))) return { negative, lost: i }
    if (pivot < 0) negative++
  }
  return { negative, lost: -1 }
}

/** Solves with the factors, in place. */
export function solveFactorised({ size, first, base, values }: Envelope, x: Float64Array): void {
  for (let i = 0; i < size; i++) {
    const row = base[i]!
    let sum = x[i]!
    for (let j = first[i]!; j < i; j++) sum -= values[row + j]! * x[j]!
    x[i] = sum
  }
  for (let i = 0; i < size; i++) x[i] = x[i]! / values[base[i]! + i]!
  for (let i = size - 1; i >= 0; i--) {
    const row = base[i]!
    const value = x[i]!
    for (let j = first[i]!; j < i; j++) x[j] = x[j]! - values[row + j]! * value
  }
}
