// What a person sees who makes a mistake in a search file: each mistake has its own test, and each message says
// where, what was found, what was expected and what to do.

import { describe, expect, it } from 'vitest'
import { printFinding, printFindings, refusalOf } from '../../coordinator/cli/searchfile/finding.js'
import { planSearch, readSearchFile } from '../../coordinator/cli/searchfile/read.js'
import { renderRefusal } from '../../shared/refusals.js'
import { edited, goodFile, plan, problem, tables, twoObjectives } from './searchfile-fixture.js'

/** The only refusal of a text. */
function refused(text: string, of = problem) {
  const findings = plan(text, of).findings.filter((finding) => finding.severity === 'refused')
  expect(findings, printFindings('search.yaml', findings)).toHaveLength(1)
  expect(plan(text, of).plan).toBeUndefined()
  return findings[0]!
}
/** The only warning of a text; the search is planned all the same. */
function warned(text: string, nowMs?: number) {
  const { plan: planned, findings } = plan(text, problem, nowMs)
  expect(findings, printFindings('search.yaml', findings)).toHaveLength(1)
  expect(findings[0]!.severity).toBe('warning')
  expect(planned).toBeDefined()
  return findings[0]!
}

describe('many mistakes', () => {
  it('are one where a field is misspelt: its absence is not told as well', () => {
    const found = refused(edited('population: 40, lookahead: 6 }', 'population: 40, lookahed: 6 }'))
    expect(found).toMatchObject({ code: 'unknown-field', advice: 'Did you mean "lookahead"?' })
  })
  it('of one kind are counted, not repeated', () => {
    const bomb = ['a: &a [x]', ...Array.from({ length: 8 }, (_, i) => `b${i}: [*a, *a]`)].join('\n')
    const findings = plan(bomb).findings
    const { detail } = refusalOf('search.yaml', findings)!
    expect(detail.split('refused:').length - 1).toBeLessThanOrEqual(6)
    expect(detail).toMatch(/and \d+ more of the kinds above/)
  })
})

describe('a good search file', () => {
  it('becomes a plan without a word', () => {
    const { plan: planned, findings } = plan(goodFile)
    expect(findings).toEqual([])
    expect(planned?.islands.map(({ island }) => island)).toEqual([1, 2, 3, 4])
    expect(planned?.islands[0]).toMatchObject({
      settings: { tournament: 3, crossoverRate: 0.9 },
      order: 'proposal',
      share: 6,
    })
    expect(planned?.islands[3]).toMatchObject({ settings: { tournament: 5 } })
    expect(planned?.islands[3]?.operators.lengths?.crossover).toEqual({
      operator: 'sbx',
      settings: { index: 5 },
    })
    expect(planned?.islands[0]?.operators.material?.mutation).toEqual({ operator: 'reset', settings: {} })
    expect(planned?.controls).toHaveLength(1)
    expect(planned?.controls[0]).toMatchObject({
      island: 1001,
      method: 'drift',
      population: 160,
      lookahead: 24,
    })
    expect(planned?.migration).toMatchObject({ everyRounds: 20, lag: 1, leave: 'best', arrive: 'if-better' })
    expect(planned?.confirm.fraction).toBe(0.02)
  })
  it('may name several controls, each with the number of its own', () => {
    const text = edited(
      'control: { kind: drift, budget: same }',
      'control: [{ kind: drift }, { kind: random-sampling }]',
    )
    expect(plan(text).plan?.controls.map(({ island, method }) => [island, method])).toEqual([
      [1001, 'drift'],
      [1002, 'random-sampling'],
    ])
  })
})

