// From rows of simulations to a score: reductions, cases, directions, failures.

import { describe, expect, test } from 'vitest'
import type { Direction, Reduction } from '../../shared/problem.js'
import {
  columnsOf,
  estimateOf,
  naturalValue,
  reduce,
  replicateValues,
  scoreOf,
  simulationsPerReplicate,
} from './estimate.js'
import type { ObjectivePlan, ProblemPlan } from './plan.js'

const reduced = (reduction: Reduction, values: readonly number[], direction: Direction = 'minimise') =>
  reduce(reduction, direction, Float64Array.from(values))

describe('replicates to one number', () => {
  test('mean and median', () => {
    expect(reduced('mean', [1, 2, 6])).toBe(3)
    expect(reduced('median', [9, 1, 4])).toBe(4)
    expect(reduced('median', [9, 1, 4, 2])).toBe(3)
    for (const reduction of ['mean', 'median', 'worst', { quantile: 0.3 }] as const) {
      expect(reduced(reduction, [-7.5])).toBe(-7.5)
    }
  })

  test('numbers are ordered as numbers, not as text', () => {
    expect(reduced('median', [100, 20, 3])).toBe(20)
    expect(reduced('median', [-1, -20, -3])).toBe(-3)
  })

  test('worst is the least of what is maximised and the most of what is minimised', () => {
    expect(reduced('worst', [3, 1, 2], 'maximise')).toBe(1)
    expect(reduced('worst', [3, 1, 2], 'minimise')).toBe(3)
  })

  // Hyndman and Fan, Sample quantiles in statistical packages (1996), definition 7: linear between the points
  // p_k = (k - 1) / (n - 1). The sample is a common textbook one (from memory); its quartiles were worked by hand.
  test('quantiles are of definition 7', () => {
    const sample = [3, 6, 7, 8, 8, 10, 13, 15, 16, 20]
    const at = (quantile: number, values: readonly number[] = sample) => reduced({ quantile }, values)
    expect([0, 0.25, 0.5, 0.75, 1].map((p) => at(p))).toEqual([3, 7.25, 9, 14.5, 20])
    expect(at(0.1)).toBeCloseTo(5.7, 12)
    expect(at(0.9)).toBeCloseTo(16.4, 12)
    // The points themselves: the k-th of n values at exactly (k - 1) / (n - 1).
    for (let n = 2; n <= 12; n++) {
      const values = Array.from({ length: n }, (_, k) => k * k)
      values.forEach((value, k) => void expect(at(k / (n - 1), values.toReversed())).toBeCloseTo(value, 9))
    }
    // The other definitions give 6.75 (6), 6.92 (8) or 7 (1, 2) at the lower quartile.
    expect(at(0.25)).not.toBe(7)
  })

  test('nothing is reduced in place', () => {
    const values = Float64Array.of(3, 1, 2)
    reduce('median', 'minimise', values)
    expect([...values]).toEqual([3, 1, 2])
  })

  test('an estimate needs a replicate', () => {
    expect(() => reduced('mean', [])).toThrow('needs a replicate')
  })
})

function problemOf(
  objectives: readonly Partial<ObjectivePlan>[],
  cases: readonly string[] = [],
): ProblemPlan {
  return {
    name: 'pump mount',
    version: '1',
    digest: '',
    spec: {},
    objectives: objectives.map((objective, at) => ({
      name: `o${at}`,
      direction: 'minimise',
      unit: 'mm',
      reduce: 'mean',
      overCases: 'mean',
      ...objective,
    })),
    measures: [{ name: 'mass', low: 0, high: 1, unit: 'kg' }],
    cases,
  }
}

