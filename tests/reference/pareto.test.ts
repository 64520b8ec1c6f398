// Fronts, crowding and hypervolume against worked examples and against the closed forms of published test
// problems. Worked examples marked "recomputed" were computed by brute force or inclusion-exclusion in exact
// arithmetic with other code.

import { describe, expect, test } from 'vitest'
import { crowdingDistance, hypervolume, nonDominatedFronts } from '../../coordinator/evolution/pareto.js'

describe('sorting and crowding (Deb, Pratap, Agarwal, Meyarivan, NSGA-II, 2002); examples recomputed', () => {
  // biome-ignore format: a table
  const points = [[1, 9], [2, 7], [3, 8], [4, 5], [5, 6], [6, 3], [7, 4], [8, 2], [9, 1], [5, 9], [9, 9], [2, 7]]

  test('twelve points with a duplicate fall into four fronts', () => {
    const fronts = [[0, 1, 3, 5, 7, 8, 11], [2, 4, 6], [9], [10]]
    expect(nonDominatedFronts(points)).toEqual(fronts)
    // A constant third objective takes the other algorithm to the same fronts.
    expect(nonDominatedFronts(points.map((point) => [...point, 1]))).toEqual(fronts)
  })

  test('crowding distances of six points', () => {
    const front = [0, 1, 3, 5, 7, 8]
    expect([...crowdingDistance(points, front)]).toEqual([Infinity, 0.875, 1, 0.875, 0.625, Infinity])
  })

  test('the twelve solutions of the book example', () => {
    // Objective values of Deb, Multi-objective optimization using evolutionary algorithms, 2001 (from memory);
    // fronts recomputed for these numbers.
    // biome-ignore format: a table
    const book = [
      [0.31, 6.1], [0.43, 6.79], [0.22, 7.09], [0.59, 7.85], [0.66, 3.65], [0.83, 4.23],
      [0.21, 5.9], [0.79, 3.97], [0.51, 6.51], [0.27, 6.93], [0.58, 4.52], [0.24, 8.54],
    ]
    const numbered = nonDominatedFronts(book).map((front) => front.map((index) => index + 1))
    expect(numbered).toEqual([[5, 7, 11], [1, 3, 8, 10], [2, 6, 9, 12], [4]])
  })
})

describe('hypervolume; exact integers, recomputed by inclusion-exclusion', () => {
  const four = [
    [1, 5],
    [2, 3],
    [4, 2],
    [5, 1],
  ]
  // biome-ignore format: a table
  const permutations = [[1, 2, 3], [1, 3, 2], [2, 1, 3], [2, 3, 1], [3, 1, 2], [3, 2, 1]]
  const examples: [string, number[][], number[], number][] = [
    ['four points', four, [6, 6], 16],
    ['a dominated point adds nothing', [...four, [3, 4]], [6, 6], 16],
    [
      'a duplicate adds nothing',
      [
        [1, 5],
        [2, 3],
        [2, 3],
      ],
      [6, 6],
      13,
    ],
    [
      'a point outside the reference adds nothing',
      [
        [1, 5],
        [7, 0],
      ],
      [6, 6],
      5,
    ],
    [
      'three cyclic shifts',
      [
        [1, 2, 3],
        [2, 3, 1],
        [3, 1, 2],
      ],
      [4, 4, 4],
      13,
    ],
    ['six permutations', permutations, [4, 4, 4], 16],
    [
      'three corners',
      [
        [0, 0, 1],
        [0, 1, 0],
        [1, 0, 0],
      ],
      [2, 2, 2],
      7,
    ],
    [
      'four cyclic shifts',
      [
        [1, 2, 3, 4],
        [2, 3, 4, 1],
        [3, 4, 1, 2],
        [4, 1, 2, 3],
      ],
      [5, 5, 5, 5],
      71,
    ],
  ]
  for (const [name, points, reference, value] of examples) {
    test(name, () => expect(hypervolume(points, reference)).toBe(value))
  }
  test('eleven points on a line', () => {
    const points = Array.from({ length: 11 }, (_, i) => [i / 10, 1 - i / 10])
    expect(hypervolume(points, [1.1, 1.1])).toBeCloseTo(0.66, 14)
  })
  test('exclusive shares', () => {
    const shares = (points: number[][], reference: number[]): number[] =>
      points.map((_, k) => hypervolume(points, reference) - hypervolume(points.toSpliced(k, 1), reference))
    expect(shares(four, [6, 6])).toEqual([1, 4, 1, 1])
    expect(shares(permutations, [4, 4, 4])).toEqual([1, 1, 1, 1, 1, 1])
  })
})