describe('a mistake in the text', () => {
  it('names the field that a typo was meant to be', () => {
    const finding = refused(edited('lookahead: 6 }', 'lookahed: 6, lookahead: 6 }'))
    expect(finding).toMatchObject({
      code: 'unknown-field',
      field: 'islands[0].lookahed',
      place: { line: 8, column: 55 },
    })
    expect(finding.advice).toBe('Did you mean "lookahead"?')
  })
  it('names the top-level field that a typo was meant to be', () => {
    expect(refused(`${goodFile}genoms: all\n`).advice).toBe('Did you mean "genomes"?')
  })
  it('names the option that a typo was meant to be', () => {
    const finding = refused(edited('topology: ring', 'topology: rign'))
    expect(finding).toMatchObject({ found: 'the text "rign"', place: { line: 16, column: 56 } })
    expect(finding.advice).toBe('Did you mean "ring"?')
  })
  it('names the method that a typo was meant to be, and lists all', () => {
    const finding = refused(edited('count: 3, method: steady-state', 'count: 3, method: stedy_state'))
    expect(finding).toMatchObject({ field: 'islands[0].method', advice: 'Did you mean "steady-state"?' })
    expect(finding.expected).toContain('nsga-ii')
  })
  it('shows both the place and the name of a duplicate field', () => {
    const finding = refused(`${goodFile}seed: 8\n`)
    expect(finding).toMatchObject({ code: 'duplicate-key', field: 'seed', place: { line: 18, column: 1 } })
    expect(finding.found).toContain('second time')
  })
  it('refuses aliases before anything grows', () => {
    const bomb = ['a: &a [x, x, x, x, x, x, x, x, x]']
    for (let i = 1; i < 10; i++) {
      const [name, last] = ['abcdefghijk'[i], 'abcdefghijk'[i - 1]]
      bomb.push(`${name}: &${name} [${Array(9).fill(`*${last}`).join(', ')}]`)
    }
    const read = readSearchFile(bomb.join('\n'), tables)
    expect(read.file).toBeUndefined()
    expect(read.findings[0]).toMatchObject({ code: 'alias-refused', place: { line: 1 } })
    expect(read.findings.length).toBeLessThanOrEqual(20)
  })
  it('refuses a merge key and a tag', () => {
    expect(refused(edited('seed: 7', 'seed: !mine 7')).found).toContain('!mine')
    expect(refused(`${goodFile}<<: { a: 1 }\n`).found).toContain('<<')
  })
  it('survives nesting that is deeper than the stack', () => {
    for (const text of [
      '['.repeat(200_000),
      '- '.repeat(200_000),
      '[\n'.repeat(900),
      '{ a: '.repeat(60) + '}'.repeat(60),
    ]) {
      const read = readSearchFile(text, tables)
      expect(read.file).toBeUndefined()
      expect(read.findings.length).toBeGreaterThan(0)
    }
  })
  it('refuses a file that is too large, and an empty one', () => {
    expect(refused(`# ${'x'.repeat(2 ** 20)}`).code).toBe('file-too-large')
    expect(refused('').found).toBe('an empty file')
    expect(refused('- a\n- b\n').found).toBe('no fields')
  })
  it('points at the line of a tab or a broken quote', () => {
    const broken = readSearchFile('name: mount\nproblem: "./problem.ts\nseed: 7\n', tables).findings
    expect(broken[0]!.code).toBe('not-yaml')
    const tab = readSearchFile('name: mount\nbudget:\n\tsimulations: 4\n', tables).findings
    expect(tab[0]).toMatchObject({ place: { line: 3 }, expected: 'spaces for indentation' })
  })
  it('makes escape characters of the file harmless in the message', () => {
    const text = printFindings('search.yaml', plan(`${goodFile}"\\e[2Jx\\u202e": 1\n`).findings)
    expect(text).not.toMatch(/(?!\n)[\p{Cc}\u202e]/u)
  })
})

