// How long files and functions may grow, and files that nothing uses.

import {
  importsOf,
  isTest,
  lineAt,
  parse,
  plainString,
  resolveImport,
  type Source,
  type SyntaxNode,
  type Violation,
  walk,
} from './source.js'

export const fileLinesMost = 500
export const functionLinesMost = 70

const functionTypes = new Set(['FunctionDeclaration', 'FunctionExpression', 'ArrowFunctionExpression'])

export function longFiles(sources: readonly Source[]): Violation[] {
  return sources
    .map(({ path, text }) => ({ path, line: text.trimEnd().split('\n').length }))
    .filter(({ line }) => line > fileLinesMost)
    .map(({ path, line }) => ({
      path,
      line,
      text: `has ${line} lines, at most ${fileLinesMost}: make it a folder`,
    }))
}

/** What people call the function: its own name, or that of the variable, property or method that holds it. */
function nameOf(node: SyntaxNode, parents: readonly SyntaxNode[]): string {
  const named = [node.id, parents.at(-1)?.id, parents.at(-1)?.key].find(
    (one) => (one as SyntaxNode | null)?.name,
  )
  return named ? String((named as SyntaxNode).name) : 'a function without a name'
}

const grouping = new Set(['describe', 'test', 'it'])

/** Whether a function of a test file only groups tests: it calls test(...) or describe(...) as a statement. */
function groupsTests(node: SyntaxNode): boolean {
  let groups = false
  walk(node, (inner, parents) => {
    if (inner !== node && functionTypes.has(inner.type)) return false
    const isCall = inner.type === 'CallExpression' && parents.at(-1)?.type === 'ExpressionStatement'
    if (isCall && grouping.has(firstName(inner.callee as SyntaxNode))) groups = true
    return undefined
  })
  return groups
}

/** 'test' of test(...), test.each(...)(...) and the like. */
function firstName(callee: SyntaxNode): string {
  const inner = (callee.object ?? callee.callee) as SyntaxNode | undefined
  return inner ? firstName(inner) : String(callee.name ?? '')
}

/** Functions past the limit. Suites of a test file, which only group tests, are not counted; their tests are. */
export function longFunctions(sources: readonly Source[]): Violation[] {
  const violations: Violation[] = []
  for (const source of sources) {
    walk(parse(source), (node, parents) => {
      if (!functionTypes.has(node.type)) return undefined
      const first = lineAt(source.text, node.start)
      const lines = lineAt(source.text, node.end) - first + 1
      if (lines <= functionLinesMost || (isTest(source.path) && groupsTests(node))) return undefined
      const text = `${nameOf(node, parents)} has ${lines} lines, at most ${functionLinesMost}: take it apart`
      violations.push({ path: source.path, line: first, text })
      return undefined
    })
  }
  return violations
}

/** Repository paths a file uses: what it imports, and sources it names in a string (threads start from files). */
function usesOf(source: Source, paths: ReadonlySet<string>): string[] {
  const used: string[] = []
  const add = (path: string | undefined) => {
    if (path !== undefined) used.push(path)
  }
  for (const { specifier } of importsOf(source)) {
    if (specifier?.startsWith('.')) add(resolveImport(source.path, specifier, paths))
  }
  walk(parse(source), (node) => {
    const text = plainString(node)
    if (text === undefined || !/^[\w./-]+\.(js|ts|mjs)$/.test(text)) return undefined
    add(resolveImport(source.path, text, paths))
    // The last words of a path that is joined from pieces, such as 'worker/thread.js'.
    const end = `/${text.replace(/^(\.{1,2}\/)+/, '').replace(/\.js$/, '.ts')}`
    for (const path of paths) if (path !== source.path && `/${path}`.endsWith(end)) used.push(path)
    return undefined
  })
  return used
}

/** Sources that cannot be reached from the entries by imports or by name. Tests do not count as users. */
export function unusedFiles(
  sources: readonly Source[],
  entries: readonly string[],
  forTests: readonly string[] = [],
): Violation[] {
  const ours = sources.filter((source) => !isTest(source.path))
  const missing = [...entries, ...forTests].filter((path) => !ours.some((source) => source.path === path))
  if (missing.length > 0)
    return missing.map((path) => ({ path, line: 1, text: 'is expected but does not exist' }))
  const reached = reachedFrom(ours, entries)
  const reachedByTests = reachedFrom(
    sources,
    sources.filter((source) => isTest(source.path)).map((one) => one.path),
  )
  const violations: Violation[] = []
  for (const { path } of ours) {
    const known = forTests.includes(path)
    if (known && reached.has(path))
      violations.push({ path, line: 1, text: 'is used by the program: list it no more' })
    const used = known ? reachedByTests : reached
    if (!used.has(path)) violations.push({ path, line: 1, text: 'is used by nobody: use it or remove it' })
  }
  return violations
}

function reachedFrom(sources: readonly Source[], entries: readonly string[]): Set<string> {
  const byPath = new Map(sources.map((source) => [source.path, source]))
  const paths = new Set(byPath.keys())
  const reached = new Set<string>()
  const queue = [...entries]
  for (let path = queue.pop(); path !== undefined; path = queue.pop()) {
    const source = byPath.get(path)
    if (source === undefined || reached.has(path)) continue
    reached.add(path)
    queue.push(...usesOf(source, paths))
  }
  return reached
}
