// Problems that break their promises, each in its own way; `check` must name the number and where it stands.

import { describe, expect, it } from 'vitest'
import { real } from '../../../shared/encodings.js'
import type { AnyProblem, Measured, SimulationOutcome } from '../../../shared/problem.js'
import { ulpDistance } from '../../../shared/ulp.js'
import { defineProblem } from '../../../sim/problem.js'
import { type TrialPlan, tryProblem } from './trials.js'

const plan: TrialPlan = { seed: 3, shared: true, replicates: 2, machines: 3, secondsMost: 60 }
let clock = 0
const tick = () => (clock += 0.001)

/** A problem whose outcome for one simulation is what `outcome` says; `call` counts simulations from 0. */
function problemThat(
  outcome: (x: number, call: number) => unknown,
  cases: readonly string[] = ['idle', 'full'],
): AnyProblem {
  let call = 0
  return defineProblem({
    name: 'probe',
    version: '1',
    summary: 'a problem that does what the test is about',
    genome: { x: real({ length: 1, low: 1, high: 2 }) },
    objectives: { lift: { direction: 'maximise', unit: 'm' } },
    measures: { effort: { low: 0, high: 10, unit: 'J' } },
    cases,
    drawCondition: (stream) => stream.uniform(),
    simulate: (genome, situations) =>
      situations.map(() => outcome(genome.x[0]!, call++) as SimulationOutcome),
  }) as unknown as AnyProblem
}
const sound = (x: number): Measured => ({ objectives: { lift: x }, measures: { effort: x / 2 } })
const sentences = (problem: AnyProblem) =>
  tryProblem(problem, plan, tick).faults.map(({ kind, sentence }) => `${kind}: ${sentence}`)

describe('a sound problem', () => {
  it('has no faults, and a time for each machine', () => {
    const trials = tryProblem(problemThat(sound), plan, tick)
    expect(trials.faults).toEqual([])
    expect(trials).toMatchObject({ failed: 0, simulations: 12 })
    expect(trials.machines.map(({ secondsPerSimulation }) => secondsPerSimulation > 0)).toEqual([
      true,
      true,
      true,
    ])
  })
  it('may have machines that fail by its own word', () => {
    const trials = tryProblem(
      problemThat((x) => (x > 0 ? { failed: 'it fell over' } : sound(x))),
      plan,
      tick,
    )
    expect(trials.faults).toEqual([])
    expect(trials).toMatchObject({ failed: 12, failedBecause: 'it fell over' })
  })
  it('stops beginning machines when its time is up, but tries two', () => {
    let seconds = 0
    const trials = tryProblem(
      problemThat(sound),
      { ...plan, machines: 50, secondsMost: 1 },
      () => (seconds += 1),
    )
    expect(trials.machines).toHaveLength(2)
  })
})

describe('a number that is none', () => {
  const cases: readonly [string, (x: number) => unknown, RegExp][] = [
    ['NaN', (x) => ({ objectives: { lift: Number.NaN }, measures: { effort: x } }), /objective lift is NaN/],
    [
      'infinity',
      (x) => ({ objectives: { lift: x }, measures: { effort: Number.POSITIVE_INFINITY } }),
      /measure effort is Infinity/,
    ],
    ['a missing objective', () => ({ objectives: {}, measures: { effort: 1 } }), /objective lift is missing/],
    [
      'an objective too many',
      (x) => ({ objectives: { lift: x, drop: 1 }, measures: { effort: 1 } }),
      /objective drop is not declared/,
    ],
    [
      'a text',
      () => ({ objectives: { lift: 'high' }, measures: { effort: 1 } }),
      /lift is high, not a number/,
    ],
    ['nothing', () => undefined, /an outcome is undefined/],
  ]
  for (const [what, outcome, expected] of cases) {
    it(`is named with machine, replicate and case: ${what}`, () => {
      const found = sentences(problemThat(outcome))
      expect(found).toHaveLength(1)
      expect(found[0]).toMatch(/^wrong-results: machine 1, replicate 1, case idle: /)
      expect(found[0]).toMatch(expected)
    })
  }
  it('is named when a single case has it', () => {
    // Rows go replicate by replicate, case by case; every odd one is the second case.
    const found = sentences(
      problemThat((x, call) => (call % 2 === 1 ? { objectives: { lift: Number.NaN } } : sound(x))),
    )
    expect(found[0]).toContain('replicate 1, case full')
  })
  it('includes a wrong number of outcomes', () => {
    const problem = { ...problemThat(sound), simulate: () => [] } as AnyProblem
    expect(sentences(problem)[0]).toContain('simulate returned 0 outcomes for 4 situations')
  })
  it('includes an expected cost that is no positive whole number', () => {
    const problem = { ...problemThat(sound), expectedCost: () => 0.5 } as AnyProblem
    expect(sentences(problem)).toEqual([expect.stringContaining('expectedCost gave 0.5 for machine 1')])
  })
  it('includes a throw, told once and not for every machine', () => {
    const found = sentences(
      problemThat(() => {
        throw new Error('no such pad')
      }),
    )
    expect(found).toHaveLength(1)
    expect(found[0]).toMatch(/^problem-throws: .*no such pad/)
  })
})

describe('a result that differs', () => {
  it('on a second run is told with the measurement and the distance in ulp', () => {
    const step = (x: number, call: number) => x + (call >= 12 ? Number.EPSILON * 3 : 0) * (call % 2)
    // x lies in [1, 2), where neighbours are one EPSILON apart.
    const found = sentences(
      problemThat((x, call) => ({ objectives: { lift: x }, measures: { effort: step(x, call) } })),
    )
    expect(found).toHaveLength(1)
    expect(found[0]).toMatch(
      /^not-deterministic: effort of machine \d \(replicate \d, case full\) differs by 3 ulp when machines were simulated in another order/,
    )
  })
  it('because the problem counts its calls is told as differing twice in a row', () => {
    const found = sentences(
      problemThat((x, call) => ({ objectives: { lift: x + call }, measures: { effort: x } })),
    )
    expect(found).toHaveLength(1)
    expect(found[0]).toMatch(/^not-deterministic: lift .* when it was simulated twice in a row: /)
  })
  it('only in the reason of a failure is told too', () => {
    const found = sentences(problemThat((_, call) => ({ failed: `fell at call ${call}` })))
    expect(found[0]).toContain('failed for another reason when it was simulated twice in a row')
  })
  it('in the order only: something kept from one machine to the next', () => {
    let last = 0
    const found = sentences(
      problemThat((x) => {
        const kept = x === last ? 0 : last
        last = x
        return { objectives: { lift: x }, measures: { effort: kept === 0 ? 0 : 1 } }
      }, []),
    )
    expect(found.length).toBeGreaterThan(0)
    expect(found[0]).toMatch(/effort of machine \d/)
  })
})

describe('distance in ulp', () => {
  it('counts steps between neighbouring doubles, across zero too', () => {
    expect(ulpDistance(1, 1 + Number.EPSILON)).toBe(1n)
    expect(ulpDistance(0, -0)).toBe(0n)
    expect(ulpDistance(Number.MIN_VALUE, -Number.MIN_VALUE)).toBe(2n)
    expect(ulpDistance(2, 1)).toBe(2n ** 52n)
  })
})
