// Selection against theory: intensities and variances, finite rank distributions, the share never selected,
// takeover times. Sources: Blickle and Thiele, A comparison of selection schemes used in evolutionary algorithms,
// 1996 (intensity, variance, and that linear ranking from 0 equals binary tournament); Goldberg and Deb, A
// comparative analysis of selection schemes used in genetic algorithms, 1991 (takeover; their formula is up to 0.8
// generations short, so the exact chain is used). Numbers recomputed by quadrature and absorbing Markov chains.
// Seeds were chosen beforehand: 21000 and on; bands are four standard errors.

import { describe, expect, test } from 'vitest'
import { generational } from '../../coordinator/evolution/methods/generational.js'
import { linearRank, tournament, truncatedRank } from '../../coordinator/evolution/methods/selection.js'
import type { Settings } from '../../coordinator/evolution/types.js'
import { type Stream, stream } from '../../shared/streams.js'
import { chiSquare, drive, estimateOf, labelOf, labels, shareBand } from './drive.js'

/** What is drawn from a population of `size` standard normals, fresh every `draws` draws. */
function selectedNormals(
  seed: number,
  size: number,
  populations: number,
  draws: number,
  pick: (best: Float64Array, s: Stream) => number,
): number[] {
  const selected: number[] = []
  for (let p = 0; p < populations; p++) {
    const s = stream(seed, 'spare', 0, 0, p)
    const values = Float64Array.from({ length: size }, () => s.normal())
    // Largest first: rank 0 is the best.
    values.sort((a, b) => b - a)
    for (let k = 0; k < draws; k++) selected.push(values[pick(values, s)]!)
  }
  return selected
}

/** Mean and variance of a sample against theory, four standard errors each (of the variance: from the sample). */
function expectMoments(sample: readonly number[], intensity: number, variance: number): void {
  const { mean, band } = estimateOf(sample)
  expect(Math.abs(mean - intensity)).toBeLessThan(band)
  const squares = estimateOf(sample.map((x) => (x - mean) ** 2))
  expect(Math.abs(squares.mean - variance)).toBeLessThan(squares.band)
  expect(band).toBeLessThan(0.03)
}

const byRank = (a: number, b: number): number => a - b

describe('intensity and variance on a normal population', () => {
  // Without replacement the winner is the largest of t independent normals whatever the size of the population.
  test.each([
    [2, 0.564189583547756, 0.681690113816],
    [3, 0.846284375321634, 0.559467203797],
    [5, 1.16296447364052, 0.447534069021],
    [10, 1.53875273083517, 0.344343823261],
    [20, 1.86747505979832, 0.275696615619],
  ])('tournament of %i', (size, intensity, variance) => {
    const rules = { size, distinct: true }
    const sample = selectedNormals(21000 + size, 40, 20000, 1, (values, s) =>
      tournament(values.length, rules, byRank, s),
    )
    expectMoments(sample, intensity, variance)
  })

  test.each([
    [2, 0.564189583547756, 0.681690113816],
    [5, 1.16296447364052, 0.447534069021],
  ])('tournament of %i with replacement, in a large population', (size, intensity, variance) => {
    // 1,000 members: the same one is drawn twice in 0.1 % (t = 2) or 1 % (t = 5) of tournaments.
    const rules = { size, distinct: false }
    const sample = selectedNormals(21100 + size, 1000, 500, 40, (values, s) =>
      tournament(values.length, rules, byRank, s),
    )
    expectMoments(sample, intensity, variance)
  })

  test.each([
    [0.1, 1.75498331932, 0.169135169277],
    [0.5, 0.797884560803, 0.363380227632],
    [0.8, 0.34995240051, 0.583005946369],
  ])('truncation to the best %d', (fraction, intensity, variance) => {
    const sample = selectedNormals(21200 + 100 * fraction, 1000, 500, 40, (values, s) =>
      truncatedRank(values.length, fraction, s),
    )
    expectMoments(sample, intensity, variance)
  })

  test.each([1.2, 1.5, 2])('linear ranking with pressure %d', (pressure) => {
    // Intensity (1 - m) / sqrt(pi), variance 1 - (1 - m)^2 / pi, with m = 2 - pressure the worst's expectation.
    const sample = selectedNormals(21300 + 10 * pressure, 1000, 500, 40, (values, s) =>
      linearRank(values.length, pressure, s),
    )
    expectMoments(sample, (pressure - 1) / Math.sqrt(Math.PI), 1 - (pressure - 1) ** 2 / Math.PI)
  })
})

const members = 10
const draws = 40000
/** 0.9999 quantile of chi-square with 9 degrees of freedom. */
const chiSquareLimit = 33.7199

function rankCounts(seed: number, pick: (s: Stream) => number): number[] {
  const counts = new Array<number>(members).fill(0)
  for (let k = 0; k < draws; k++) counts[pick(stream(seed, 'spare', 0, 0, k))]!++
  return counts
}

function choose(n: number, k: number): number {
  let value = 1
  for (let i = 1; i <= k; i++) value = (value * (n - k + i)) / i
  return value
}

