// What `check` says about making and cautions, from founders of small problems.

import { describe, expect, it } from 'vitest'
import { real } from '../../../shared/encodings.js'
import { springStrips } from '../../../shared/making/stock.js'
import type { Process } from '../../../shared/making/types.js'
import { noMachine } from '../../../shared/making/types.js'
import type { AnyProblem } from '../../../shared/problem.js'
import { defineProblem, type ProblemInput } from '../../../sim/problem.js'
import { cautionLines, declaredCautions, makingLines, tryMaking } from './making.js'

const spec = { leaf: real({ low: 0.02, high: 0.22, unit: 'm' }) }
const strip = springStrips[2]!
const process: Process = { name: 'bench', methods: ['sheet-metal-cutting'], stock: [strip], actuators: [] }
type Input = ProblemInput<typeof spec, null>

/** A leaf spring as long as its genome says, up to 1 m unless the stock is shortened. */
function leafSpring(change: Partial<Input>, lengthMostM = 1): AnyProblem {
  const stock = [{ ...strip, lengthMostM }]
  return defineProblem<typeof spec, null>({
    name: 'leaf',
    version: '1',
    summary: 'a leaf spring',
    genome: spec,
    objectives: { sag: { direction: 'minimise', unit: 'm' } },
    drawCondition: () => null,
    simulate: (_, situations) => situations.map(() => ({ objectives: { sag: 1 } })),
    process: { ...process, stock },
    parts: (genome) => ({ struts: [{ name: 'leaf', stock: strip.name, lengthM: genome.leaf[0]! }] }),
    ...change,
  }) as unknown as AnyProblem
}

describe('founders against the process', () => {
  it('that can all be made are said to be so', () => {
    const { trial, faults } = tryMaking(leafSpring({}), 1)
    expect(faults).toEqual([])
    expect(trial).toEqual({ founders: 64, cannot: 0, rules: [] })
    expect(makingLines(trial, true)).toEqual(['All of 64 founders can be made by the declared process.'])
  })

  it('that cannot be made are counted by rule, with the first part as example', () => {
    // Half of 0.02 to 0.22 m is longer than 0.12 m: 32 of 64, four standard errors are 16.
    const { trial, faults } = tryMaking(leafSpring({}, 0.12), 1)
    expect(faults).toEqual([])
    expect(Math.abs(trial!.cannot - 32)).toBeLessThanOrEqual(16)
    expect(trial!.rules).toHaveLength(1)
    expect(trial!.rules[0]).toMatchObject({ rule: 'length of stock', founders: trial!.cannot })
    const [line] = makingLines(trial, true)
    expect(line).toMatch(
      /of 64 founders \(\d+ %\) cannot be made after repair and would fail: leaf: length of stock/,
    )
    expect(line).toContain('REPAIR should leave fewer')
  })

  it('are mended by a repair that cuts to length', () => {
    const repair: Input['repair'] = (genome) => ({
      leaf: genome.leaf.map((lengthM) => Math.min(0.12, lengthM)),
    })
    expect(tryMaking(leafSpring({ repair }, 0.12), 1).trial!.cannot).toBe(0)
  })

  it('of which none can be made stand in the way of the search', () => {
    const { trial, faults } = tryMaking(leafSpring({}, 0.015), 1)
    expect(trial!.cannot).toBe(64)
    expect(faults).toHaveLength(1)
    expect(faults[0]!.kind).toBe('cannot-be-made')
    expect(faults[0]!.sentence).toMatch(/^not one of 64 founders can be made; leaf: length of stock: found/)
  })

  it('whose parts are malformed or throw are the problem’s mistake', () => {
    const malformed = leafSpring({ parts: () => ({ struts: 3 }) as never })
    expect(tryMaking(malformed, 1).faults[0]).toMatchObject({
      kind: 'wrong-results',
      sentence: expect.stringMatching(/founder 1: parts\.struts: found 3/),
    })
    const thrown = leafSpring({
      parts: () => {
        throw new Error('no such leaf')
      },
    })
    expect(tryMaking(thrown, 1).faults[0]).toMatchObject({
      kind: 'problem-throws',
      sentence: expect.stringMatching(/no such leaf/),
    })
  })

  it('are not tried without a process or parts, and that is said', () => {
    const { process: _, ...free } = leafSpring({})
    expect(tryMaking(free as AnyProblem, 1)).toEqual({ faults: [] })
    expect(makingLines(undefined, false)[0]).toMatch(/declares no process/)
    expect(makingLines(undefined, true)[0]).toMatch(/declares no parts/)
  })
})

describe('cautions before the search', () => {
  it('name the hazards and what is not declared', () => {
    const problem = leafSpring({ use: { storedElasticJ: 1, places: ['bench'], voltageV: 0 } })
    const told = declaredCautions(problem, 1)
    expect(told.hazards).toContain('Stored spring energy')
    expect(told.hazards).toContain('Lithium cells')
    expect(told.hazards).not.toContain('Flooding')
    expect(told.notDeclared).toContain('kind of battery')
    expect(told.notDeclared).not.toContain('voltage')
    const lines = cautionLines(told)
    expect(lines[0]).toMatch(/^Cautions that would leave with a machine: /)
    expect(lines[1]).toMatch(/^Not declared, and therefore cautioned against: /)
  })

  it('are none for what is no machine', () => {
    expect(cautionLines(declaredCautions(leafSpring({ use: noMachine }), 1))).toEqual([])
  })
})
