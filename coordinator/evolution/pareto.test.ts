import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import {
  crowdingDistance,
  dominates,
  frontRanks,
  hypervolume,
  nonDominatedFronts,
  type Point,
} from './pareto.js'

/** Few distinct values, so that ties and duplicates are common. */
function pointSets(objectives: number, most: number): fc.Arbitrary<number[][]> {
  const value = fc.oneof({ weight: 8, arbitrary: fc.integer({ min: 0, max: 6 }) }, fc.constant(Infinity))
  return fc.array(fc.array(value, { minLength: objectives, maxLength: objectives }), { maxLength: most })
}

/** Fronts by their definition: peel off what nothing left dominates. */
function frontsByPeeling(points: readonly Point[]): number[][] {
  let left = points.map((_, index) => index)
  const fronts: number[][] = []
  while (left.length > 0) {
    const front = left.filter((i) => !left.some((j) => dominates(points[j]!, points[i]!)))
    if (front.length === 0) throw new Error('among finitely many points some are not dominated')
    fronts.push(front)
    left = left.filter((i) => !front.includes(i))
  }
  return fronts
}

/** Volume by its definition on a grid of unit cubes: points and reference are small integers. */
function volumeByCounting(points: readonly Point[], reference: readonly number[]): number {
  let cells: number[][] = [[]]
  for (const edge of reference)
    cells = cells.flatMap((cell) => Array.from({ length: edge }, (_, k) => [...cell, k]))
  return cells.filter((cell) => points.some((point) => cell.every((low, m) => point[m]! <= low))).length
}

describe('dominance', () => {
  test('equal points do not dominate each other, infinite ones included', () => {
    expect(dominates([1, 2], [1, 2])).toBe(false)
    expect(dominates([Infinity, Infinity], [Infinity, Infinity])).toBe(false)
    expect(dominates([1, Infinity], [Infinity, Infinity])).toBe(true)
    expect(dominates([1, 3], [2, 2])).toBe(false)
  })
})

describe('fronts', () => {
  for (const objectives of [1, 2, 3, 4]) {
    test(`with ${objectives} objectives fronts are those of peeling`, () => {
      fc.assert(
        fc.property(pointSets(objectives, 40), (points) => {
          expect(nonDominatedFronts(points)).toEqual(frontsByPeeling(points))
        }),
        { seed: 41, numRuns: 300 },
      )
    })
  }
  test('no points have no fronts', () => {
    expect(nonDominatedFronts([])).toEqual([])
  })
  test('ranks are the numbers of the fronts', () => {
    expect([
      ...frontRanks([
        [2, 2],
        [1, 1],
        [3, 3],
        [1, 1],
      ]),
    ]).toEqual([1, 0, 2, 0])
  })
  test('a score that is not a number is a broken promise', () => {
    expect(() => nonDominatedFronts([[1, Number.NaN]])).toThrow('no score is NaN')
  })
})

describe('crowding', () => {
  test('fronts of one or two points are all ends', () => {
    expect([...crowdingDistance([[1, 1]], [0])]).toEqual([Infinity])
    expect([
      ...crowdingDistance(
        [
          [1, 1],
          [1, 1],
        ],
        [0, 1],
      ),
    ]).toEqual([Infinity, Infinity])
  })
  test('a front of duplicates is crowded everywhere', () => {
    const points = [
      [Infinity, Infinity],
      [Infinity, Infinity],
      [Infinity, Infinity],
    ]
    expect([...crowdingDistance(points, [0, 1, 2])]).toEqual([0, 0, 0])
  })
  test('an objective without a span adds nothing and has no ends', () => {
    const points = [
      [0, 5],
      [1, 5],
      [3, 5],
      [4, 5],
    ]
    expect([...crowdingDistance(points, [0, 1, 2, 3])]).toEqual([Infinity, 0.75, 0.75, Infinity])
  })
  test('among equal ends the lower index is the end', () => {
    const points = [
      [1, 4],
      [0, 5],
      [0, 5],
      [5, 0],
    ]
    expect([...crowdingDistance(points, [1, 2, 0, 3])]).toEqual([
      Infinity,
      Infinity,
      expect.any(Number),
      Infinity,
    ])
    expect([...crowdingDistance([[0], [0], [0], [1]], [0, 1, 2, 3])]).toEqual([Infinity, 0, 1, Infinity])
  })
  test('among infinite scores only the outer ones are ends', () => {
    const points = [[0], [1], [2], [Infinity], [Infinity], [Infinity]]
    const distance = crowdingDistance(points, [0, 1, 2, 3, 4, 5])
    expect([...distance]).toEqual([Infinity, 1, Infinity, Infinity, 0, Infinity])
  })
  test('infinite scores never make a distance that is not a number', () => {
    fc.assert(
      fc.property(pointSets(3, 30), (points) => {
        for (const front of nonDominatedFronts(points)) {
          for (const distance of crowdingDistance(points, front)) expect(distance >= 0).toBe(true)
        }
      }),
      { seed: 42, numRuns: 300 },
    )
  })
})

describe('hypervolume', () => {
  const references = [[6], [6, 5], [6, 5, 4], [4, 5, 4, 3], [3, 4, 3, 3, 4]]
  for (const reference of references) {
    test(`with ${reference.length} objectives it counts the dominated unit cubes`, () => {
      fc.assert(
        fc.property(pointSets(reference.length, 12), (points) => {
          expect(hypervolume(points, reference)).toBe(volumeByCounting(points, reference))
        }),
        { seed: 43, numRuns: 100 },
      )
    })
  }
  test('the sweep over three objectives agrees with the general method', () => {
    const coordinate = fc.double({ min: 0, max: 1, noNaN: true })
    fc.assert(
      fc.property(fc.array(fc.tuple(coordinate, coordinate, coordinate), { maxLength: 25 }), (points) => {
        // A fourth objective that is the same for all makes a volume of the same size by the general method.
        const lifted = points.map((point) => [...point, 0])
        expect(hypervolume(points, [1, 1, 1])).toBeCloseTo(hypervolume(lifted, [1, 1, 1, 1]), 12)
      }),
      { seed: 44, numRuns: 200 },
    )
  })
  test('no points dominate nothing', () => {
    expect(hypervolume([], [1, 1])).toBe(0)
  })
})
