// Random numbers against published vectors, exact conversions and distributions.
//
// Statistical checks: seeds chosen beforehand; chi-square between its 0.001 and 0.9999 quantiles, D sqrt(n) of
// Kolmogorov and Smirnov below its 0.999 quantile; means within 4 standard errors.

import { describe, expect, test } from 'vitest'
import { philox4x32, type Stream, stream, streamAt } from '../../shared/streams.js'

const seed = 20_261_201
const pi = { counter: [0x243f6a88, 0x85a308d3, 0x13198a2e, 0x03707344], key: [0xa4093822, 0x299f31d0] }
const ones = { counter: [0xffffffff, 0xffffffff, 0xffffffff, 0xffffffff], key: [0xffffffff, 0xffffffff] }
const zeros = { counter: [0, 0, 0, 0], key: [0, 0] }

// Source: Salmon, Moraes, Dror, Shaw: Parallel random numbers: as easy as 1, 2, 3. SC'11, 2011; known-answer
// vectors of the authors' library (kat_vectors). Words in order of the array. The counter 1 row was recomputed
// independently: it catches an increment of the wrong word, which the three published vectors cannot.
describe('Philox4x32: known answers', () => {
  test.each([
    [10, 'zeros', zeros, '6627e8d5 e169c58d bc57ac4c 9b00dbd8'],
    [10, 'ones', ones, '408f276d 41c83b0e a20bc7c6 6d5451fd'],
    [10, 'digits of pi', pi, 'd16cfe09 94fdcceb 5001e420 24126ea1'],
    [7, 'zeros', zeros, '5f6fb709 0d893f64 4f121f81 4f730a48'],
    [7, 'ones', ones, '5207ddc2 45165e59 4d8ee751 8c52f662'],
    [7, 'digits of pi', pi, '4dfccaba 190a87f0 c47362ba b6b5242a'],
    [10, 'counter 1', { counter: [1, 0, 0, 0], key: [0, 0] }, 'f8e4cca4 5cb200db b1a574eb 097eff67'],
  ])('%i rounds of %s', (rounds, _, { counter, key }, expected) => {
    const out = new Uint32Array(4)
    philox4x32(counter, key, out, rounds)
    expect(Array.from(out, (word) => word.toString(16).padStart(8, '0')).join(' ')).toBe(expected)
  })

  test('a stream goes on to the next counter after four words', () => {
    const s = streamAt([0, 0, 0, 0], [0, 0])
    for (let i = 0; i < 4; i++) s.word()
    expect(s.word()).toBe(0xf8e4cca4)
  })
})

describe('conversions', () => {
  // Source: exact rationals ((w0 >>> 5) 2^26 + (w1 >>> 6)) / 2^53 of the published words, recomputed.
  test('uniform numbers of the zeros block are exact', () => {
    const s = streamAt(zeros.counter, zeros.key)
    expect(s.uniform()).toBe(0.39904647231489565)
    expect(s.uniform()).toBe(0.7357127860596914)
  })

  // Source: Box and Muller, 1958, with u = (word + 1/2) / 2^32, evaluated with 40 digits.
  test.each([
    [zeros, [0.9911376799303858, -0.924662587665535, -0.6176089594591906, -0.4820685874871797]],
    [pi, [-0.5514679005084955, -0.31224911325755605, 0.9654671460605665, 1.1806735951306468]],
  ])('normal numbers come as cosine, then sine', ({ counter, key }, expected) => {
    const s = streamAt(counter, key)
    for (const value of expected) expect(Math.abs(s.normal() - value)).toBeLessThan(1e-14)
  })

  // Recorded here once; equal bits on every machine are what searches depend on.
  test('the bits of normal numbers never change', () => {
    const s = streamAt(zeros.counter, zeros.key)
    const view = new DataView(new ArrayBuffer(8))
    const bits = Array.from({ length: 4 }, () => {
      view.setFloat64(0, s.normal())
      return view.getBigUint64(0).toString(16)
    })
    expect(bits).toEqual(['3fefb7665e244c5e', 'bfed96d5febb766f', 'bfe3c373dd530086', 'bfdeda36346bed2b'])
  })
})

/** Sum of (found - expected)^2 / expected over cells of equal expectation. */
function chiSquare(counts: ArrayLike<number>, expected: (cell: number) => number): number {
  let sum = 0
  for (let i = 0; i < counts.length; i++) sum += (counts[i]! - expected(i)) ** 2 / expected(i)
  return sum
}

