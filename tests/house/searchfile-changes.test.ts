// Editing the file of a running search: what is free, what is journalled, what is another search.

import { describe, expect, it } from 'vitest'
import {
  changeTable,
  diffSearchFiles,
  printChanges,
  rowOf,
} from '../../coordinator/cli/searchfile/changes.js'
import { namesAt } from '../../coordinator/cli/searchfile/explain.js'
import { fields } from '../../coordinator/cli/searchfile/schema.js'
import { edited, goodFile } from './searchfile-fixture.js'

function one(text: string) {
  const rows = diffSearchFiles(goodFile, text)
  expect(rows).toHaveLength(1)
  return rows[0]!
}

describe('an edited search file', () => {
  it('differs in nothing when only layout, comments or written-out defaults changed', () => {
    expect(
      diffSearchFiles(
        goodFile,
        `# a comment\n${goodFile}\ngenomes: survivors\nconfirm: { fraction: 0.02 }\n`,
      ),
    ).toEqual([])
  })
  it('shows a budget as a journalled change with old, new, line and column', () => {
    expect(one(edited('simulations: 20000', 'simulations: 40000'))).toMatchObject({
      field: 'budget.simulations',
      old: '20000',
      new: '40000',
      kind: 'next-epoch',
      place: { line: 5, column: 24 },
    })
  })
  it('shows cores and port as free', () => {
    expect(one(`${goodFile}cores: 4\n`)).toMatchObject({ old: 'absent', kind: 'free' })
  })
  it('shows a seed as another search', () => {
    expect(one(edited('seed: 7', 'seed: 8')).kind).toBe('branch')
  })
  it('takes islands added at the end, and refuses ones that would renumber others', () => {
    expect(one(edited('count: 1', 'count: 2')).kind).toBe('next-epoch')
    expect(one(edited('count: 3', 'count: 4')).kind).toBe('branch')
    const more = edited('migration:', '  - { method: steady-state, lookahead: 6 }\nmigration:')
    const rows = diffSearchFiles(goodFile, more)
    expect(rows.length).toBeGreaterThan(1)
    expect(new Set(rows.map(({ kind }) => kind))).toEqual(new Set(['next-epoch']))
    expect(new Set(diffSearchFiles(more, goodFile).map(({ kind }) => kind))).toEqual(new Set(['next-epoch']))
  })
  it('prints one line a difference', () => {
    const text = printChanges('search.yaml', diffSearchFiles(goodFile, edited('seed: 7', 'seed: 8')))
    expect(text.split('\n')).toHaveLength(2)
    expect(text).toMatch(/search\.yaml:3:7 +seed +7 +8 +needs a new record/)
  })
})

describe('the table of changes', () => {
  it('has a row for every field of the schema, and none for a field that does not exist', () => {
    for (const field of Object.keys(fields)) expect(changeTable, field).toHaveProperty([field])
    for (const name of namesAt(fields.islands, [0])) expect(changeTable).toHaveProperty([`islands[].${name}`])
    for (const field of Object.keys(changeTable)) {
      const [root, ...rest] = field.replace('[]', '').split('.')
      const schema = fields[root as keyof typeof fields]
      expect(schema, field).toBeDefined()
      const path = root === 'islands' ? [0] : []
      if (rest[0]) expect(namesAt(schema, path)).toContain(rest[0])
    }
  })
  it('lets the longest row decide', () => {
    expect(rowOf(['replicates', 'most']).kind).toBe('next-epoch')
    expect(rowOf(['replicates', 'first']).kind).toBe('branch')
    expect(rowOf(['islands', 3, 'settings', 'tournament']).kind).toBe('branch')
  })
})
