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
    [4, 1.02937537300396, 0.491715236875],
    [5, 1.16296447364052, 0.447534069021],
    [6, 1.26720636061147, 0.415927108983],
    [7, 1.3521783756069, 0.391917776127],
    [8, 1.42360030604528, 0.372897143287],
    [10, 1.53875273083517, 0.344343823261],
    [15, 1.73591344494104, 0.301041570314],
    [20, 1.86747505979832, 0.275696615619],
    [30, 2.04276084417151, 0.245837899547],
  ])('tournament of %i', (size, intensity, variance) => {
    const rules = { size, distinct: true }
    const sample = selectedNormals(21000 + size, 40, 12000, 1, (values, s) =>
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
    [50, 2.24907362938985, 0.215712409964],
    [100, 2.50759363644168, 0.184404813586],
  ])('tournament of %i', (size, intensity, variance) => {
    const rules = { size, distinct: true }
    const sample = selectedNormals(21000 + size, 2 * size, 4000, 1, (values, s) =>
      tournament(values.length, rules, byRank, s),
    )
    expectMoments(sample, intensity, variance)
  })

  test.each([
    [0.05, 2.06271280751, 0.138076516533],
    [0.1, 1.75498331932, 0.169135169277],
    [0.15, 1.55439183502, 0.194889621385],
    [0.2, 1.39980960204, 0.218642562075],
    [0.25, 1.27110629074, 0.241636962162],
    [0.3, 1.15897538067, 0.264543350846],
    [0.4, 0.965856333742, 0.311818446769],
    [0.5, 0.797884560803, 0.363380227632],
    [0.6, 0.643904222495, 0.422256082787],
    [0.8, 0.34995240051, 0.583005946369],
    [0.9, 0.194998146592, 0.712075542783],
  ])('truncation to the best %d', (fraction, intensity, variance) => {
    // The wider the best, the wider their spread.
    const populations = fraction > 0.5 ? 500 : 300
    const sample = selectedNormals(21200 + 100 * fraction, 1000, populations, 40, (values, s) =>
      truncatedRank(values.length, fraction, s),
    )
    expectMoments(sample, intensity, variance)
  })

  test('truncation to the best hundredth', () => {
    // Of 10,000: among fewer the best hundredth is not yet that of the normal distribution.
    const sample = selectedNormals(21201, 10_000, 60, 100, (values, s) =>
      truncatedRank(values.length, 0.01, s),
    )
    expectMoments(sample, 2.66521422035, 0.0968485950314)
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

describe('who is never even drawn into a tournament: (1 - 1/N)^(t N)', () => {
  test.each([
    [2, 0.13397967],
    [3, 0.04904089],
    [5, 0.00657048],
    [7, 0.00088031],
  ])('a hundred tournaments of %i among a hundred', (size, expected) => {
    const shares: number[] = []
    for (let run = 0; run < 300; run++) {
      const s = stream(21900 + size, 'spare', 0, 0, run)
      const seen = new Set<number>()
      for (let k = 0; k < 100; k++) {
        const compare = (a: number, b: number) => {
          seen.add(a).add(b)
          return a - b
        }
        tournament(100, { size, distinct: false }, compare, s)
      }
      shares.push(1 - seen.size / 100)
    }
    const { mean, band } = estimateOf(shares)
    expect(Math.abs(mean - expected)).toBeLessThan(band)
    expect(band).toBeLessThan(0.01)
  })
})

/** Children are copies of one parent: only the choice of parents is left. */
const copying: Settings = { crossoverChance: 0, mutationChance: 0, elites: 0 }

describe('share of a generation never selected, through `generational`', () => {
  // (1/N) sum over ranks of (1 - p)^N. The "loss of diversity" of Blickle and Thiele (0.25 for t = 2) is another
  // quantity: Motoki, Calculating the expected loss of diversity of selection schemes, 2002.
  test.each([
    [1, 50, 0.36416968],
    [2, 50, 0.42904453],
    [3, 50, 0.50162025],
    [5, 50, 0.60397233],
    [7, 50, 0.66932287],
    [10, 50, 0.73211413],
    [2, 10, 0.41477937],
    [5, 10, 0.59466448],
    [1, 100, 0.36603234],
    [2, 100, 0.43070212],
    [10, 100, 0.73270269],
    [3, 200, 0.50367417],
    [2, 1000, 0.43217056],
  ])('tournament of %i, %i members', (size, population, expected) => {
    const shares: number[] = []
    for (let run = 0; run < Math.max(20, 10_000 / population); run++) {
      const { machine, steps } = drive({
        method: generational,
        population,
        settings: { ...copying, tournament: size },
        variation: labels(),
        score: (genome) => [labelOf(genome)],
        seed: 22000 + run,
      })
      steps(2 * population)
      const chosen = new Set(machine.members().map((member) => labelOf(member.genome)))
      shares.push(1 - chosen.size / population)
    }
    const { mean, band } = estimateOf(shares)
    expect(Math.abs(mean - expected)).toBeLessThan(band)
    expect(band).toBeLessThan(0.02)
  })
})

describe('takeover by the best of a population, through `generational`', () => {
  interface Takeover {
    readonly population: number
    readonly size: number
    readonly elites: number
    readonly expected: number
    readonly chance: number
    /** Standard deviation of the time. */
    readonly sd: number
  }
  test.each<Takeover>([
    { population: 20, size: 2, elites: 0, expected: 6.635857, chance: 0.806572, sd: 1.565096 },
    { population: 20, size: 2, elites: 1, expected: 5.772339, chance: 1, sd: 1.158294 },
    { population: 50, size: 2, elites: 0, expected: 8.378598, chance: 0.800701, sd: 1.534427 },
    { population: 50, size: 2, elites: 1, expected: 7.477125, chance: 1, sd: 1.119335 },
    { population: 100, size: 2, elites: 0, expected: 9.627801, chance: 0.798754, sd: 1.511961 },
    { population: 100, size: 2, elites: 1, expected: 8.714837, chance: 1, sd: 1.089701 },
    { population: 100, size: 3, elites: 0, expected: 6.324553, chance: 0.941346, sd: 0.827029 },
    { population: 100, size: 3, elites: 1, expected: 5.912883, chance: 1, sd: 0.6524 },
    { population: 100, size: 5, elites: 0, expected: 4.407663, chance: 0.993195, sd: 0.529327 },
    { population: 100, size: 5, elites: 1, expected: 4.227573, chance: 1, sd: 0.428167 },
    { population: 100, size: 10, elites: 0, expected: 3.0817, chance: 0.999957, sd: 0.274048 },
    { population: 100, size: 10, elites: 1, expected: 3.04199, chance: 1, sd: 0.200577 },
    { population: 200, size: 2, elites: 0, expected: 10.835628, chance: 0.797782, sd: 1.494807 },
    { population: 200, size: 2, elites: 1, expected: 9.917325, chance: 1, sd: 1.06634 },
    { population: 1000, size: 3, elites: 0, expected: 8.777051, chance: 0.940567, sd: 0.80775 },
    { population: 1000, size: 5, elites: 1, expected: 6.006089, chance: 1, sd: 0.304016 },
  ])(
    'of $population, tournament of $size, elites $elites',
    ({ population, size, elites, expected, chance, sd }) => {
      const runs = Math.min(300, Math.round(20_000 / population))
      const times: number[] = []
      for (let run = 0; run < runs; run++) {
        const { machine, steps } = drive({
          method: generational,
          population,
          settings: { ...copying, tournament: size, elites },
          variation: labels(),
          score: (genome) => [labelOf(genome) === 0 ? 0 : 1],
          seed: 23000 + 1000 * size + run,
        })
        steps(population)
        const bests = () => machine.members().filter((member) => member.score[0] === 0).length
        let generation = 0
        for (; bests() > 0 && bests() < population; generation++) steps(population - elites)
        if (bests() === population) times.push(generation)
      }
      const { mean } = estimateOf(times)
      expect(Math.abs(mean - expected)).toBeLessThan((4 * sd) / Math.sqrt(times.length))
      expect(Math.abs(times.length / runs - chance)).toBeLessThanOrEqual(shareBand(chance, runs))
    },
  )
})
