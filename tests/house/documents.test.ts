import { existsSync, readFileSync } from 'node:fs'
import { join } from 'node:path'
import { beforeAll, describe, expect, test } from 'vitest'
import { fields } from '../../coordinator/cli/searchfile/schema.js'
import { commands } from '../../coordinator/cli/table.js'
import { documentTables, readDocument, renderTable, tableIn, writeTables } from './documents.js'
import { eventKinds } from './events.js'
import { readSources, root } from './source.js'

const documents = ['README.md', 'DEVELOPERS.md']

beforeAll(() => {
  if (process.env.SKERRY_WRITE_DOCS) writeTables()
})

test.each(documentTables)('$file shows $mark as the code has them (npm run docs mends it)', (table) => {
  expect(table.rows.length).toBeGreaterThan(0)
  expect(tableIn(readDocument(table.file), table.mark)).toBe(renderTable(table))
})

test('every kind of event in the record is explained in DEVELOPERS.md, and no other', () => {
  const section = /^### Kinds of event$([\s\S]*?)(?=^#)/m.exec(readDocument('DEVELOPERS.md'))?.[1] ?? ''
  const items = [...section.matchAll(/^- ((?:`[a-z-]+`(?:, )?)+): \S/gm)].map((match) => match[1]!)
  const explained = items.flatMap((names) => names.replaceAll('`', '').split(', '))
  const used = eventKinds(readSources())
  expect(used.length).toBeGreaterThan(0)
  expect(explained.sort()).toEqual(used)
})

test('every field of the top level of a search file is in the example or the text of README.md', () => {
  const text = readDocument('README.md')
  const missing = Object.keys(fields).filter(
    (field) => !new RegExp(`\`${field}\`|^${field}:`, 'm').test(text),
  )
  expect(missing).toEqual([])
})

describe.each(documents)('%s', (file) => {
  const text = readDocument(file)

  test('names only commands that exist', () => {
    const known = commands.map((command) => command.name)
    const named = [...text.matchAll(/\bskerry ([a-z][a-z-]+)\b/g)].map((match) => match[1]!)
    const inCode = named.filter(
      (name) => text.includes(`\`skerry ${name}`) || text.includes(`\nskerry ${name}`),
    )
    expect(inCode.filter((name) => !known.includes(name))).toEqual([])
  })

  test('names only options that the commands, the test runner or the benchmark have', () => {
    const tools = ['tests/tools/run-tests.mjs', 'tests/bench/main.ts']
    const runner = tools.map((path) => readFileSync(join(root, path), 'utf8')).join('\n')
    const known = new Set(commands.flatMap((command) => command.options.map((option) => option.flag)))
    const named = [...text.matchAll(/(?<![\w-])--([a-z][a-z-]+)/g)].map((match) => match[1]!)
    const usual = ['help', 'json', 'version']
    const unknown = named.filter(
      (name) => !known.has(`--${name}`) && !usual.includes(name) && !runner.includes(`--${name}`),
    )
    expect(unknown).toEqual([])
  })

  test('names only npm scripts that exist', () => {
    const { scripts } = JSON.parse(readFileSync(join(root, 'package.json'), 'utf8'))
    const named = [...text.matchAll(/\bnpm run ([a-z][a-z-]*)/g)].map((match) => match[1]!)
    expect(named.filter((name) => !Object.hasOwn(scripts, name))).toEqual([])
  })

  test('names only files that exist', () => {
    const path = /[`(]((?:\.\/)?(?:shared|sim|worker|coordinator|tests|\.ci)\/[\w./-]*)[`)]/g
    const named = [...text.matchAll(path)].map((match) => match[1]!)
    expect(named.filter((name) => !existsSync(join(root, name)))).toEqual([])
  })
})
