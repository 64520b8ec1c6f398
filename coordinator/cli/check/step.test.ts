// A problem whose step error is known to the digit: an explicit Euler step of x' = -x loses h/2 of the logarithm.

import { describe, expect, it } from 'vitest'
import { real } from '../../../shared/encodings.js'
import type { AnyProblem } from '../../../shared/problem.js'
import { defineProblem } from '../../../sim/problem.js'
import { stepLines } from './step-lines.js'
import { type TrialPlan, tryProblem } from './trials.js'

const plan: TrialPlan = { seed: 3, shared: true, replicates: 2, machines: 3, secondsMost: 60 }
let clock = 0
const tick = () => (clock += 0.001)

/** x(1) from x(0) = the genome's, with `steps` steps, times a condition that scatters by `scatter`. */
function decay(steps: number, scatter: number, finer = true, failAbove = 2): AnyProblem {
  const run = (x: number, condition: number, count: number) => {
    let value = x
    for (let i = 0; i < count; i++) value -= value / count
    const failed = count > steps && x > failAbove
    return failed ? { failed: 'too fine' } : { objectives: { rest: value * (1 + scatter * condition) } }
  }
  return defineProblem({
    name: 'decay',
    version: '1',
    summary: 'a decay integrated with explicit Euler steps',
    genome: { x: real({ length: 1, low: 1, high: 2 }) },
    objectives: { rest: { direction: 'maximise', unit: 'm' } },
    drawCondition: (stream) => stream.uniform() - 0.5,
    simulate: (genome, situations) => situations.map(({ condition }) => run(genome.x[0]!, condition, steps)),
    ...(finer
      ? {
          simulateFiner: (
            genome: { x: Float64Array },
            situations: readonly { condition: number }[],
            divide: number,
          ) => situations.map(({ condition }) => run(genome.x[0]!, condition, steps * divide)),
        }
      : {}),
  }) as unknown as AnyProblem
}

describe('the size of the step', () => {
  it('is judged by what halving it changes: the known error of Euler steps', () => {
    const { step } = tryProblem(decay(10, 0), plan, tick)
    const [change] = step!.changes
    expect(step).toMatchObject({ machines: 3, simulations: 12, failedAtOne: 0 })
    const ratio = 0.95 ** 20 / 0.9 ** 10
    expect(change!.bias / change!.mean).toBeCloseTo(ratio - 1, 12)
    expect(change!.change).toBeCloseTo(change!.bias, 12)
    expect(change!.spread).toBe(0)
  })
  it('matters where replicates scatter less than it changes, and is said to', () => {
    const coarse = tryProblem(decay(10, 0.001), plan, tick).step
    expect(stepLines(coarse).join('\n')).toMatch(/half the step.*rest changes by .* m .*STEP MATTERS/s)
    const fine = tryProblem(decay(1000, 0.5), plan, tick).step
    expect(stepLines(fine).join('\n')).toMatch(/so the step matters little/)
  })
  it('counts simulations that fail at one size only, and leaves them out', () => {
    const { step } = tryProblem(decay(10, 0, true, 1), plan, tick)
    expect(step).toMatchObject({ simulations: 0, failedAtOne: 12, changes: [] })
    expect(stepLines(step).join('\n')).toMatch(/12 simulations failed at one step size/)
  })
  it('is said not to be judged where the problem cannot', () => {
    const { step } = tryProblem(decay(10, 0, false), plan, tick)
    expect(step).toBeUndefined()
    expect(stepLines(step)[0]).toMatch(/not judged/)
  })
})