// A falling curve f2 = g(f1), sampled at x0 < x1 < ...: the samples dominate less than the whole front, the corners
// (x_i, g(x_i+1)) dominate more. Both must close in on the closed form.
function bracket(
  segments: readonly (readonly [number, number])[],
  g: (x: number) => number,
  reference: number[],
) {
  const samples: number[][] = []
  const corners: number[][] = []
  const perSegment = 4_000
  for (const [from, to] of segments) {
    const at = (i: number): number => from + ((to - from) * i) / perSegment
    for (let i = 0; i <= perSegment; i++) samples.push([at(i), g(at(i))])
    for (let i = 0; i < perSegment; i++) corners.push([at(i), g(at(i + 1))])
  }
  return { low: hypervolume(samples, reference), high: hypervolume(corners, reference) }
}

describe('closed-form fronts of two objectives (Zitzler, Deb, Thiele, Comparison of MOEAs, 2000)', () => {
  // Volumes recomputed by quadrature for references (1, 1), (1.1, 1.1), (2, 2), (11, 11).
  const references = [1, 1.1, 2, 11]
  // Where x = sin^6(6 pi t) exp(-4 t) peaks, at t = atan(9 pi) / (6 pi), ZDT6 has its smallest f1.
  const peak = Math.atan(9 * Math.PI) / (6 * Math.PI)
  const least = 1 - Math.exp(-4 * peak) * Math.sin(6 * Math.PI * peak) ** 6
  // biome-ignore format: a table
  const zdt3: [number, number, number][] = [ // f1 from, to, f2 at the end
    [0, 0.08300153492691163, 0.6696523565498149],
    [0.18222872802939977, 0.2577623633878302, 0.2421610854767787],
    [0.4093136748086568, 0.4538821040888302, -0.12421844474858552],
    [0.6183967944392658, 0.6525117038046625, -0.4582633256726058],
    [0.8233317983266327, 0.8518328654364139, -0.7733690123266405],
  ]
  const g3 = (x: number): number => 1 - Math.sqrt(x) - x * Math.sin(10 * Math.PI * x)
  const fronts: [string, (readonly [number, number])[], (x: number) => number, number[]][] = [
    [
      'ZDT1 and ZDT4',
      [[0, 1]],
      (x) => 1 - Math.sqrt(x),
      [2 / 3, 0.8766666666666667, 3.6666666666666665, 120.66666666666667],
    ],
    ['ZDT2', [[0, 1]], (x) => 1 - x * x, [1 / 3, 0.5433333333333333, 3.3333333333333335, 120.33333333333333]],
    [
      'ZDT3',
      zdt3.map(([from, to]) => [from, to] as const),
      g3,
      [1.044426007424356, 1.3317629086570202, 4.817795019750997, 128.77811613069076],
    ],
    [
      'ZDT6',
      [[least, 1]],
      (x) => 1 - x * x,
      [0.32595504653612767, 0.5078775146545906, 3.045179727720758, 117.51820185838243],
    ],
  ]
  test('the least f1 of ZDT6', () => {
    expect(peak).toBeCloseTo(0.08145779687998356, 15)
    expect(least).toBeCloseTo(0.2807753188153697, 14)
  })
  test('the segments of ZDT3 end where the front says', () => {
    for (const [, to, f2] of zdt3) expect(g3(to)).toBeCloseTo(f2, 14)
  })
  for (const [name, segments, g, volumes] of fronts) {
    test(`${name}: sampled fronts enclose the closed form`, () => {
      references.forEach((r, k) => {
        const { low, high } = bracket(segments, g, [r, r])
        expect(low).toBeLessThanOrEqual(volumes[k]! + 1e-12)
        expect(high).toBeGreaterThanOrEqual(volumes[k]! - 1e-12)
        expect(high - low).toBeLessThan(1e-3)
      })
    })
  }
})

