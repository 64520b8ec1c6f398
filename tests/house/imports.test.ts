import { readFileSync } from 'node:fs'
import { join } from 'node:path'
import { expect, test } from 'vitest'
import { importViolations, packageOf, packageOwners } from './imports.js'
import { importsOf, isTest, readSources, root, show } from './source.js'

const fixture = (path: string, text: string) => show(importViolations([{ path, text }]))

test('all imports go one way and every package is used by its owner only', () => {
  expect(show(importViolations(readSources()))).toEqual([])
})

test('every form of import against the direction is caught, with its line and what is allowed', () => {
  const forms = [
    "import { x } from '../engine/x.js'",
    "import type { X } from '../engine/x.js'",
    "import '../engine/x.js'",
    "export * from '../engine/x.js'",
    "export { x } from '../engine/x.js'",
    "export type { X } from '../engine/x.js'",
    "const x = await import('../engine/x.js')",
    'const x = await import(`../engine/x.js`)',
    "let x: import('../engine/x.js').X",
    "const x = require('../engine/x.js')",
  ]
  for (const form of forms) {
    expect(fixture('coordinator/evolution/a.ts', `// first line\n${form}\n`), form).toEqual([
      'coordinator/evolution/a.ts:2 imports coordinator/engine/x.js; allowed: shared and itself',
    ])
  }
})

test('an import named only in a comment or a string is none', () => {
  expect(
    fixture('shared/a.ts', "// import '../sim/x.js'\nexport const a = \"import '../sim/x.js'\""),
  ).toEqual([])
})

test('types of evolution may reach the record, values may not', () => {
  expect(fixture('coordinator/record/a.ts', "import type { A } from '../evolution/types.js'")).toEqual([])
  expect(fixture('coordinator/record/a.ts', "import { type A } from '../evolution/types.js'")).toEqual([])
  expect(
    fixture('coordinator/record/a.ts', "import { type A, b } from '../evolution/types.js'"),
  ).toHaveLength(1)
})

test('a third-party package outside its owner folder, or without an owner, is caught', () => {
  expect(fixture('coordinator/cli/a.ts', "import Database from 'better-sqlite3'")).toEqual([
    'coordinator/cli/a.ts:1 imports package better-sqlite3; allowed: only coordinator/record, its owner',
  ])
  expect(fixture('sim/a.ts', "import _ from 'left-pad'")).toEqual([
    'sim/a.ts:1 imports package left-pad, which has no owner in tests/house/imports.ts',
  ])
})

test('a file outside every folder of the table is caught', () => {
  expect(fixture('coordinator/attic/a.ts', 'export const a = 1')).toEqual([
    'coordinator/attic/a.ts:1 lies in no folder of the import table',
  ])
})

test('each dependency has an owner that really imports it, and each owner row is a dependency', () => {
  const { dependencies } = JSON.parse(readFileSync(join(root, 'package.json'), 'utf8'))
  expect(Object.keys(packageOwners).sort()).toEqual(Object.keys(dependencies).sort())
  const imported = readSources()
    .filter((source) => !isTest(source.path))
    .flatMap((source) => importsOf(source).map((one) => packageOf(one.specifier ?? '')))
  const unused = Object.keys(packageOwners).filter((name) => !imported.includes(name))
  expect(unused).toEqual([])
})
