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

const row = {
  name: 'strip 0.2 mm',
  form: 'strip',
  material: {
    name: 'spring steel',
    youngPa: 206e9,
    youngSpread: 0.02,
    poissonRatio: 0.3,
    densityKgpm3: 7850,
    strainMost: 0.002,
    relaxationSeconds: 0,
    source: 'assumed',
  },
  wallM: 0.0002,
  areaM2: 2e-6,
  lengthLeastM: 0.02,
  lengthMostM: 2,
  wallToleranceM: 1e-5,
  source: 'assumed',
} as const
const process = { name: 'bench', methods: ['sheet-metal-cutting'], stock: [row], actuators: [] } as const

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

  test('needs go into the plan whole, and plans without any stay as they were', () => {
    const planned = (change: object) =>
      problemPlan(asProblem(defineProblem({ ...whole, ...change })), '0'.repeat(64))
    expect(planned({ needs: { cores: 2, tokens: { flow: 1 } } }).needs).toEqual({
      cores: 2,
      memoryMB: 1024,
      tokens: { flow: 1 },
    })
    expect('needs' in planned({})).toBe(false)
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
    ['a tolerance that is missing', { exactness: 'tolerance' }, 'tolerance', /every objective and measure/],
    [
      'a tolerance of nothing',
      { exactness: 'statistical', tolerance: { travel: {} } },
      'tolerance.travel',
      /above 0/,
    ],
    ['a tolerance for bits', { tolerance: { travel: { absolute: 1 } } }, 'tolerance', /exactness is 'bits'/],
    ['needs of a word', { needs: 'much' }, 'needs', /cores, memoryMB, tokens/],
    ['a need that is none', { needs: { core: 2 } }, 'needs.core', /one of cores, memoryMB, tokens/],
    ['half a core', { needs: { cores: 0.5 } }, 'needs.cores', /1 to 1024 cores/],
    ['no memory', { needs: { memoryMB: 0 } }, 'needs.memoryMB', /found 0, expected 1 to/],
    ['licences in a list', { needs: { tokens: ['flow'] } }, 'needs.tokens', /one entry a licence/],
    ['no licence of a kind', { needs: { tokens: { flow: 0 } } }, 'needs.tokens.flow', /from 1/],
    ['a licence with a colon', { needs: { tokens: { 'a:b': 1 } } }, 'needs.tokens.a:b', /letters, digits/],
    ['no simulate', { simulate: undefined }, 'simulate', /a function/],
    ['an unknown field', { fitness: 1 }, 'fitness', /one of name, version/],
    ['a genome part without bounds', { genome: { a: { kind: 'real', length: 1 } } }, 'genome.a.low', /./],
    ['an empty genome', { genome: {} }, 'genome', /parts/],
    [
      'a process without methods',
      { process: { name: 'a', stock: [], actuators: [] } },
      'process.methods',
      /nothing/,
    ],
    ['a wall of nothing', { process: { ...process, wallLeastM: 0 } }, 'process.wallLeastM', /found 0/],
    ['a NaN mass', { process: { ...process, massMostKg: Number.NaN } }, 'process.massMostKg', /NaN/],
    [
      'a stock row upside down',
      { process: { ...process, stock: [{ ...row, lengthMostM: 0.01 }] } },
      'process.stock',
      /./,
    ],
    [
      'two stock rows of one name',
      { process: { ...process, stock: [row, row] } },
      'process.stock',
      /different names/,
    ],
    [
      'a stock row without a source',
      { process: { ...process, stock: [{ ...row, source: '' }] } },
      'process.stock[0].source',
      /found ''/,
    ],
    ['parts that are no function', { parts: {} }, 'parts', /a function or nothing/],
    ['an unknown use', { use: { temperatureC: 20 } }, 'use', /temperatureC/],
    ['a negative pressure', { use: { gasPressurePa: -1 } }, 'use.gasPressurePa', /found -1/],
    ['an unknown place', { use: { places: ['bench', 'moon'] } }, 'use.places[1]', /moon/],
    ['a use that is a word', { use: 'harmless' }, 'use', /harmless/],
  ]
  test.each(rows)('refuses %s and names the field', (_, change, field, detail) => {
    const refusal = refusalOf(change)
    expect(refusal.where?.field).toBe(field)
    expect(refusal.detail).toMatch(detail)
    expect(refusal.exitCode).toBe(78)
  })
})

describe('a machine that the declared process cannot make', () => {
  const situations = [
    { condition: null, case: '' },
    { condition: null, case: '' },
  ]
  const measured = { objectives: { travel: 1 } }
  const mount = (lengthM: number) =>
    defineProblem({
      ...whole,
      simulate: (_, asked) => asked.map(() => measured),
      process,
      parts: () => ({ struts: [{ name: 'leaf 1', stock: row.name, lengthM }] }),
    })
  const genome = { stiffness: Float64Array.of(1.5) }

  test('fails in every situation without being simulated, with the part and the rule', () => {
    const failed =
      'cannot be made: leaf 1: length of stock: found 5 mm, expected 20 mm to 2 m of strip 0.2 mm'
    expect(mount(0.005).simulate(genome, situations)).toEqual([{ failed }, { failed }])
    expect(mount(Number.NaN).simulate(genome, situations)[0]).toHaveProperty('failed')
  })

  test('is simulated when it can be made, or when nothing was declared to compare with', () => {
    expect(mount(0.02).simulate(genome, situations)).toEqual([measured, measured])
    const simulate = () => [measured]
    expect(defineProblem({ ...whole, simulate, process }).simulate).toBe(simulate)
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
