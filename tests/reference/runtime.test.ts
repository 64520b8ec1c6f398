// Runtime theory: exact expected times of (1+1), RLS and (1+lambda) on OneMax and LeadingOnes, through
// `one-plus-lambda`. Times are iterations (generations) after the first evaluation; offspring are accepted when
// not worse; each bit flips with chance 1/n (RLS: exactly one bit). The expectations are recomputed by exact
// absorbing Markov chains. Seeds were chosen beforehand: 31000 and on; bands are four standard errors.

import { describe, expect, test } from 'vitest'
import { onePlusLambda } from '../../coordinator/evolution/methods/one-plus-lambda.js'
import type { Genome } from '../../shared/genome.js'
import {
  bitStrings,
  bitsOf,
  drive,
  type Estimate,
  estimateOf,
  oneBitFlip,
  randomBits,
  standardBitMutation,
} from './drive.js'

function zeros(genome: Genome): number {
  let ones = 0
  for (const bit of bitsOf(genome)) ones += bit
  return bitsOf(genome).length - ones
}
function notLeading(genome: Genome): number {
  const first = bitsOf(genome).indexOf(0)
  return first < 0 ? 0 : bitsOf(genome).length - first
}

interface Case {
  readonly n: number
  readonly runs: number
  readonly expected: number
  readonly lambda?: number
}

/** Generations until the best possible score, over runs with seeds 31000, 31001, ... */
function generations(
  { n, runs, lambda = 1 }: Case,
  missing: (genome: Genome) => number,
  mutate = standardBitMutation,
  founder = randomBits,
): Estimate {
  const times: number[] = []
  for (let run = 0; run < runs; run++) {
    const { step, steps, machine } = drive({
      method: onePlusLambda,
      population: lambda,
      variation: bitStrings(n, mutate, founder),
      score: (genome) => [missing(genome)],
      seed: 31000 + run,
      lookahead: lambda,
    })
    step()
    let count = 0
    for (; machine.members()[0]!.score[0] !== 0; count++) steps(lambda)
    times.push(count)
  }
  return estimateOf(times)
}

function expectWithin({ mean, band }: Estimate, expected: number): void {
  // A band so wide that it could hold anything would be no test.
  expect(band).toBeLessThan(0.2 * expected)
  expect(Math.abs(mean - expected)).toBeLessThan(band)
}

const allZeros = (): void => {}

describe('(1+1) EA on OneMax', () => {
  // Exact chains; the expansion of Hwang, Panholzer, Rolin, Tsai and Chen, Probabilistic analysis of the (1+1)
  // evolutionary algorithm, 2018, agrees within 0.05 % at n = 50.
  test.each<Case>([
    { n: 10, runs: 1000, expected: 47.9865939067 },
    { n: 20, runs: 1000, expected: 130.065272615 },
    { n: 50, runs: 300, expected: 443.1887786288 },
  ])('from a random start, n = $n', (one) => {
    expectWithin(generations(one, zeros), one.expected)
  })

  test.each<Case>([{ n: 20, runs: 1000, expected: 146.8073452494 }])('from all zeros, n = $n', (one) => {
    expectWithin(generations(one, zeros, standardBitMutation, allZeros), one.expected)
  })
})

describe('one-bit flips (randomised local search) on OneMax', () => {
  // From all zeros this is the coupon collector: n times the n-th harmonic number.
  test.each<Case>([
    { n: 20, runs: 1000, expected: 58.0918504019 },
    { n: 100, runs: 250, expected: 449.423033708 },
  ])('from a random start, n = $n', (one) => {
    expectWithin(generations(one, zeros, oneBitFlip), one.expected)
  })

  test.each<Case>([{ n: 50, runs: 400, expected: 224.9602669165 }])('from all zeros, n = $n', (one) => {
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
  ])('standard bit mutation, n = $n', (one) => {
    const { n } = one
    expect((n * n * ((1 - 1 / n) ** (1 - n) - (1 - 1 / n))) / 2).toBeCloseTo(one.expected, 6)
    expectWithin(generations(one, notLeading), one.expected)
  })

  test('one-bit flips take n^2 / 2', () => {
    const one = { n: 30, runs: 600, expected: 450 }
    expectWithin(generations(one, notLeading, oneBitFlip), one.expected)
  })
})

describe('(1+lambda) EA: parallel generations, exact chains', () => {
  test.each<Case>([
    { n: 50, lambda: 2, runs: 200, expected: 226.90010918 },
    { n: 50, lambda: 8, runs: 200, expected: 65.25907748 },
    { n: 50, lambda: 32, runs: 150, expected: 25.5593084 },
    { n: 100, lambda: 16, runs: 60, expected: 88.88145428 },
  ])('OneMax, n = $n, lambda = $lambda', (one) => {
    expectWithin(generations(one, zeros), one.expected)
  })

  // The free bits behind the leading ones are not independent of selection: a chain that takes them so is up to
  // 24 % off at n = 20, lambda = 64.
  test.each<Case>([
    { n: 20, lambda: 8, runs: 600, expected: 46.6651798 },
    { n: 20, lambda: 64, runs: 300, expected: 10.92310824 },
    { n: 50, lambda: 16, runs: 80, expected: 145.33300262 },
  ])('LeadingOnes, n = $n, lambda = $lambda', (one) => {
    expectWithin(generations(one, notLeading), one.expected)
  })
})
