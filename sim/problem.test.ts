import { describe, expect, test } from 'vitest'
import { real } from '../shared/encodings.js'
import { Refusal } from '../shared/refusals.js'
import { asProblem, columnsOf, defineProblem, problemPlan, simulationsPerReplicate } from './problem.js'

const whole = {
  name: 'pump-mount',
  version: '1',
  summary: 'A mount for a pump.',
  genome: { stiffness: real({ low: 1, high: 2 }) },
  objectives: { travel: { direction: 'minimise', unit: 'm' } },
  drawCondition: () => null,
  simulate: () => [],
} as const

/** The refusal that an altered problem meets. */
function refusalOf(change: object): Refusal {
  try {
    defineProblem({ ...whole, ...change } as never)
  } catch (error) {
    if (error instanceof Refusal) return error
    throw error
  }
  throw new Error('was not refused')
}

describe('defineProblem', () => {
  test('fills in what an author need not say', () => {
    const problem = defineProblem(whole)
    expect(problem.objectives.travel).toEqual({
      direction: 'minimise',
      unit: 'm',
      reduce: 'mean',
      overCases: 'mean',
    })
    expect(problem).toMatchObject({ measures: {}, cases: [], exactness: 'bits' })
    const genome = { stiffness: Float64Array.of(1.5) }
    expect(problem.expectedCost(genome)).toBe(1)
    expect(problem.repair(genome)).toBe(genome)
    expect('frames' in problem).toBe(false)
  })

  test('types the genome from its specification', () => {
    defineProblem({
      ...whole,
      simulate: (genome) => [{ objectives: { travel: genome.stiffness[0]! } }],
      // @ts-expect-error: there is no such part
      repair: (genome) => ({ ...genome, stiffness: genome.softness }),
    })
  })

  const unit = { direction: 'minimise', unit: 'm' }
  const rows: readonly (readonly [string, object, string, RegExp])[] = [
    ['no name', { name: '' }, 'name', /found ""/],
    ['a name with blanks', { name: 'pump mount' }, 'name', /letters, digits/],
    ['no objective', { objectives: {} }, 'objectives', /0 entries/],
    ['no direction', { objectives: { a: { unit: 'm' } } }, 'objectives.a.direction', /nothing/],
    [
      'no unit',
      { objectives: { a: { direction: 'minimise' } } },
      'objectives.a.unit',
      /'1' for a pure number/,
    ],
    ['an objective with a hyphen', { objectives: { 'a-b': unit } }, 'objectives.a-b', /plain identifier/],
    [
      'a quantile of 2',
      { objectives: { a: { ...unit, reduce: { quantile: 2 } } } },
      'objectives.a.reduce',
      /0 to 1/,
    ],
    [
      'a measure upside down',
      { measures: { b: { low: 2, high: 1, unit: 'm' } } },
      'measures.b.high',
      /above low \(2\)/,
    ],
    ['a measure without a unit', { measures: { b: { low: 0, high: 1 } } }, 'measures.b.unit', /nothing/],
    [
      'a measure named as an objective',
      { measures: { travel: { low: 0, high: 1, unit: 'm' } } },
      'measures.travel',
      /no objective has/,
    ],
    ['a case twice', { cases: ['idle', 'idle'] }, 'cases[1]', /no other case/],
    ['an unknown exactness', { exactness: 'roughly' }, 'exactness', /bits-per-processor/],
    ['no simulate', { simulate: undefined }, 'simulate', /a function/],
    ['an unknown field', { fitness: 1 }, 'fitness', /one of name, version/],
    ['a genome part without bounds', { genome: { a: { kind: 'real', length: 1 } } }, 'genome.a.low', /./],
    ['an empty genome', { genome: {} }, 'genome', /parts/],
  ]
  test.each(rows)('refuses %s and names the field', (_, change, field, detail) => {
    const refusal = refusalOf(change)
    expect(refusal.where?.field).toBe(field)
    expect(refusal.detail).toMatch(detail)
    expect(refusal.exitCode).toBe(78)
  })
})

describe('asProblem', () => {
  test('takes what defineProblem made and refuses everything else', () => {
    const problem = defineProblem(whole)
    expect(asProblem(problem)).toBe(problem)
    for (const stranger of [undefined, null, 1, 'x', [], () => 1]) {
      expect(() => asProblem(stranger)).toThrow(/expected the result of defineProblem/)
    }
    expect(() => asProblem({ ...problem, repair: undefined })).toThrow(/repair/)
  })
})

test('a plan of a problem is plain data in the order of declaration', () => {
  const problem = asProblem(
    defineProblem({
      ...whole,
      objectives: { b: { direction: 'maximise', unit: '1', reduce: 'worst' }, a: whole.objectives.travel },
      measures: { c: { low: 0, high: 1, unit: 's' } },
      cases: ['idle', 'full-speed'],
    }),
  )
  const plan = problemPlan(problem, 'abc')
  expect(structuredClone(plan)).toEqual(plan)
  expect(plan.objectives.map(({ name }) => name)).toEqual(['b', 'a'])
  expect(plan.objectives[0]).toEqual({
    name: 'b',
    direction: 'maximise',
    unit: '1',
    reduce: 'worst',
    overCases: 'mean',
  })
  expect(plan.measures).toEqual([{ name: 'c', low: 0, high: 1, unit: 's' }])
  expect(plan.digest).toBe('abc')
  expect(columnsOf(problem)).toEqual(['b', 'a', 'c'])
  expect(simulationsPerReplicate(problem)).toBe(2)
})
