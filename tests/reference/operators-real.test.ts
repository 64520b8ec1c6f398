// Simulated binary crossover and polynomial mutation against their published distributions; Gaussian mutation
// against what it promises. SBX: Deb and Agrawal, Simulated binary crossover for continuous search space, 1995;
// polynomial mutation: Deb and Goyal, GeneAS, 1996. The formulas are from memory; moments, quantiles and the
// values of the bounded forms were recomputed from them with other code.

import { describe, expect, test } from 'vitest'
import {
  lowerChild,
  polynomialDeviation,
  reflect,
  spreadFactor,
  upperChild,
} from '../../coordinator/evolution/operators/real.js'
import { crossoverRows, mutationRows, rowOf } from '../../coordinator/evolution/operators/tables.js'
import { real } from '../../shared/encodings.js'
import { type Stream, stream } from '../../shared/streams.js'

const draws = (use: number): Stream => stream(20261201, 'spare', 2, use)
/** Kolmogorov-Smirnov: D sqrt(n) stays below this with chance 0.999 (recomputed). */
const kolmogorov = 1.949474603504375

function expectDistribution(sample: Float64Array, cdf: (x: number) => number): void {
  const sorted = sample.slice().sort()
  let most = 0
  sorted.forEach((x, i) => {
    most = Math.max(most, cdf(x) - i / sorted.length, (i + 1) / sorted.length - cdf(x))
  })
  expect(most * Math.sqrt(sorted.length)).toBeLessThan(kolmogorov)
}

/** The mean of a sample within 4 standard errors, estimated from the sample. */
function expectMean(sample: Float64Array, mean: number): void {
  const found = sample.reduce((sum, x) => sum + x, 0) / sample.length
  const variance = sample.reduce((sum, x) => sum + (x - found) ** 2, 0) / (sample.length - 1)
  expect(Math.abs(found - mean)).toBeLessThan(4 * Math.sqrt(variance / sample.length))
}

