// placeholder: the shared helper writes this file. Signatures are fixed.
/** A named stream of random numbers, counter-based (Philox4x32-10). */
export interface Stream {
  /** Next 32-bit word, 0 to 2^32 - 1. */
  word(): number
  /** Uniform in [0, 1), 53 bits. */
  uniform(): number
  /** Unbiased integer, 0 <= n < bound, bound up to 2^32. */
  below(bound: number): number
  /** Standard normal. */
  normal(): number
  /** True with probability numerator / denominator (integers). */
  chance(numerator: number, denominator: number): boolean
  /** A permutation of 0 .. length - 1. */
  permutation(length: number): Int32Array
  /** Index drawn with probability proportional to weights (finite, >= 0, not all 0). */
  weighted(weights: ArrayLike<number>): number
}