describe('distribution over the ranks of ten (chi-square; exact chances)', () => {
  test.each([1, 2, 3, 7])('tournament of %i with replacement: (r/N)^t - ((r-1)/N)^t', (size) => {
    const chances = Array.from({ length: members }, (_, best) => {
      const r = members - best
      return (r / members) ** size - ((r - 1) / members) ** size
    })
    const counts = rankCounts(21400 + size, (s) => tournament(members, { size, distinct: false }, byRank, s))
    // The last cells of large tournaments are rarer than once: they are counted together.
    const rare = chances.findIndex((chance) => chance * draws < 50)
    const cells = rare < 0 ? members : rare
    const pooled = (values: readonly number[]) => [
      ...values.slice(0, cells),
      ...(cells < members ? [values.slice(cells).reduce((sum, x) => sum + x, 0)] : []),
    ]
    const kept = pooled(chances).at(-1)! * draws < 1 ? cells : undefined
    expect(chiSquare(pooled(counts).slice(0, kept), pooled(chances).slice(0, kept))).toBeLessThan(
      chiSquareLimit,
    )
  })

  test.each([2, 3, 5])(
    'tournament of %i distinct: C(r-1, t-1) / C(N, t); the worst t - 1 never win',
    (size) => {
      const counts = rankCounts(21500 + size, (s) => tournament(members, { size, distinct: true }, byRank, s))
      const chances = counts.map((_, best) => choose(members - best - 1, size - 1) / choose(members, size))
      expect(counts.slice(members - size + 1).every((count) => count === 0)).toBe(true)
      const able = members - size + 1
      expect(chiSquare(counts.slice(0, able), chances.slice(0, able))).toBeLessThan(chiSquareLimit)
    },
  )

  test('linear ranking, ten members, best expected 1.5 times: 0.15 down to 0.05 in equal steps', () => {
    const counts = rankCounts(21600, (s) => linearRank(members, 1.5, s))
    const chances = counts.map((_, best) => 0.15 - (best * 0.1) / 9)
    expect(chiSquare(counts, chances)).toBeLessThan(chiSquareLimit)
  })

  test('who is left out is never drawn, the others as if it were not there', () => {
    const counts = rankCounts(21700, (s) => tournament(members, { size: 2, distinct: false }, byRank, s, 4))
    expect(counts[4]).toBe(0)
    counts.splice(4, 1)
    const chances = counts.map((_, best) => ((9 - best) / 9) ** 2 - ((8 - best) / 9) ** 2)
    expect(chiSquare(counts, chances)).toBeLessThan(chiSquareLimit)
  })

  test('equal contestants win evenly', () => {
    const counts = rankCounts(21800, (s) => tournament(members, { size: 3, distinct: false }, () => 0, s))
    expect(chiSquare(counts, new Array<number>(members).fill(0.1))).toBeLessThan(chiSquareLimit)
  })
})

/** Children are copies of one parent: only the choice of parents is left. */
const copying: Settings = { crossoverChance: 0, mutationChance: 0, elites: 0 }

describe('share of a generation never selected, through `generational`', () => {
  // (1/N) sum over ranks of (1 - p)^N. The "loss of diversity" of Blickle and Thiele (0.25 for t = 2) is another
  // quantity: Motoki, Calculating the expected loss of diversity of selection schemes, 2002.
  test.each([
    [1, 0.36416968],
    [2, 0.42904453],
    [3, 0.50162025],
    [5, 0.60397233],
  ])('tournament of %i, fifty members', (size, expected) => {
    const shares: number[] = []
    for (let run = 0; run < 200; run++) {
      const { machine, steps } = drive({
        method: generational,
        population: 50,
        settings: { ...copying, tournament: size },
        variation: labels(),
        score: (genome) => [labelOf(genome)],
        seed: 22000 + run,
      })
      steps(100)
      const chosen = new Set(machine.members().map((member) => labelOf(member.genome)))
      shares.push(1 - chosen.size / 50)
    }
    const { mean, band } = estimateOf(shares)
    expect(Math.abs(mean - expected)).toBeLessThan(band)
    expect(band).toBeLessThan(0.02)
  })
})

describe('takeover by the best of a hundred, through `generational`', () => {
  interface Takeover {
    readonly size: number
    readonly elites: number
    readonly expected: number
    readonly chance: number
  }
  test.each<Takeover>([
    { size: 2, elites: 0, expected: 9.627801, chance: 0.798754 },
    { size: 2, elites: 1, expected: 8.714837, chance: 1 },
    { size: 5, elites: 0, expected: 4.407663, chance: 0.993195 },
    { size: 5, elites: 1, expected: 4.227573, chance: 1 },
  ])('tournament of $size, elites $elites', ({ size, elites, expected, chance }) => {
    const runs = 400
    const times: number[] = []
    for (let run = 0; run < runs; run++) {
      const { machine, steps } = drive({
        method: generational,
        population: 100,
        settings: { ...copying, tournament: size, elites },
        variation: labels(),
        score: (genome) => [labelOf(genome) === 0 ? 0 : 1],
        seed: 23000 + 1000 * size + run,
      })
      steps(100)
      const bests = () => machine.members().filter((member) => member.score[0] === 0).length
      let generation = 0
      for (; bests() > 0 && bests() < 100; generation++) steps(100 - elites)
      if (bests() === 100) times.push(generation)
    }
    const { mean, band } = estimateOf(times)
    expect(Math.abs(mean - expected)).toBeLessThan(band)
    expect(Math.abs(times.length / runs - chance)).toBeLessThanOrEqual(shareBand(chance, runs))
  })
})