describe('the spread factor of SBX', () => {
  // eta, P(<= 0.9), P(<= 1.1), P(<= 1.5), mean, variance, at u = 0.25, at u = 0.9, 1 % and 99 % points
  // biome-ignore format: a table
  const rows = [
    [2, 0.3645, 0.6243425995, 0.8518518519, 1.125, 0.534375, 0.793700525984, 1.709975946677, 0.27144176, 3.6840315],
    [5, 0.2657205, 0.717763035, 0.9561042524, 1.0285714286, 0.0670408163, 0.890898718140, 1.307660486012, 0.52100073, 1.9193831],
    [10, 0.156905298, 0.8247530503, 0.99421949, 1.0083333333, 0.0174519231, 0.938930910662, 1.157557911771, 0.70072592, 1.4270915],
    [15, 0.0926510094, 0.8911854321, 0.9992387806, 1.0039215686, 0.0080144999, 0.957603280699, 1.105823017030, 0.78309486, 1.2769845],
    [20, 0.0547094946, 0.9324347145, 0.9998997571, 1.0022727273, 0.0046026982, 0.967531778524, 1.079653223897, 0.8300355, 1.20476775],
    [30, 0.0190760212, 0.9739506576, 0.9999982616, 1.0010416667, 0.0020953099, 0.977888536335, 1.053288686727, 0.88144357, 1.13450257],
  ] as const
  for (const [eta, below9, below11, below15, mean, variance, quarter, nine, first, last] of rows) {
    test(`eta = ${eta}: quantiles`, () => {
      const beta = (u: number): number => spreadFactor(u, eta, Infinity)
      expect(beta(0.25)).toBeCloseTo(quarter, 11)
      expect(beta(0.9)).toBeCloseTo(nine, 11)
      expect(beta(0.01)).toBeCloseTo(first, 7)
      expect(beta(0.99)).toBeCloseTo(last, 7)
      expect(beta(0.5)).toBe(1)
      // The density at 1.5 is as low as 1e-5 for eta = 30: there compare tail probabilities, not places.
      const cdf = (x: number): number => (x <= 1 ? 0.5 * x ** (eta + 1) : 1 - 0.5 * x ** -(eta + 1))
      for (const [x, p] of [
        [0.9, below9],
        [1.1, below11],
        [1.5, below15],
      ] as const) {
        expect(cdf(x)).toBeCloseTo(p, 9)
        expect(beta(cdf(x))).toBeCloseTo(x, 7)
      }
    })

    test(`eta = ${eta}: the operator's children spread like it, on both sides alike`, () => {
      const bounds = { low: -1e6, high: 1e6 }
      const settings = { distributionIndex: eta, exchange: 1 }
      const cross = rowOf(crossoverRows, 'sbx').build(real(bounds), settings)
      const random = draws(eta)
      const trials = 10_000
      // Parents at +-1/2: children at +-beta/2.
      const children = Float64Array.from(
        { length: trials },
        () => cross(Float64Array.of(-0.5), Float64Array.of(0.5), random)[0]!,
      )
      const betas = children.map((x) => 2 * Math.abs(x))
      expectDistribution(betas, (x) => (x <= 1 ? 0.5 * x ** (eta + 1) : 1 - 0.5 * x ** -(eta + 1)))
      expectMean(betas, mean)
      expectMean(
        betas.map((x) => Math.abs(x - 1)),
        0.5 * (1 / (eta + 2) + 1 / eta),
      )
      // The squared deviation has a variance only where the fourth moment exists, for eta > 3.
      if (eta > 3)
        expectMean(
          betas.map((x) => (x - mean) ** 2),
          variance,
        )
      const upper = children.filter((x) => x > 0).length
      expect(Math.abs(upper - trials / 2)).toBeLessThan(4 * Math.sqrt(trials / 4))
    })
  }

  test('the two children have the sum of their parents', () => {
    const random = draws(100)
    for (let trial = 0; trial < 2_000; trial++) {
      const y1 = random.normal()
      const y2 = y1 + random.uniform()
      const u = random.uniform()
      const sum = lowerChild(y1, y2, -Infinity, 15, u) + upperChild(y1, y2, Infinity, 15, u)
      expect(Math.abs(sum - (y1 + y2))).toBeLessThan(1e-14)
    }
  })

  test('the bounded form: parents 0.2 and 0.6 in [0, 1], eta = 15', () => {
    const values = [
      [0.1, 0.21913931836096073, 0.5808607677491855],
      [0.5, 0.20000009536777275, 0.5999999998548089],
      [0.9, 0.1788363456948409, 0.6211646019610464],
    ] as const
    for (const [u, c1, c2] of values) {
      expect(lowerChild(0.2, 0.6, 0, 15, u)).toBeCloseTo(c1, 14)
      expect(upperChild(0.2, 0.6, 1, 15, u)).toBeCloseTo(c2, 14)
    }
  })

  test('each gene is crossed with the chance of the setting, the others are the first parent’s', () => {
    const length = 20_000
    const first = new Float64Array(length).fill(0.25)
    const second = new Float64Array(length).fill(0.5)
    for (const exchange of [0, 0.5, 1]) {
      const settings = { distributionIndex: 20, exchange }
      const cross = rowOf(crossoverRows, 'sbx').build(real({ low: 0, high: 1, length }), settings)
      const crossed = cross(first, second, draws(101)).filter((x) => x !== 0.25).length
      const band = 4 * Math.sqrt(length * exchange * (1 - exchange))
      expect(Math.abs(crossed - length * exchange)).toBeLessThanOrEqual(band)
    }
  })
})

