import { describe, expect, test } from 'vitest'
import { real } from '../shared/encodings.js'
import { limits } from '../shared/limits.js'
import type { AnyProblem, SimulationOutcome, Situation } from '../shared/problem.js'
import { evaluate, evaluateStrict } from './evaluate.js'
import { buildLattice } from './lattice/build.js'
import { asProblem, defineProblem } from './problem.js'

type Simulate = (situations: readonly Situation<number>[]) => unknown

/** A problem with one objective, one measure and the given way of simulating. */
function problemOf(simulate: Simulate, cases: readonly string[] = []): AnyProblem {
  return asProblem(
    defineProblem({
      name: 'trial',
      version: '1',
      summary: 'For tests.',
      genome: { a: real({ low: 0, high: 1 }) },
      objectives: { travel: { direction: 'maximise', unit: 'm' } },
      measures: { mass: { low: 0, high: 1, unit: 'kg' } },
      cases,
      drawCondition: (stream) => stream.uniform(),
      simulate: (_, situations) => simulate(situations) as SimulationOutcome[],
    }),
  )
}
const genome = { a: Float64Array.of(0.5) }
const run = (problem: AnyProblem, first = 0, replicates = 2) =>
  evaluateStrict(problem, genome, 7, true, 1, first, replicates)
const good = { objectives: { travel: 1 }, measures: { mass: 2 } }

describe('rows', () => {
  test('are replicate-major, then case; columns are objectives, then measures', () => {
    const seen: Situation<number>[] = []
    const problem = problemOf(
      (situations) => {
        seen.push(...situations)
        return situations.map((_, i) => ({ objectives: { travel: i }, measures: { mass: 10 + i } }))
      },
      ['idle', 'full'],
    )
    const { values, failures } = run(problem)
    expect(seen.map((s) => s.case)).toEqual(['idle', 'full', 'idle', 'full'])
    expect(seen[0]!.condition).toBe(seen[1]!.condition)
    expect(seen[0]!.condition).not.toBe(seen[2]!.condition)
    expect(Array.from(values)).toEqual([0, 10, 1, 11, 2, 12, 3, 13])
    expect(failures).toEqual([])
  })

  test('a top-up continues the conditions of the first block', () => {
    const problem = problemOf((situations) =>
      situations.map(({ condition }) => ({ objectives: { travel: condition }, measures: { mass: 0 } })),
    )
    const all = run(problem, 0, 5).values
    const parts = [...run(problem, 0, 2).values, ...run(problem, 2, 3).values]
    expect(Array.from(all)).toEqual(parts)
  })

  test('conditions are the same for rivals when shared, and different otherwise', () => {
    const problem = problemOf((situations) =>
      situations.map(({ condition }) => ({ objectives: { travel: condition }, measures: { mass: 0 } })),
    )
    const of = (shared: boolean, individual: number) =>
      evaluate(problem, genome, 7, shared, individual, 0, 1).values[0]
    expect(of(true, 1)).toBe(of(true, 2))
    expect(of(false, 1)).not.toBe(of(false, 2))
  })

  test('-0 becomes 0', () => {
    const { values } = run(
      problemOf((s) => s.map(() => ({ objectives: { travel: -0 }, measures: { mass: -0 } }))),
    )
    for (const value of values) expect(Object.is(value, 0)).toBe(true)
  })
})

describe('faults of a problem become failed rows with a reason', () => {
  const each =
    (outcome: unknown): Simulate =>
    (situations) =>
      situations.map((_, i) => (i === 1 ? outcome : good))
  const rows: readonly (readonly [string, unknown, RegExp])[] = [
    ['NaN', { objectives: { travel: Number.NaN }, measures: { mass: 1 } }, /objective travel is NaN/],
    ['infinity', { objectives: { travel: 1 }, measures: { mass: -1 / 0 } }, /measure mass is -Infinity/],
    ['a missing objective', { objectives: {}, measures: { mass: 1 } }, /objective travel is missing/],
    [
      'an inherited one',
      { objectives: Object.create({ travel: 1 }), measures: { mass: 1 } },
      /travel is missing/,
    ],
    ['missing measures', { objectives: { travel: 1 } }, /measure mass is missing/],
    [
      'an extra objective',
      { objectives: { travel: 1, speed: 2 }, measures: { mass: 1 } },
      /speed is not declared/,
    ],
    ['a text', { objectives: { travel: '1' }, measures: { mass: 1 } }, /travel is 1, not a number/],
    ['no object', 3, /an outcome is 3/],
    ['nothing', undefined, /an outcome is undefined/],
    ['a failure without a sentence', { failed: true }, /failed is true/],
  ]
  test.each(rows)('%s', (_, outcome, reason) => {
    const { values, failures, faults } = run(problemOf(each(outcome)))
    expect(failures).toHaveLength(1)
    expect(failures[0]!.simulation).toBe(1)
    expect(failures[0]!.reason).toMatch(reason)
    expect(faults).toEqual(failures)
    expect(Array.from(values)).toEqual([1, 2, 0, 0])
  })

  test.each([
    [
      'a throw',
      () => {
        throw new Error('no pump')
      },
      /the problem threw: no pump/,
    ],
    [
      'a throw of something without a text',
      () => {
        throw Object.create(null)
      },
      /something without a text/,
    ],
    ['too few outcomes', () => [good], /1 outcomes for 2 situations/],
    ['no list', () => good, /object for 2 situations/],
  ] as const)('%s fails every row', (_, simulate, reason) => {
    const { values, failures, faults } = run(problemOf(simulate as Simulate))
    expect(failures.map((f) => f.simulation)).toEqual([0, 1])
    for (const failure of failures) expect(failure.reason).toMatch(reason)
    expect(faults).toHaveLength(2)
    expect(values.every((value) => value === 0)).toBe(true)
  })

  test('a machine that failed is a result, no fault; its reason is kept short and plain', () => {
    const long = `leg broke\u001b[31m${'x'.repeat(500)}`
    const { failures, faults } = run(problemOf(each({ failed: long })))
    expect(faults).toEqual([])
    expect(failures[0]!.reason).toMatch(/^leg broke \[31mxxx/)
    expect(failures[0]!.reason).toHaveLength(limits.failureReasonLength)
  })
})

test('a simulator that refuses a machine is quoted with the part it names, of whatever copy its refusal is', () => {
  const lattice = {
    dimensions: 2 as const,
    nodes: [
      { positionM: [0, 0], massKg: 1 },
      { positionM: [1, 0], massKg: -3 },
    ],
    struts: [{ a: 0, b: 1, stiffnessNpm: 1, dampingNspm: 0 }],
    gravityMps2: [0, 0],
    stepSeconds: 'auto' as const,
  }
  const [own] = run(problemOf(() => buildLattice(lattice))).failures
  expect(own?.reason).toMatch(/^the problem threw: lattice\.nodes\[1\]\.massKg: .*found -3.*mass above 0$/)
  const stranger = Object.assign(new Error('found 7.'), { where: { field: 'lattice.struts[4]' } })
  const [other] = run(
    problemOf(() => {
      throw stranger
    }),
  ).failures
  expect(other?.reason).toBe('the problem threw: lattice.struts[4]: found 7')
  const hostile = Object.defineProperty(new Error('odd'), 'where', {
    get: () => {
      throw new Error('no')
    },
  })
  const [odd] = run(
    problemOf(() => {
      throw hostile
    }),
  ).failures
  expect(odd?.reason).toBe('the problem threw: odd')
})
