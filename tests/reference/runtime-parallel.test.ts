// Runtime theory of parallel generations: exact expected generations of (1+lambda) on OneMax and LeadingOnes, as in
// runtime.test.ts. The expectations are recomputed by exact absorbing Markov chains. Seeds were chosen beforehand: 31000
// and on; bands are four standard errors.

import { describe, test } from 'vitest'
import { type Case, expectWithin, generations, notLeading, zeros } from './runtime-bits.js'

describe('(1+lambda) EA: parallel generations, exact chains', () => {
  test.each<Case>([
    { n: 20, lambda: 2, runs: 400, expected: 67.14615363 },
    { n: 20, lambda: 4, runs: 400, expected: 35.76917174 },
    { n: 20, lambda: 8, runs: 400, expected: 20.20172156 },
    { n: 20, lambda: 16, runs: 400, expected: 12.53601885 },
    { n: 20, lambda: 32, runs: 400, expected: 8.74765123 },
    { n: 50, lambda: 2, runs: 200, expected: 226.90010918 },
    { n: 50, lambda: 4, runs: 200, expected: 118.94616376 },
    { n: 50, lambda: 8, runs: 200, expected: 65.25907748 },
    { n: 50, lambda: 16, runs: 200, expected: 38.71510098 },
    { n: 50, lambda: 32, runs: 150, expected: 25.5593084 },
    { n: 100, lambda: 2, runs: 100, expected: 545.39774331 },
    { n: 100, lambda: 4, runs: 120, expected: 283.69739038 },
    { n: 100, lambda: 8, runs: 100, expected: 153.41812139 },
    { n: 100, lambda: 16, runs: 60, expected: 88.88145428 },
    { n: 100, lambda: 32, runs: 60, expected: 56.8500958 },
  ])('OneMax, n = $n, lambda = $lambda', (one) => {
    expectWithin(generations(one, zeros), one.expected)
  })

  // The free bits behind the leading ones are not independent of selection: a chain that takes them so is up to
  // 24 % off at n = 20, lambda = 64.
  test.each<Case>([
    { n: 20, lambda: 2, runs: 300, expected: 172.32157548 },
    { n: 20, lambda: 4, runs: 300, expected: 88.50988689 },
    { n: 20, lambda: 8, runs: 600, expected: 46.6651798 },
    { n: 20, lambda: 16, runs: 300, expected: 25.86137345 },
    { n: 20, lambda: 32, runs: 300, expected: 15.67732935 },
    { n: 20, lambda: 64, runs: 300, expected: 10.92310824 },
    { n: 50, lambda: 2, runs: 60, expected: 1075.45975676 },
    { n: 50, lambda: 4, runs: 60, expected: 543.8169801 },
    { n: 50, lambda: 8, runs: 60, expected: 278.06668644 },
    { n: 50, lambda: 16, runs: 80, expected: 145.33300262 },
    { n: 50, lambda: 32, runs: 60, expected: 79.245311 },
    { n: 50, lambda: 64, runs: 60, expected: 46.73816144 },
    { n: 100, lambda: 64, runs: 30, expected: 159.6794236 },
  ])('LeadingOnes, n = $n, lambda = $lambda', (one) => {
    expectWithin(generations(one, notLeading), one.expected)
  })
})