/** Counts of `draws` values of `draw`, each a cell number. */
function count(cells: number, draws: number, draw: () => number): Float64Array {
  const counts = new Float64Array(cells)
  for (let i = 0; i < draws; i++) counts[draw()]!++
  return counts
}

/** Quantiles 0.001 and 0.9999 of chi-square by degrees of freedom; recomputed by quadrature. */
const acceptance: { readonly [degrees: number]: readonly [number, number] } = {
  9: [1.15195, 33.7199],
  99: [61.1365, 160.0557],
  255: [190.867, 347.6542],
}
function expectUniform(counts: Float64Array, draws: number): void {
  const [low, high] = acceptance[counts.length - 1]!
  const found = chiSquare(counts, () => draws / counts.length)
  expect(found).toBeGreaterThan(low)
  expect(found).toBeLessThan(high)
}

/** D sqrt(n) of Kolmogorov and Smirnov for a sample against its distribution function. */
function kolmogorov(sample: Float64Array, distribution: (x: number) => number): number {
  const n = sample.length
  let most = 0
  sample.sort().forEach((x, i) => {
    const p = distribution(x)
    most = Math.max(most, (i + 1) / n - p, p - i / n)
  })
  return most * Math.sqrt(n)
}

/** Distribution function of the standard normal: series of Marsaglia (Evaluating the normal distribution, 2004). */
function normalDistribution(x: number): number {
  let sum = x
  let term = x
  for (let k = 3; Math.abs(term) > 1e-17 * Math.abs(sum); k += 2) {
    term *= (x * x) / k
    sum += term
  }
  return 0.5 + sum * Math.exp(-0.5 * x * x - 0.9189385332046728)
}

describe('distributions', () => {
  const n = 200_000

  test('every byte of a word is uniform', () => {
    const s = stream(seed, 'spare', 10)
    for (const shift of [0, 8, 16, 24])
      expectUniform(
        count(256, n, () => (s.word() >>> shift) & 255),
        n,
      )
  })

  test('first words of neighbouring streams are uniform: ids make independent streams', () => {
    let id = 0
    expectUniform(
      count(256, n, () => stream(seed, 'birth', 1, id++).word() >>> 24),
      n,
    )
    expectUniform(
      count(256, n, () => stream(seed, 'birth', 1, id++).word() & 255),
      n,
    )
    expectUniform(
      count(256, n / 10, () => stream(id++, 'birth', 1, 1).word() & 255),
      n / 10,
    )
  })

  test('first words of neighbouring streams are uncorrelated', () => {
    let sum = 0
    for (let id = 0; id < n; id++) {
      const a = stream(seed, 'birth', 2, id).uniform()
      const b = stream(seed, 'birth', 2, id + 1).uniform()
      sum += (a - 0.5) * (b - 0.5)
    }
    // Mean 0, variance 1/144 a term; neighbouring terms are uncorrelated.
    expect(Math.abs(sum / n)).toBeLessThan((4 / 12) * Math.sqrt(1 / n))
  })

  test('uniform numbers pass chi-square and Kolmogorov-Smirnov', () => {
    const s = stream(seed, 'spare', 11)
    expectUniform(
      count(100, n, () => Math.floor(s.uniform() * 100)),
      n,
    )
    const sample = Float64Array.from({ length: n }, () => s.uniform())
    expect(kolmogorov(sample, (x) => x)).toBeLessThan(1.949474603504375)
    expect(sample.every((x) => x >= 0 && x < 1)).toBe(true)
  })

  test('normal numbers pass Kolmogorov-Smirnov and have their moments, in both of a pair', () => {
    const s = stream(seed, 'spare', 12)
    const cosines = new Float64Array(n / 2)
    const sines = new Float64Array(n / 2)
    let product = 0
    for (let i = 0; i < n / 2; i++) {
      cosines[i] = s.normal()
      sines[i] = s.normal()
      product += cosines[i]! * sines[i]!
    }
    expect(Math.abs(product / (n / 2))).toBeLessThan(4 / Math.sqrt(n / 2))
    for (const sample of [cosines, sines]) {
      const mean = sample.reduce((sum, x) => sum + x, 0) / sample.length
      const square = sample.reduce((sum, x) => sum + x * x, 0) / sample.length
      expect(Math.abs(mean)).toBeLessThan(4 / Math.sqrt(sample.length))
      expect(Math.abs(square - 1)).toBeLessThan(4 * Math.sqrt(2 / sample.length))
      expect(kolmogorov(sample, normalDistribution)).toBeLessThan(1.949474603504375)
    }
  })
})

