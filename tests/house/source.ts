// Reading our own sources: which files there are, their syntax trees, and what they import.
// Parsed by the parser that comes with vite, so that comments, strings and templates cannot deceive a check.

import { existsSync, readdirSync, readFileSync } from 'node:fs'
import { dirname, join, posix, relative, sep } from 'node:path'
import { fileURLToPath } from 'node:url'
import { parseSync } from 'vite'

export const root = join(dirname(fileURLToPath(import.meta.url)), '..', '..')
const sourceFolders = ['shared', 'sim', 'worker', 'coordinator', 'tests']
// wasm: AssemblyScript, which only its own compiler understands.
const notOurs = new Set(['node_modules', 'dist', 'records', 'fixtures', 'wasm'])

/** A node of the syntax tree (ESTree with TypeScript), as far as the checks look at it. */
export interface SyntaxNode {
  readonly type: string
  readonly start: number
  readonly end: number
  readonly [field: string]: unknown
}

/** A source file; `path` is relative to the repository, with '/'. Tests make them from strings. */
export interface Source {
  readonly path: string
  readonly text: string
}

/** One complaint: where, and what to do. */
export interface Violation {
  readonly path: string
  readonly line: number
  readonly text: string
}

export function show(violations: readonly Violation[]): string[] {
  return violations.map((one) => `${one.path}:${one.line} ${one.text}`)
}

export function lineAt(text: string, offset: number): number {
  return text.slice(0, offset).split('\n').length
}

export function isTest(path: string): boolean {
  return path.endsWith('.test.ts') || path.startsWith('tests/')
}

function* filesBelow(folder: string): Generator<string> {
  if (!existsSync(folder)) return
  for (const entry of readdirSync(folder, { withFileTypes: true })) {
    if (notOurs.has(entry.name)) continue
    const path = join(folder, entry.name)
    if (entry.isDirectory()) yield* filesBelow(path)
    else yield path
  }
}

/** Every TypeScript and JavaScript source of ours, sorted by path. */
export function readSources(): Source[] {
  return sourceFolders
    .flatMap((folder) => [...filesBelow(join(root, folder))])
    .filter((file) => /\.(ts|mjs|js)$/.test(file) && !file.endsWith('.d.ts'))
    .map((file) => ({ path: relative(root, file).split(sep).join('/'), text: readFileSync(file, 'utf8') }))
    .sort((a, b) => (a.path < b.path ? -1 : 1))
}

const trees = new Map<string, SyntaxNode>()

/** The syntax tree. Throws with the file's name when the source does not parse. */
export function parse(source: Source): SyntaxNode {
  const key = `${source.path}\0${source.text}`
  const known = trees.get(key)
  if (known) return known
  const { program, errors } = parseSync(source.path, source.text)
  if (errors.length > 0) throw new Error(`${source.path} does not parse: ${errors[0]?.message}`)
  trees.set(key, program as unknown as SyntaxNode)
  return program as unknown as SyntaxNode
}

function isNode(value: unknown): value is SyntaxNode {
  return typeof value === 'object' && value !== null && typeof (value as SyntaxNode).type === 'string'
}

/** Calls `visit` for every node with its parents, outermost first; a visit that returns false skips the inside. */
export function walk(
  node: SyntaxNode,
  visit: (node: SyntaxNode, parents: readonly SyntaxNode[]) => boolean | undefined,
  parents: readonly SyntaxNode[] = [],
): void {
  if (visit(node, parents) === false) return
  const inside = [...parents, node]
  for (const value of Object.values(node)) {
    if (Array.isArray(value)) {
      for (const child of value) if (isNode(child)) walk(child, visit, inside)
    } else if (isNode(value)) walk(value, visit, inside)
  }
}

export interface Import {
  /** As written; undefined for a dynamic import of something that is not a plain string. */
  readonly specifier: string | undefined
  readonly line: number
  readonly typeOnly: boolean
}

/** 'x' of a plain string node, or of a template without holes. */
export function plainString(node: unknown): string | undefined {
  if (!isNode(node)) return undefined
  if (node.type === 'Literal' && typeof node.value === 'string') return node.value
  if (node.type === 'TemplateLiteral') {
    const { quasis } = node as unknown as { quasis: { value: { cooked: string } }[] }
    return quasis.length === 1 ? quasis[0]!.value.cooked : undefined
  }
  return undefined
}

function everyNameIsType(node: SyntaxNode): boolean {
  if (node.importKind === 'type' || node.exportKind === 'type') return true
  const names = (node.specifiers ?? []) as SyntaxNode[]
  return names.length > 0 && names.every((name) => name.importKind === 'type' || name.exportKind === 'type')
}

function isRequire(node: SyntaxNode): boolean {
  const callee = node.callee as SyntaxNode | undefined
  return node.type === 'CallExpression' && callee?.type === 'Identifier' && callee.name === 'require'
}

/** All imports of a file: import, export from, import(), require(), and `import('x')` in a type. */
export function importsOf(source: Source): Import[] {
  const found: Import[] = []
  const add = (node: SyntaxNode, specifier: string | undefined, typeOnly: boolean) => {
    found.push({ specifier, line: lineAt(source.text, node.start), typeOnly })
  }
  walk(parse(source), (node) => {
    const { type } = node
    if (type === 'ImportDeclaration') add(node, plainString(node.source), everyNameIsType(node))
    else if (type === 'ExportAllDeclaration') add(node, plainString(node.source), node.exportKind === 'type')
    else if (type === 'ExportNamedDeclaration' && node.source)
      add(node, plainString(node.source), everyNameIsType(node))
    else if (type === 'ImportExpression') add(node, plainString(node.source), false)
    else if (type === 'TSImportType') add(node, plainString(node.source), true)
    else if (isRequire(node)) add(node, plainString((node.arguments as unknown[])[0]), false)
    return undefined
  })
  return found
}

/** The repository path behind a relative specifier ('.js' names the '.ts' it is made from), or undefined. */
export function resolveImport(
  from: string,
  specifier: string,
  paths: ReadonlySet<string>,
): string | undefined {
  const path = posix.normalize(posix.join(posix.dirname(from), specifier))
  return [path.replace(/\.js$/, '.ts'), path].find((candidate) => paths.has(candidate))
}
