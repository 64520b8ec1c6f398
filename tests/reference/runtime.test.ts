// Runtime theory: exact expected times of (1+1) and RLS on OneMax and LeadingOnes, through
// `one-plus-lambda` and the operators of bits. Times are iterations (generations) after the first evaluation; offspring are
// accepted when not worse; each bit flips with chance 1/n (RLS: exactly one bit). The expectations are recomputed by exact
// absorbing Markov chains. Seeds were chosen beforehand: 31000 and on; bands are four standard errors.

import { describe, expect, test } from 'vitest'
import type { Genome } from '../../shared/genome.js'
import {
  type Case,
  expectWithin,
  flipping,
  generations,
  notLeading,
  oneBitFlip,
  zeros,
} from './runtime-bits.js'

const allZeros = (): void => {}

describe('(1+1) EA on OneMax', () => {
  // Exact chains; the expansion of Hwang, Panholzer, Rolin, Tsai and Chen, Probabilistic analysis of the (1+1)
  // evolutionary algorithm, 2018, agrees within 0.05 % at n = 50.
  test.each<Case>([
    { n: 5, runs: 1000, expected: 16.1063658414 },
    { n: 10, runs: 1000, expected: 47.9865939067 },
    { n: 20, runs: 1000, expected: 130.065272615 },
    { n: 50, runs: 300, expected: 443.1887786288 },
    { n: 100, runs: 120, expected: 1069.5384972598 },
    { n: 200, runs: 60, expected: 2509.8251348081 },
  ])('from a random start, n = $n', (one) => {
    expectWithin(generations(one, zeros), one.expected)
  })

  // The same exact chains.
  test.each([
    [20, 0.5, 173.9092],
    [20, 1.22664, 127.4528518],
    [20, 2, 148.869],
    [50, 0.5, 582.6067],
    [50, 1.1953, 436.580014],
    [50, 2, 513.4519],
    [100, 1.17035, 1057.1514825],
  ])('n = %d, each bit flips with chance %d / n', (n, c, expected) => {
    const one = { n, runs: 6_000 / n, expected }
    expectWithin(generations(one, zeros, flipping(c)), expected)
  })

  test.each<Case>([
    { n: 5, runs: 1000, expected: 19.925588143 },
    { n: 10, runs: 1000, expected: 56.1434352965 },
    { n: 20, runs: 1000, expected: 146.8073452494 },
    { n: 50, runs: 200, expected: 485.6625270749 },
    { n: 100, runs: 80, expected: 1154.8922679671 },
    { n: 200, runs: 40, expected: 2680.9367793591 },
  ])('from all zeros, n = $n', (one) => {
    expectWithin(generations(one, zeros, flipping(1), allZeros), one.expected)
  })
})

describe('one-bit flips (randomised local search) on OneMax', () => {
  // From all zeros this is the coupon collector: n times the n-th harmonic number.
  test.each<Case>([
    { n: 10, runs: 1000, expected: 22.3590339782 },
    { n: 20, runs: 1000, expected: 58.0918504019 },
    { n: 50, runs: 400, expected: 190.3029078885 },
    { n: 100, runs: 250, expected: 449.423033708 },
    { n: 200, runs: 100, expected: 1036.9767535123 },
  ])('from a random start, n = $n', (one) => {
    expectWithin(generations(one, zeros, oneBitFlip), one.expected)
  })

  test.each<Case>([
    { n: 10, runs: 1000, expected: 29.2896825397 },
    { n: 20, runs: 500, expected: 71.9547931429 },
    { n: 50, runs: 400, expected: 224.9602669165 },
    { n: 100, runs: 120, expected: 518.737751764 },
    { n: 200, runs: 60, expected: 1175.6061896243 },
  ])('from all zeros, n = $n', (one) => {
    expectWithin(generations(one, zeros, oneBitFlip, allZeros), one.expected)
  })
})

describe('(1+1) EA on LeadingOnes', () => {
  // Optimal fixed and adaptive mutation rates for the LeadingOnes problem, PPSN XI, 2010:
  // (n^2 / 2) ((1 - 1/n)^(1 - n) - (1 - 1/n)).
  test.each<Case>([
    { n: 10, runs: 1000, expected: 84.0587395857 },
    { n: 20, runs: 500, expected: 340.0068653281 },
    { n: 50, runs: 120, expected: 2138.816558553 },
    { n: 100, runs: 30, expected: 8573.3951808237 },
  ])('standard bit mutation, n = $n', (one) => {
    const { n } = one
    expect((n * n * ((1 - 1 / n) ** (1 - n) - (1 - 1 / n))) / 2).toBeCloseTo(one.expected, 6)
    expectWithin(generations(one, notLeading), one.expected)
  })

  // Best fixed chance, about 1.59 / n, and 1.59 / n itself: (1 / (2 p^2)) ((1 - p)^(1 - n) - (1 - p)).
  test.each([
    [10, 1.478, 77.04315773],
    [20, 1.5331, 308.66423853],
    [20, 1.59, 308.93259],
    [50, 1.56872, 1930.00990239],
    [50, 1.59, 1930.226042],
  ])('n = %d, each bit flips with chance %d / n', (n, c, expected) => {
    const p = c / n
    expect(Math.abs(((1 - p) ** (1 - n) - (1 - p)) / (2 * p * p) / expected - 1)).toBeLessThan(1e-6)
    expectWithin(generations({ n, runs: 5_000 / n, expected }, notLeading, flipping(c)), expected)
  })

  test('one-bit flips take n^2 / 2', () => {
    const one = { n: 30, runs: 600, expected: 450 }
    expectWithin(generations(one, notLeading, oneBitFlip), one.expected)
  })
})

describe('a needle in a haystack', () => {
  // Everything but the one best string is worth the same, so what is not worse must be taken: one-bit flips then walk at
  // random over the corners of the cube, and from beside the needle need 2^n - 1 steps to it (Kac, Random walk and the
  // theory of Brownian motion, 1947, from memory: the mean time of return is 2^n).
  test.each([4, 6])('n = %i: 2^n - 1 steps from beside it', (n) => {
    const one = { n, runs: 3000, expected: 2 ** n - 1 }
    const beside = (value: Uint8Array) => value.fill(1, 1)
    const missing = (genome: Genome) => (zeros(genome) === 0 ? 0 : 1)
    expectWithin(generations(one, missing, oneBitFlip, beside), one.expected)
  })
})