describe('a value of the wrong type', () => {
  it('is shown with line, column, kind and what was expected', () => {
    const finding = refused(edited('seed: 7', 'seed: seven'))
    expect(finding).toMatchObject({
      code: 'wrong-type',
      field: 'seed',
      place: { line: 3, column: 7 },
      found: 'the text "seven"',
    })
    expect(finding.expected).toBe('a whole number from 0')
    expect(printFinding('search.yaml', finding)).toMatch(/^search\.yaml:3:7 {2}refused: seed\n/)
  })
  it('is found deep inside a union too', () => {
    expect(refused(edited('emigrants: 2', 'emigrants: two'))).toMatchObject({
      field: 'migration.emigrants',
      place: { line: 16, column: 43 },
    })
    expect(refused(edited('kind: drift', 'kind: [drift]')).field).toBe('control.kind')
  })
  it('includes numbers that are not whole, too large to be exact, negative or infinite', () => {
    expect(refused(edited('seed: 7', 'seed: 7.5')).found).toBe('the number 7.5')
    expect(refused(edited('seed: 7', 'seed: 9007199254740993')).field).toBe('seed')
    expect(refused(edited('seed: 7', 'seed: -1')).field).toBe('seed')
    expect(refused(edited('simulations: 20000', 'simulations: .inf')).field).toBe('budget.simulations')
    expect(refused(edited('seed: 7', 'seed: .nan')).field).toBe('seed')
  })
  it('asks for the unit of an interval', () => {
    expect(refused(edited('every: 20 rounds', 'every: 20')).expected).toContain('such as 20 rounds')
  })
  it('asks for the offset of a date', () => {
    expect(
      refused(edited('{ simulations: 20000 }', '{ simulations: 20000, until: 2026-12-24 }')).expected,
    ).toContain('+01:00')
  })
  it('says which field is missing', () => {
    expect(refused(edited('seed: 7\n', ''))).toMatchObject({
      code: 'missing-field',
      field: 'seed',
      advice: 'Add the field.',
    })
    expect(refused(edited('budget: { simulations: 20000 }', 'budget: { coreHours: 3 }')).field).toBe(
      'budget.simulations',
    )
  })
  it('does not take names of JavaScript for fields', () => {
    for (const name of ['__proto__', 'constructor', 'toString']) {
      expect(refused(`${goodFile}${name}: 3\n`).code).toBe('unknown-field')
    }
    expect(refused(edited('settings: { tournament: 5 }', 'settings: { constructor: 5 }')).code).toBe(
      'unknown-field',
    )
    expect(refused(edited('      lengths: {', '      toString: {')).code).toBe('unknown-field')
  })
})

describe('several mistakes', () => {
  it('are all shown at once, in the order of the file', () => {
    const text = edited('seed: 7', 'seed: seven')
      .replace('topology: ring', 'topology: rign')
      .replace('tournament: 5', 'turnament: 5')
    const { findings } = plan(text)
    expect(findings.map(({ field }) => field)).toEqual([
      'seed',
      'islands[1].settings.turnament',
      'migration.topology',
    ])
    const refusal = refusalOf('search.yaml', findings)!
    expect(refusal.exitCode).toBe(78)
    const printed = renderRefusal(refusal)
    for (const finding of findings)
      expect(printed).toContain(`search.yaml:${finding.place.line}:${finding.place.column}`)
  })
})

describe('a mistake', () => {
  it('hides no other one: in the same group, and between fields that are right by themselves', () => {
    const text = edited('count: 3, method: steady-state,', 'cuont: 3, method: steady-sate,')
      .replace('seed: 7', 'seed: seven')
      .replace('most: 16', 'most: 2')
    const { findings, plan: planned } = plan(text)
    expect(planned).toBeUndefined()
    expect(findings.map(({ field }) => field)).toEqual([
      'seed',
      'replicates.most',
      'islands[0].cuont',
      'islands[0].method',
    ])
  })
  it('is told once: a value of the wrong type needs no word about its size', () => {
    expect(refused(edited('settings: { tournament: 5 }', 'settings: { tournament: [5] }')).code).toBe(
      'wrong-type',
    )
  })
})