describe('polynomial mutation', () => {
  const deviations = (eta: number, use: number): Float64Array => {
    const random = draws(use)
    return Float64Array.from({ length: 10_000 }, () => polynomialDeviation(random.uniform(), eta, 1, 1))
  }
  for (const [eta, size, sd] of [
    [5, 0.1428571429, 0.1889822365046136],
    [20, 0.0454545455, 0.06286946134619315],
    [100, 0.0098039216, 0.013797369644231547],
  ] as const) {
    test(`eta = ${eta}: sizes and spread of the deviation`, () => {
      const sample = deviations(eta, 110 + eta)
      expectMean(sample, 0)
      expectMean(sample.map(Math.abs), size)
      expectMean(
        sample.map((x) => x * x),
        sd * sd,
      )
      expectDistribution(sample.map(Math.abs), (x) => 1 - (1 - x) ** (eta + 1))
    })
  }
  test('eta = 20: values', () => {
    expect(polynomialDeviation(0.1, 20, 1, 1)).toBeCloseTo(-0.07377667396743226, 14)
    expect(1 - 0.9 ** 21).toBeCloseTo(0.8905810108684876, 14)
    const at = (u: number): number => polynomialDeviation(u, 20, 1, 1)
    // P(|delta| < 0.1) is the difference of the u at which delta is +-0.1.
    expect(at(0.5 + 0.8905810108684876 / 2)).toBeCloseTo(0.1, 13)
    expect(at(0.5 - 0.8905810108684876 / 2)).toBeCloseTo(-0.1, 13)
  })
  test('the bounded form in [0, 1], eta = 20', () => {
    const us = [0.1, 0.3, 0.7, 0.95]
    const rows = [
      [0.05, 0.014923992851998039, 0.03552389749283942, 0.07403156053258815, 0.15384949805339526],
      [0.5, 0.4262234101577673, 0.47596845424131495, 0.524031545758685, 0.6038493149175445],
      [0.98, 0.9062233260325677, 0.9559684394674118, 0.9870628163748504, 0.9975938849599723],
    ]
    for (const [y, ...values] of rows) {
      us.forEach((u, i) => {
        expect(y! + polynomialDeviation(u, 20, y!, 1 - y!)).toBeCloseTo(values[i]!, 14)
      })
    }
  })
  test('the operator moves genes by the deviation times the range, each with the chance of the setting', () => {
    const length = 10_000
    const settings = { changes: length / 4, distributionIndex: 20 }
    const mutate = rowOf(mutationRows, 'polynomial').build(real({ low: -3, high: 7, length }), settings)
    const middle = new Float64Array(length).fill(2)
    const changed = Float64Array.from(mutate(middle, draws(120))).filter((x) => x !== 2)
    expect(Math.abs(changed.length - length / 4)).toBeLessThan(4 * Math.sqrt((length * 3) / 16))
    // In the middle the bounds cut off 2^-21 of each side: nothing at this sample size.
    expectDistribution(
      changed.map((x) => Math.abs(x - 2) / 10),
      (x) => 1 - (1 - x) ** 21,
    )
  })
})

describe('Gaussian mutation', () => {
  test('a step from the middle has the standard deviation of the setting', () => {
    const mutate = rowOf(mutationRows, 'gaussian').build(real({ low: -3, high: 7 }), {
      changes: 1,
      sigma: 0.05,
    })
    const random = draws(130)
    const steps = Float64Array.from({ length: 10_000 }, () => mutate(Float64Array.of(2), random)[0]! - 2)
    expectMean(steps, 0)
    expectMean(
      steps.map((x) => x * x),
      0.25,
    )
  })
  test('without selection all values stay equally likely', () => {
    for (const sigma of [0.1, 0.7]) {
      const length = 10_000
      const random = draws(131)
      const mutate = rowOf(mutationRows, 'gaussian').build(real({ low: 0, high: 1, length }), {
        changes: length,
        sigma,
      })
      let value = Float64Array.from({ length }, () => random.uniform())
      for (let step = 0; step < 20; step++) value = mutate(value, random) as typeof value
      expectDistribution(value, (x) => x)
    }
  })
  test('folding at the bounds', () => {
    const examples = [
      [0.25, 0.25],
      [0, 0],
      [1, 1],
      [-0.25, 0.25],
      [1.25, 0.75],
      [2.25, 0.25],
      [-1.25, 0.75],
      [7.5, 0.5],
    ]
    for (const [x, folded] of examples) expect(reflect(x!)).toBe(folded)
  })
})

describe('logarithmic scale', () => {
  test('operators do to the logarithms what they do to numbers on a linear scale', () => {
    const length = 200
    const random = draws(140)
    const logs = () => Float64Array.from({ length }, () => random.uniform() * Math.log(1e4))
    const a = logs()
    const b = logs()
    const logarithmic = real({ low: 1, high: 1e4, length, scale: 'log' })
    const linear = real({ low: 0, high: Math.log(1e4), length })
    const cross = { distributionIndex: 5, exchange: 0.5 }
    const sbx = rowOf(crossoverRows, 'sbx')
    const child = sbx.build(logarithmic, cross)(a.map(Math.exp), b.map(Math.exp), draws(141))
    const expected = sbx.build(linear, cross)(a, b, draws(141))
    for (let i = 0; i < length; i++) expect(Math.log(child[i]!)).toBeCloseTo(expected[i]!, 11)
    for (const [name, settings] of [
      ['polynomial', { changes: length, distributionIndex: 5 }],
      ['gaussian', { changes: length, sigma: 0.3 }],
    ] as const) {
      const row = rowOf(mutationRows, name)
      const mutant = row.build(logarithmic, settings)(a.map(Math.exp), draws(142))
      const wanted = row.build(linear, settings)(a, draws(142))
      for (let i = 0; i < length; i++) expect(Math.log(mutant[i]!)).toBeCloseTo(wanted[i]!, 11)
    }
  })
})