/** All vectors of `objectives` multiples of 1 / divisions with sum 1 (Das and Dennis, 1998). */
function simplexLattice(objectives: number, divisions: number): number[][] {
  const fill = (left: number, slots: number): number[][] =>
    slots === 1
      ? [[left]]
      : Array.from({ length: left + 1 }, (_, k) =>
          fill(left - k, slots - 1).map((rest) => [k, ...rest]),
        ).flat()
  return fill(divisions, objectives).map((counts) => counts.map((count) => count / divisions))
}

describe('closed-form fronts of more objectives (Deb, Thiele, Laumanns, Zitzler, Scalable test problems, 2005)', () => {
  const factorial = (n: number): number => (n < 2 ? 1 : n * factorial(n - 1))
  /** Volume of the positive part of the unit ball: pi^(M/2) / (2^M Gamma(M/2 + 1)), by its recurrence in M. */
  const ballPart = (m: number): number => (m === 0 ? 1 : m === 1 ? 1 : (ballPart(m - 2) * Math.PI) / (2 * m))
  const dtlz1 = (m: number, r: number): number => r ** m - 0.5 ** m / factorial(m)
  const dtlz2 = (m: number, r: number): number => r ** m - ballPart(m)

  test('the closed forms give the published values (recomputed)', () => {
    const one: [number, number, number][] = [
      [2, 0.5, 0.125],
      [2, 0.55, 0.1775],
      [2, 1, 0.875],
      [2, 1.1, 1.085],
      [3, 0.5, 0.10416666666666667],
      [3, 0.55, 0.14554166666666668],
      [3, 1, 0.9791666666666666],
      [3, 1.1, 1.3101666666666667],
      [5, 0.5, 0.030989583333333334],
      [5, 0.55, 0.05006802083333333],
      [5, 1, 0.9997395833333333],
      [5, 1.1, 1.6102495833333332],
    ]
    for (const [m, r, value] of one) expect(dtlz1(m, r)).toBeCloseTo(value, 14)
    const two: [number, number, number][] = [
      [2, 1, 0.2146018366025517],
      [2, 1.1, 0.4246018366025517],
      [3, 1, 0.47640122440170113],
      [3, 1.1, 0.8074012244017011],
      [4, 1, 0.6915748624659576],
      [4, 1.1, 1.1556748624659576],
      [5, 1, 0.8355065933151774],
      [5, 1.1, 1.4460165933151774],
      [10, 1, 0.9975096054298073],
      [10, 1.1, 2.5912520655298072],
    ]
    for (const [m, r, value] of two) expect(dtlz2(m, r)).toBeCloseTo(value, 14)
  })

  // Every point of the simplex lies within one lattice step, in every objective, of some lattice point: the lattice
  // dominates less than the front, the lattice moved down by a step dominates more.
  for (const [m, divisions] of [
    [2, 2_000],
    [3, 100],
    [4, 12],
    [5, 8],
  ] as const) {
    test(`DTLZ1 with ${m} objectives: a lattice encloses the closed form`, () => {
      const lattice = simplexLattice(m, divisions).map((point) => point.map((x) => x / 2))
      const step = 0.5 / divisions
      const lower = lattice.map((point) => point.map((x) => x - step))
      for (const r of [0.55, 1.1]) {
        const reference = Array.from({ length: m }, () => r)
        const low = hypervolume(lattice, reference)
        expect(low).toBeLessThan(dtlz1(m, r))
        expect(hypervolume(lower, reference)).toBeGreaterThan(dtlz1(m, r))
        // The simplex faces every axis: moved by a step it sweeps at most m steps times the face it shows.
        expect(dtlz1(m, r) - low).toBeLessThan((m * step * 0.5 ** (m - 1)) / factorial(m - 1))
      }
    })
  }

  for (const [m, divisions] of [
    [2, 2_000],
    [3, 100],
    [4, 12],
    [5, 8],
  ] as const) {
    test(`DTLZ2 with ${m} objectives: finer samples of the sphere close in on the closed form from below`, () => {
      const gap = (n: number): number => {
        const sphere = simplexLattice(m, n).map((point) => point.map(Math.sqrt))
        return (
          dtlz2(m, 1.1) -
          hypervolume(
            sphere,
            Array.from({ length: m }, () => 1.1),
          )
        )
      }
      const coarse = gap(divisions / 2)
      const fine = gap(divisions)
      expect(fine).toBeGreaterThan(0)
      expect(fine).toBeLessThan(0.7 * coarse)
    })
  }
})