describe('an impossible value', () => {
  const cases: readonly [string, string, string, string, RegExp][] = [
    ['more emigrants than members', 'emigrants: 2', 'emigrants: 50', 'migration.emigrants', /at most 40/],
    ['a torus that does not fit', 'topology: ring', 'topology: torus-4', '', /rows times columns/],
    ['a top-up beyond most', 'topUp: 4', 'topUp: 13', 'replicates.topUp', /at most 12/],
    ['most below first', 'first: 4', 'first: 20', 'replicates.most', /at least first/],
    [
      'a tournament above the population',
      'tournament: 5',
      'tournament: 41',
      'islands[1].settings.tournament',
      /at most 40/,
    ],
    [
      'a setting out of its bounds',
      'tournament: 5',
      'tournament: 0',
      'islands[1].settings.tournament',
      /whole number from 1/,
    ],
    [
      'a budget below one evaluation an island',
      'simulations: 20000',
      'simulations: 15',
      'budget.simulations',
      /at least 4/,
    ],
    [
      'share on some groups only',
      'population: 40, lookahead: 6 }',
      'population: 40, lookahead: 6, share: 2 }',
      'islands[1]',
      /every group/,
    ],
    [
      'an unknown part of the genome',
      '      lengths: {',
      '      length: {',
      'islands[1].operators.length',
      /lengths or material/,
    ],
    [
      'an operator of another encoding',
      '      lengths: {',
      '      material: {',
      'islands[1].operators.material.crossover.operator',
      /uniform/,
    ],
    [
      'an operator setting out of bounds',
      'index: 5',
      'index: 500',
      'islands[1].operators.lengths.crossover.settings.index',
      /from 0 to 100/,
    ],
  ]
  for (const [what, piece, by, field, expected] of cases) {
    it(`is refused with its reason: ${what}`, () => {
      // The torus needs a number of islands that is no product.
      const text = what.includes('torus')
        ? edited(piece, by).replace('count: 3', 'count: 4')
        : edited(piece, by)
      const finding = refused(text)
      expect(finding.field).toBe(field || 'migration.topology')
      expect(finding.expected).toMatch(expected)
      expect(finding.place.line).toBeGreaterThan(1)
    })
  }
  it('is refused with its reason: a method for one objective where there are two', () => {
    const findings = plan(goodFile, twoObjectives).findings
    expect(findings.map(({ field }) => field)).toEqual(['islands[0].method', 'islands[1].method'])
    expect(findings[0]!.expected).toContain('nsga-ii')
  })
  it('is refused with its reason: a licence that the site does not have, with the name that was meant', () => {
    const solving = { ...problem, needs: { cores: 1, memoryMB: 1024, tokens: { 'flow-solver': 2 } } }
    expect(refused(`${goodFile}tokens: { flow-solvr: 4 }\n`, solving)).toMatchObject({
      code: 'impossible-value',
      field: 'tokens',
      found: 'nothing of the licence flow-solver',
      advice: 'The problem asks for "flow-solver": did the file mean that by "flow-solvr"?',
    })
    expect(refused(goodFile, solving).advice).toContain('tokens: { flow-solver: 2 }')
    expect(refused(`${goodFile}tokens: { flow-solver: 1 }\n`, solving)).toMatchObject({
      field: 'tokens.flow-solver',
      found: '1 of the licence flow-solver',
    })
    expect(plan(`${goodFile}tokens: { flow-solver: 2 }\n`, solving).findings).toEqual([])
  })
  it('is refused: licences that are no numbers, and names that are none', () => {
    expect(refused(`${goodFile}tokens: { flow: many }\n`)).toMatchObject({ field: 'tokens.flow' })
    expect(refused(`${goodFile}tokens: { "a:b": 1 }\n`).expected).toContain('letters, digits')
    expect(refused(`${goodFile}tokens: 3\n`)).toMatchObject({ code: 'wrong-type', field: 'tokens' })
  })
  it('is refused at once: thousands of islands', () => {
    const text = edited('count: 3,', 'count: 1000,').replace('count: 1\n', 'count: 1000\n')
    const finding = refused(text)
    expect(finding).toMatchObject({
      field: 'islands',
      found: '2000 islands in all',
      expected: 'at most 1000',
    })
  })
  it('covers the default of a setting', () => {
    const text = edited(
      'count: 3, method: steady-state, population: 40, lookahead: 6',
      'count: 3, method: steady-state, population: 2, lookahead: 2',
    )
    expect(refused(text).found).toBe('tournament 3 on an island of 2')
  })
})

