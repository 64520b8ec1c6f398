// tests/faults.md names, for every fault that belongs to search and cluster, the tests that show what must hold.

import { existsSync, readdirSync, readFileSync } from 'node:fs'
import { join } from 'node:path'
import { describe, expect, test } from 'vitest'
import { readDocument } from './documents.js'
import { root } from './source.js'

const span = (first: number, last: number) => Array.from({ length: last - first + 1 }, (_, i) => first + i)
const mine = [...span(1, 5), ...span(10, 48), ...span(53, 55)]
/** Known to have no test; a row that gets one leaves this list and that of the document. */
const notShownYet = [15]

const [shown = '', notShown = ''] = readDocument('tests/faults.md').split('## Not shown yet')
const cellsOf = (text: string) =>
  text
    .split('\n')
    .filter((line) => /^\| \d+ \|/.test(line))
    .map((line) =>
      line
        .slice(1, -1)
        .split(' | ')
        .map((cell) => cell.trim()),
    )
const rows = cellsOf(shown)

test('the table of faults has every row once, in order, or says that it is not shown yet', () => {
  const unshown = cellsOf(notShown).map(([number]) => Number(number))
  expect(unshown).toEqual(notShownYet)
  const numbers = rows.map(([number]) => Number(number))
  expect(numbers).toEqual(mine.filter((number) => !notShownYet.includes(number)))
})

test('the table of faults is linked from DEVELOPERS.md', () => {
  expect(readDocument('DEVELOPERS.md')).toContain('(tests/faults.md)')
})

describe('row', () => {
  test.each(rows)('%s (%s) says what is seen, what never happens, and names tests that exist', (...cells) => {
    expect(cells).toHaveLength(5)
    for (const cell of cells) expect(cell).not.toBe('')
    const named = [...cells[4]!.matchAll(/`([^`]+)` "([^"]+)"/g)]
    expect(named.length).toBeGreaterThan(0)
    // Nothing stands in the last column but such pairs.
    expect(named.map(([pair]) => pair).join('; ')).toBe(cells[4])
    for (const [, file = '', name = ''] of named) {
      expect(existsSync(join(root, file)), `${file} exists`).toBe(true)
      expect(
        titlesOf(file).some((title) => title.includes(name)),
        `${file} has a test "${name}"`,
      ).toBe(true)
    }
  })
})

/** Quoted texts of a file of tests, or of all in a folder, in the places where names of tests stand. */
function titlesOf(place: string): string[] {
  const files = place.endsWith('/')
    ? readdirSync(join(root, place)).filter((name) => name.endsWith('.test.ts'))
    : ['']
  const text = files.map((name) => readFileSync(join(root, place, name), 'utf8')).join('\n')
  const places =
    /(?:\b(?:test|it|describe)(?:\.each\([^`'"]*?\))?\(\s*|\)\(\s*|\bwhat: )(?:'((?:[^'\\\n]|\\.)*)'|`([^`]*)`|"([^"\n]*)")/g
  return [...text.matchAll(places)].map(([, single, template, double]) =>
    (single ?? template ?? double ?? '').replaceAll("\\'", "'"),
  )
}
