// The comparison with a control: the difference of two retests and its error, on numbers worked by hand.

import { describe, expect, it } from 'vitest'
import type { EvaluationResult } from '../../../shared/result.js'
import { mixedPlan } from '../../../tests/fixture.js'
import { resultText } from '../../evidence/pictures/facts.js'
import { compareFresh, differenceSentence, errorOfDifference } from './comparison.js'

const plan = mixedPlan()
const error = plan.problem.objectives[0]!
/** Rows of error, reach, height. */
const tested = (
  errors: readonly number[],
  failures: EvaluationResult['failures'] = [],
): EvaluationResult => ({
  values: Float64Array.from(errors.flatMap((value) => [value, 0, 0])),
  failures,
})

describe('the best against a control on fresh conditions', () => {
  it('pairs simulations under shared conditions, so that what conditions do to both drops out', () => {
    // Differences 1, 1, 1, 3: mean 1.5, standard deviation 1, over four.
    const found = compareFresh(plan, tested([1, 5, 9, 2]), tested([2, 6, 10, 5]))!
    expect(found.better).toEqual({ value: 1.5, standardError: 0.5 })
    expect(found.control.value).toBe(5.75)
    expect(differenceSentence(error, found)).toBe(
      "The search's best is better by 1.50 ± 0.50 m (one standard error, 4 replicates). Another seed may give another difference.",
    )
  })
  it('adds the variances where each has conditions of its own', () => {
    const [ours, theirs] = [Float64Array.of(0, 2), Float64Array.of(0, 4)]
    expect(errorOfDifference(ours, theirs, false)).toBeCloseTo(Math.sqrt(1 + 4), 12)
  })
  it('turns with the direction, and says when the control won', () => {
    const maximise = {
      ...plan,
      problem: {
        ...plan.problem,
        objectives: [{ ...error, direction: 'maximise' as const }, plan.problem.objectives[1]!],
      },
    }
    const found = compareFresh(maximise, tested([1, 2, 3, 4]), tested([5, 6, 7, 8]))!
    expect(found.better.value).toBe(-4)
    expect(differenceSentence(error, found)).toContain('WORSE by 4 m')
  })
  it('calls nothing a difference that chance may make', () => {
    const found = compareFresh(plan, tested([1, 2, 1, 2]), tested([1.5, 1.6, 1.4, 1.7]))!
    expect(differenceSentence(error, found)).toContain('no more than chance may do')
    const same = compareFresh(plan, tested([1, 2]), tested([1, 2]))!
    expect(differenceSentence(error, same)).toContain('no more than chance may do')
  })
  it('compares nothing where either failed or is missing', () => {
    const failing = tested([1, 2], [{ simulation: 0, reason: 'it fell over' }])
    expect(compareFresh(plan, failing, tested([1, 2]))).toBeUndefined()
    expect(compareFresh(plan, tested([1, 2]), undefined)).toBeUndefined()
  })
})

describe('a number with its error', () => {
  it('takes what rounding leaves of equal numbers for no error', () => {
    const material = { name: 'material', unit: 'kg', value: 0.270135924 }
    expect(resultText({ ...material, standardError: 1e-17 })).toBe('material 0.27 kg')
    expect(resultText({ ...material, standardError: 0.0012 })).toBe('material 0.2701 ± 0.0012 kg')
  })
})
