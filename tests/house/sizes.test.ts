import { readFileSync } from 'node:fs'
import { join } from 'node:path'
import { expect, test } from 'vitest'
import { longFiles, longFunctions, unusedFiles } from './sizes.js'
import { readSources, root, show } from './source.js'

/** What the world starts: the program, what plug-in authors import, and the script npm runs. */
function entries(): string[] {
  const { bin, exports } = JSON.parse(readFileSync(join(root, 'package.json'), 'utf8'))
  const built: string[] = [...Object.values<string>(bin), exports['.'].default]
  const sources = built.map((path) => path.replace(/^(\.\/)?dist\//, '').replace(/\.js$/, '.ts'))
  return [...sources, 'coordinator/setup/preinstall.mjs']
}

/** Adapters of ports that only tests use, beside the ports' own folders. */
const forTests = [
  'coordinator/record/faulty.ts',
  'coordinator/record/memory.ts',
  'coordinator/record/memory-store.ts',
]

test('no file is longer than 500 lines', () => {
  expect(show(longFiles(readSources()))).toEqual([])
})

test('no function is longer than 70 lines', () => {
  expect(show(longFunctions(readSources()))).toEqual([])
})

test('every file is used by the program, by plug-in authors, or at install', () => {
  expect(show(unusedFiles(readSources(), entries(), forTests))).toEqual([])
})

const lines = (count: number) => '  x()\n'.repeat(count)

test('a file of 501 lines is caught, one of 500 is not', () => {
  expect(show(longFiles([{ path: 'sim/a.ts', text: lines(501) }]))).toHaveLength(1)
  expect(longFiles([{ path: 'sim/a.ts', text: lines(500) }])).toEqual([])
})

test('a function of 71 lines is caught by name in every form, one of 70 is not', () => {
  const of = (text: string) => show(longFunctions([{ path: 'sim/a.ts', text }]))
  expect(of(`function tall() {\n${lines(69)}}`)).toEqual([
    'sim/a.ts:1 tall has 71 lines, at most 70: take it apart',
  ])
  expect(of(`const tall = () => {\n${lines(69)}}`)[0]).toContain('tall has 71')
  expect(of(`class A {\n  tall() {\n${lines(69)}}\n}`)[0]).toContain('tall has 71')
  expect(of(`run(() => {\n${lines(69)}})`)[0]).toContain('a function without a name has 71')
  expect(of(`function fits() {\n${lines(68)}}`)).toEqual([])
})

test('in a test file the suite may be long, a test in it may not', () => {
  const of = (text: string) => show(longFunctions([{ path: 'tests/a.ts', text }]))
  expect(of(`export function suite() {\n${"  test.each([1])('x', () => {})\n".repeat(80)}}`)).toEqual([])
  expect(of(`describe('x', () => {\n  test('y', () => {\n${lines(80)}})\n})`)).toHaveLength(1)
  expect(of(`export function helper() {\n${lines(80)}}`)).toHaveLength(1)
})

test('a file for tests must be used by tests, and by nobody else', () => {
  const sources = [
    { path: 'worker/main.ts', text: "import './a.js'" },
    { path: 'worker/a.ts', text: 'export {}' },
    { path: 'worker/fake.ts', text: 'export {}' },
    { path: 'worker/main.test.ts', text: "import './main.js'" },
  ]
  expect(show(unusedFiles(sources, ['worker/main.ts'], ['worker/a.ts', 'worker/fake.ts']))).toEqual([
    'worker/a.ts:1 is used by the program: list it no more',
    'worker/fake.ts:1 is used by nobody: use it or remove it',
  ])
})

test('a file reached only by tests, or only by itself, is caught; one named as a thread is not', () => {
  const sources = [
    { path: 'worker/main.ts', text: "import './a.js'\nnew Worker(join(here, 'worker/thread.js'))" },
    { path: 'worker/a.ts', text: 'export {}' },
    { path: 'worker/thread.ts', text: 'export {}' },
    { path: 'worker/lonely.ts', text: "import './lonely.js'" },
    { path: 'worker/lonely.test.ts', text: "import './lonely.js'" },
  ]
  expect(show(unusedFiles(sources, ['worker/main.ts']))).toEqual([
    'worker/lonely.ts:1 is used by nobody: use it or remove it',
  ])
})