describe('cases to one number a replicate', () => {
  // Idle, running up, full speed; two replicates; columns: objective, measure.
  const cases = ['idle', 'running-up', 'full-speed']
  const values = Float64Array.of(1, 9, 5, 9, 3, 9, 20, 9, 10, 9, 60, 9)
  const perReplicate = (objective: Partial<ObjectivePlan>) => {
    const problem = problemOf([objective], cases)
    return [...replicateValues(problem, problem.objectives[0]!, 0, values)]
  }

  test('mean, sum and worst', () => {
    expect(perReplicate({ overCases: 'mean' })).toEqual([3, 30])
    expect(perReplicate({ overCases: 'sum' })).toEqual([9, 90])
    expect(perReplicate({ overCases: 'worst' })).toEqual([5, 60])
    expect(perReplicate({ overCases: 'worst', direction: 'maximise' })).toEqual([1, 10])
  })

  test('cases are combined before replicates are reduced', () => {
    const problem = problemOf([{ overCases: 'worst', reduce: 'mean' }], cases)
    expect(estimateOf(problem, problem.objectives[0]!, 0, values)).toBe(32.5)
    // The other way round it would be the worst of the cases' means: 11.5, 7.5, 31.5.
    expect(estimateOf(problem, problem.objectives[0]!, 0, values)).not.toBe(31.5)
  })

  test('a replicate of a problem without cases is one simulation', () => {
    expect(simulationsPerReplicate(problemOf([{}]))).toBe(1)
    expect(simulationsPerReplicate(problemOf([{}], cases))).toBe(3)
    expect(columnsOf(problemOf([{}, {}]))).toBe(3)
  })

  test('broken replicates are noticed', () => {
    const problem = problemOf([{}], cases)
    expect(() => replicateValues(problem, problem.objectives[0]!, 0, values.subarray(0, 8))).toThrow(
      'whole replicates',
    )
  })
})

describe('the score', () => {
  const problem = problemOf([{ direction: 'maximise', reduce: 'worst' }, { reduce: 'median' }])

  test('is to be minimised, whatever the direction', () => {
    // Columns: two objectives, one measure; three replicates.
    const values = Float64Array.of(5, 1, 0, 4, 2, 0, 9, 7, 0)
    expect([...scoreOf(problem, values, 0)]).toEqual([-4, 2])
    expect(naturalValue(problem.objectives[0]!, -4)).toBe(4)
    expect(naturalValue(problem.objectives[1]!, 2)).toBe(2)
  })

  test('of one simulation equals what the reductions give', () => {
    for (const reduction of ['mean', 'median', 'worst', { quantile: 0.9 }] as const) {
      for (const overCases of ['mean', 'sum', 'worst'] as const) {
        for (const direction of ['minimise', 'maximise'] as const) {
          const one = problemOf([{ reduce: reduction, overCases, direction }])
          const estimate = estimateOf(one, one.objectives[0]!, 0, Float64Array.of(3.25, 1))
          expect(estimate).toBe(3.25)
          expect([...scoreOf(one, Float64Array.of(3.25, 1), 0)]).toEqual([
            direction === 'maximise' ? -3.25 : 3.25,
          ])
        }
      }
    }
  })

  test('is never negative zero', () => {
    const score = scoreOf(problem, Float64Array.of(0, 0, 0), 0)
    expect(Object.is(score[0], 0)).toBe(true)
    expect(Object.is(naturalValue(problem.objectives[0]!, 0), 0)).toBe(true)
  })

  test('is the worst there is when finite numbers have an estimate that is not', () => {
    const infinite = [Number.POSITIVE_INFINITY, Number.POSITIVE_INFINITY]
    for (const reduction of ['mean', 'median', { quantile: 0.9 }] as const) {
      for (const values of [
        Float64Array.of(1e308, 0, 1e308, 0, 1e308, 0),
        Float64Array.of(-1.7e308, 0, 1.7e308, 0),
      ]) {
        const score = scoreOf(problemOf([{ reduce: reduction, direction: 'maximise' }]), values, 0)
        expect(Number.isNaN(score[0])).toBe(false)
        expect(score[0]).not.toBe(Number.NEGATIVE_INFINITY)
      }
    }
    const sum = Float64Array.of(1e308, 1, 0, 1e308, 1, 0)
    const overflowing = problemOf([{ direction: 'maximise', reduce: 'mean' }, { reduce: 'median' }])
    expect([...scoreOf(overflowing, sum, 0)]).toEqual(infinite)
  })

  test('is the worst there is when a simulation failed or none was made', () => {
    const infinite = [Number.POSITIVE_INFINITY, Number.POSITIVE_INFINITY]
    expect([...scoreOf(problem, Float64Array.of(5, 1, 0), 1)]).toEqual(infinite)
    expect([...scoreOf(problem, new Float64Array(0), 0)]).toEqual(infinite)
  })
})
