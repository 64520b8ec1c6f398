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

/** Functions past the limit. `describe(...)` of a test file only groups, so its function is not counted. */
export function longFunctions(sources: readonly Source[]): Violation[] {
  const violations: Violation[] = []
  for (const source of sources) {
    walk(parse(source), (node, parents) => {
      if (!functionTypes.has(node.type)) return undefined
      const callee = parents.at(-1)?.callee as SyntaxNode | undefined
      const words = callee ? source.text.slice(callee.start, callee.end) : ''
      if (isTest(source.path) && words.startsWith('describe')) return undefined
      const first = lineAt(source.text, node.start)
      const lines = lineAt(source.text, node.end) - first + 1
      if (lines > functionLinesMost) {
        const text = `${nameOf(node, parents)} has ${lines} lines, at most ${functionLinesMost}: take it apart`
        violations.push({ path: source.path, line: first, text })
      }
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
export function unusedFiles(sources: readonly Source[], entries: readonly string[]): Violation[] {
  const ours = sources.filter((source) => !isTest(source.path))
  const paths = new Set(ours.map((source) => source.path))
  const byPath = new Map(ours.map((source) => [source.path, source]))
  const missing = entries.filter((path) => !byPath.has(path))
  if (missing.length > 0)
    return missing.map((path) => ({ path, line: 1, text: 'is an entry but does not exist' }))
  const reached = new Set<string>()
  const queue = [...entries]
  for (let path = queue.pop(); path !== undefined; path = queue.pop()) {
    const source = byPath.get(path)
    if (source === undefined || reached.has(path)) continue
    reached.add(path)
    queue.push(...usesOf(source, paths))
  }
  return ours
    .filter((source) => !reached.has(source.path))
    .map(({ path }) => ({ path, line: 1, text: 'is used by nobody: use it or remove it' }))
}