describe('a poor value', () => {
  it('is a warning: a licence that nobody asks for', () => {
    expect(warned(`${goodFile}tokens: { flow: 3 }\n`).field).toBe('tokens.flow')
  })
  it('is a warning: a lookahead above the population', () => {
    expect(warned(edited('population: 40, lookahead: 6', 'population: 5, lookahead: 6')).field).toBe(
      'islands[0].lookahead',
    )
  })
  it('is a warning: lookaheads below the expected workers', () => {
    expect(warned(edited('workersExpected: 8', 'workersExpected: 100')).advice).toContain('76 workers')
  })
  it('is a warning: a budget of less than two generations', () => {
    const text = edited('simulations: 20000', 'simulations: 1200').replace(
      /^migration.*$/m,
      'migration: none',
    )
    const warnings = plan(text).findings
    expect(warnings.map(({ severity, field }) => [severity, field])).toEqual([
      ['warning', 'budget.simulations'],
      ['warning', 'budget.simulations'],
    ])
  })
  it('is a warning: migration that comes after the end', () => {
    expect(warned(edited('every: 20 rounds', 'every: 2000 rounds')).field).toBe('migration.every')
  })
  it('is a warning: migration more often than an island evaluates anything', () => {
    const costly = planSearch(readSearchFile(goodFile, tables), problem, tables, { meanCost: 24.3 })
    expect(costly.findings).toHaveLength(1)
    expect(costly.findings[0]).toMatchObject({ severity: 'warning', field: 'migration.every' })
    expect(costly.findings[0]!.expected).toContain('240 rounds')
    expect(costly.findings[0]!.advice).toContain('an evaluation costs about 24.3')
    const cheap = planSearch(readSearchFile(goodFile, tables), problem, tables, { meanCost: 20 })
    expect(cheap.findings).toEqual([])
  })
  it('is a warning: an island that would work on alone at the end', () => {
    const shares = goodFile
      .replace('lookahead: 6 }', 'lookahead: 6, share: 1 }')
      .replace('    lookahead: 6\n', '    lookahead: 6\n    share: 3\n')
    const late = warned(shares)
    expect(late.field).toBe('islands[1]')
    expect(late.advice).toContain('only 6 evaluations would be under way')
    expect(plan(shares.replace('share: 3', 'share: 2')).findings).toEqual([])
  })
  it('is a warning: several islands without a word about migration', () => {
    expect(
      warned(edited('migration: { every: 20 rounds, emigrants: 2, topology: ring, lag: 1 }\n', '')).expected,
    ).toContain('none')
  })
  it('is a warning: order arrival, which cannot be repeated from the file', () => {
    expect(
      warned(edited('population: 40, lookahead: 6 }', 'population: 40, lookahead: 6, order: arrival }'))
        .advice,
    ).toContain('not repeated')
  })
  it('is a warning: a last top-up that is smaller', () => {
    expect(warned(edited('most: 16', 'most: 15')).field).toBe('replicates.most')
  })
  it('is a warning: a date that is past', () => {
    const text = edited('{ simulations: 20000 }', '{ simulations: 20000, until: 2026-01-01T00:00:00Z }')
    expect(warned(text, Date.parse('2026-06-01T00:00:00Z')).field).toBe('budget.until')
    expect(plan(text, problem, Date.parse('2025-06-01T00:00:00Z')).findings).toEqual([])
  })
})