describe('bounded integers', () => {
  const n = 200_000

  test.each([10, 100, 256])('below(%i) is uniform', (bound) => {
    const s = stream(seed, 'spare', 13, bound)
    expectUniform(
      count(bound, n, () => s.below(bound)),
      n,
    )
  })

  // Without rejection the lower half of the results would come up twice as often as the upper third.
  test('below() is unbiased where multiplying without rejection is visibly not', () => {
    const bound = 3 * 2 ** 30
    const s = stream(seed, 'spare', 14)
    expectUniform(
      count(10, n, () => Math.floor((s.below(bound) * 10) / bound)),
      n,
    )
    // Three neighbours share four words: without rejection one of them is drawn twice as often.
    const byRest = count(3, n, () => s.below(bound) % 3)
    for (const found of byRest) expect(Math.abs(found - n / 3)).toBeLessThan(4 * Math.sqrt((n * 2) / 9))
  })

  test('below() of a power of two is the upper bits, of 1 is 0, of 2^32 is the word', () => {
    const words = stream(seed, 'spare', 15)
    const other = stream(seed, 'spare', 15)
    for (let i = 0; i < 1000; i++) {
      const bits = i % 33
      expect(other.below(2 ** bits)).toBe(Math.floor(words.word() / 2 ** (32 - bits)))
    }
  })

  test('chance() is a ratio of integers, exact at its ends', () => {
    const s = stream(seed, 'spare', 16)
    let hits = 0
    for (let i = 0; i < n; i++) hits += s.chance(1, 3) ? 1 : 0
    expect(Math.abs(hits - n / 3)).toBeLessThan(4 * Math.sqrt((n * 2) / 9))
    for (let i = 0; i < 1000; i++) {
      expect(s.chance(0, 7)).toBe(false)
      expect(s.chance(7, 7)).toBe(true)
    }
  })
})

describe('permutations and weights', () => {
  test('all 24 orders of four are equally likely', () => {
    const n = 240_000
    const s = stream(seed, 'spare', 17)
    const counts = new Map<string, number>()
    for (let i = 0; i < n; i++) {
      const order = s.permutation(4).join('')
      counts.set(order, (counts.get(order) ?? 0) + 1)
    }
    expect(counts.size).toBe(24)
    // Quantiles 0.001 and 0.9999 of chi-square with 23 degrees of freedom, by Wilson and Hilferty (The
    // distribution of chi-square, 1931): 7.4 and 54.9 or so; the band is a little wider.
    const found = chiSquare([...counts.values()], () => n / 24)
    expect(found).toBeGreaterThan(7)
    expect(found).toBeLessThan(58)
  })

  test('a permutation holds every number once, and each is equally often first and last', () => {
    const n = 20_000
    const s = stream(seed, 'spare', 18)
    const first = new Float64Array(100)
    const last = new Float64Array(100)
    for (let i = 0; i < n; i++) {
      const order = s.permutation(100)
      first[order[0]!]!++
      last[order[99]!]!++
      if (i % 100 === 0)
        expect([...order].sort((a, b) => a - b)).toEqual(Array.from({ length: 100 }, (_, k) => k))
    }
    expectUniform(first, n)
    expectUniform(last, n)
    expect(s.permutation(0)).toEqual(new Int32Array(0))
    expect([...s.permutation(1)]).toEqual([0])
  })

  function expectWeights(s: Stream, weights: readonly number[]): void {
    const n = 100_000
    const total = weights.reduce((sum, w) => sum + w, 0)
    const counts = count(weights.length, n, () => s.weighted(weights))
    weights.forEach((w, i) => {
      const p = w / total
      expect(Math.abs(counts[i]! - n * p)).toBeLessThanOrEqual(4 * Math.sqrt(n * p * (1 - p)))
    })
  }
  test('weights are probabilities, whatever their scale', () => {
    const s = stream(seed, 'spare', 19)
    expectWeights(s, [1, 2, 3, 4])
    expectWeights(s, [1e-300, 3e-300])
    expectWeights(s, [0, 1e300, 0, 2e300, 0])
    expectWeights(s, [7])
  })
})

test('the check itself can fail: a generator with a bias of one part in ten is caught', () => {
  const s = stream(seed, 'spare', 20)
  const n = 200_000
  const biased = count(256, n, () => (s.chance(1, 10) ? s.below(128) : s.below(256)))
  expect(chiSquare(biased, () => n / 256)).toBeGreaterThan(acceptance[255]![1])
})
