// Runs of `one-plus-lambda` on bits until the best possible score, for the tests of runtime theory.

import { expect } from 'vitest'
import { onePlusLambda } from '../../coordinator/evolution/methods/one-plus-lambda.js'
import { mutationRows, rowOf } from '../../coordinator/evolution/operators/tables.js'
import { bits } from '../../shared/encodings.js'
import type { Genome } from '../../shared/genome.js'
import type { Stream } from '../../shared/streams.js'
import { bitStrings, bitsOf, drive, type Estimate, estimateOf, randomBits } from './drive.js'

export function zeros(genome: Genome): number {
  let ones = 0
  for (const bit of bitsOf(genome)) ones += bit
  return bitsOf(genome).length - ones
}
export function notLeading(genome: Genome): number {
  const first = bitsOf(genome).indexOf(0)
  return first < 0 ? 0 : bitsOf(genome).length - first
}

export interface Case {
  readonly n: number
  readonly runs: number
  readonly expected: number
  readonly lambda?: number
}

type Flips = (n: number) => (value: Uint8Array, draws: Stream) => void

/** The operators of the search itself, changing a copy in place as `bitStrings` wants it. */
function operator(name: string, settings: { readonly [name: string]: number }): Flips {
  return (n) => {
    const mutate = rowOf(mutationRows, name).build(bits({ length: n }), settings)
    return (value, draws) => value.set(mutate(value, draws) as Uint8Array)
  }
}
/** Each bit flips with chance c / n. */
export const flipping = (c: number): Flips => operator('bit-flip', { flips: c })
const standardBitMutation = flipping(1)
export const oneBitFlip = operator('one-bit', {})

/** Generations until the best possible score, over runs with seeds 31000, 31001, ... */
export function generations(
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
      variation: bitStrings(n, mutate(n), founder),
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

export function expectWithin({ mean, band }: Estimate, expected: number): void {
  // A band so wide that it could hold anything would be no test.
  expect(band).toBeLessThan(0.2 * expected)
  expect(Math.abs(mean - expected)).toBeLessThan(band)
}
