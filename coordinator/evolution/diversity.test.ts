import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { bits, choice, integer, layout, randomGenome, real } from '../../shared/encodings.js'
import type { Genome, GenomeSpec } from '../../shared/genome.js'
import { stream } from '../../shared/streams.js'
import { diversityMembersMost, diversityOf, quantiles } from './diversity.js'
import { distanceOf } from './operators/distance.js'

const spec: GenomeSpec = {
  lengths: real({ low: 0.1, high: 2, length: 3, scale: 'log', unit: 'm' }),
  phases: real({ low: -1, high: 1, length: 2 }),
  bays: integer({ low: 2, high: 9, length: 2 }),
  pads: choice({ options: ['none', 'rubber', 'brush'], length: 4 }),
  struts: bits({ length: 9 }),
  body: layout({ size: [2, 3], options: ['empty', 'soft'] }),
}
const population = (size: number, seed: number): Genome[] =>
  Array.from({ length: size }, (_, i) => randomGenome(spec, stream(seed, 'spare', 9, i)))

function meanOverPairs(part: string, genomes: readonly Genome[]): number {
  const distance = distanceOf(spec[part]!)
  let sum = 0
  let pairs = 0
  for (let i = 0; i < genomes.length; i++) {
    for (let j = i + 1; j < genomes.length; j++) {
      sum += distance(genomes[i]![part]!, genomes[j]![part]!)
      pairs++
    }
  }
  return sum / pairs
}

describe('diversity', () => {
  test('the mean distance of every part is that of visiting all pairs', () => {
    fc.assert(
      fc.property(fc.integer({ min: 2, max: 30 }), fc.nat(), (size, seed) => {
        const genomes = population(size, seed)
        const { parts, meanDistance } = diversityOf(spec, genomes)
        const names = Object.keys(spec)
        for (const name of names)
          expect(parts[name]!.meanDistance).toBeCloseTo(meanOverPairs(name, genomes), 12)
        const mean = names.reduce((sum, name) => sum + parts[name]!.meanDistance, 0) / names.length
        expect(meanDistance).toBeCloseTo(mean, 14)
      }),
      { seed: 61, numRuns: 40 },
    )
  })

  test('heterozygosity is 1 minus the sum of squared frequencies, for categorical parts only', () => {
    const genomes = [0, 1, 1, 2].map((pad, i) => ({
      ...population(1, i)[0]!,
      pads: Int32Array.of(pad, 0, 0, 0),
    }))
    const { parts } = diversityOf(spec, genomes)
    expect(parts.pads!.heterozygosity).toBeCloseTo((1 - (1 + 4 + 1) / 16) / 4, 14)
    expect(Object.keys(spec).filter((name) => parts[name]!.heterozygosity !== undefined)).toEqual([
      'pads',
      'struts',
      'body',
    ])
  })

  test('copies of one genome, one member or none have no diversity', () => {
    const one = population(1, 1)[0]!
    for (const genomes of [Array.from({ length: 7 }, () => one), [one], []]) {
      const { meanDistance, parts } = diversityOf(spec, genomes)
      expect(meanDistance).toBeCloseTo(0, 14)
      for (const part of Object.values(parts)) expect(part.heterozygosity ?? 0).toBeCloseTo(0, 14)
    }
  })

  test('a large population is judged by evenly spaced members, the first and the last among them', () => {
    const genomes = population(2 * diversityMembersMost - 1, 5)
    const spaced = genomes.filter((_, i) => i % 2 === 0)
    expect(spaced.length).toBe(diversityMembersMost)
    expect(diversityOf(spec, genomes)).toEqual(diversityOf(spec, spaced))
  })
})

describe('quantiles', () => {
  test('linear interpolation between order statistics (definition 7 of Hyndman and Fan, 1996)', () => {
    expect([...quantiles([4, 1, 3, 2], [0, 0.25, 0.5, 0.75, 1])]).toEqual([1, 1.75, 2.5, 3.25, 4])
    expect([...quantiles([7], [0, 0.3, 1])]).toEqual([7, 7, 7])
  })
  test('infinite scores of failed individuals do not make a quantile that is not a number', () => {
    expect([...quantiles([1, Infinity, Infinity, Infinity], [0, 0.1, 0.5, 0.9])]).toEqual([
      1,
      Infinity,
      Infinity,
      Infinity,
    ])
  })
  test('the column stays as it is', () => {
    const column = [3, 1, 2]
    quantiles(column, [0.5])
    expect(column).toEqual([3, 1, 2])
  })
})
