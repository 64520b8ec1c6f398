// What the pure core may not touch, and what to use instead: Node, clocks, timers, entropy, the process, the
// host's locale, and host functions whose last bit differs between processors.

import { isNodeModule } from './imports.js'
import {
  importsOf,
  isTest,
  lineAt,
  parse,
  type Source,
  type SyntaxNode,
  type Violation,
  walk,
} from './source.js'

export const pureFolders = ['shared', 'sim', 'coordinator/evolution', 'coordinator/engine']

const clock = 'time comes in as an argument'
const timer = 'waiting is the business of main.ts and the adapters'
const entropy = 'draw from a stream of shared/streams.ts'
const outside = 'let the caller pass it in as an argument'
const collector = 'its answer depends on the garbage collector; keep what you need by id'

/** Global names and their replacement. */
const globals: { readonly [name: string]: string } = {
  Date: clock,
  performance: clock,
  setTimeout: timer,
  setInterval: timer,
  setImmediate: timer,
  clearTimeout: timer,
  clearInterval: timer,
  clearImmediate: timer,
  requestAnimationFrame: timer,
  requestIdleCallback: timer,
  queueMicrotask: timer,
  crypto: `${entropy}; for digests shared/digests.ts`,
  process: outside,
  Buffer: 'use Uint8Array',
  require: 'import it',
  module: 'export it',
  __dirname: outside,
  __filename: outside,
  global: 'name what you mean',
  globalThis: 'name what you mean',
  window: outside,
  self: outside,
  navigator: outside,
  fetch: outside,
  console: 'return what there is to say',
  Intl: 'it depends on the host; format by hand',
  WeakRef: collector,
  FinalizationRegistry: collector,
  eval: 'write the code out',
  Function: 'write the code out',
}

/** Members whose result depends on the host's language or version. */
const members: { readonly [name: string]: string } = {
  localeCompare: 'compare with < and >',
  toLocaleString: 'it depends on the host; format by hand',
  toLocaleLowerCase: 'use toLowerCase',
  toLocaleUpperCase: 'use toUpperCase',
}

/** Exact by the language standard or plain constants; everything else of Math is in shared/detmath or nowhere. */
const exactMath = new Set([
  ...['abs', 'ceil', 'clz32', 'floor', 'fround', 'imul', 'max', 'min', 'round', 'sign', 'sqrt', 'trunc'],
  ...['PI', 'E', 'LN2', 'LN10', 'LOG2E', 'LOG10E', 'SQRT2', 'SQRT1_2'],
])

/** Expressions that look like types to the parser but hold values. */
const holdsValues = new Set([
  'TSAsExpression',
  'TSSatisfiesExpression',
  'TSNonNullExpression',
  'TSInstantiationExpression',
])

type Report = (node: SyntaxNode, text: string) => void

function nameOf(node: unknown): string | undefined {
  const one = node as SyntaxNode | undefined
  return one?.type === 'Identifier' ? (one.name as string) : undefined
}

/** Whether this identifier is only the name of a property, not a value that is read. */
function isPropertyName(node: SyntaxNode, parent: SyntaxNode | undefined): boolean {
  if (parent === undefined) return false
  if (parent.type === 'MemberExpression') return parent.property === node && parent.computed !== true
  const keyed = ['Property', 'MethodDefinition', 'PropertyDefinition', 'AccessorProperty']
  return keyed.includes(parent.type) && parent.key === node && parent.computed !== true
}

const binders = new Set(['VariableDeclarator', 'FunctionDeclaration', 'ClassDeclaration'])

/** Names that the file itself declares at its top level or imports: these hide the global of that name. */
function declaredAtTop(program: SyntaxNode): Set<string> {
  const names = new Set<string>()
  walk(program, (node, parents) => {
    if (node.type === 'ImportDeclaration') {
      for (const one of node.specifiers as SyntaxNode[]) names.add(nameOf(one.local) ?? '')
    }
    if (binders.has(node.type) && parents.length <= 3) names.add(nameOf(node.id) ?? '')
    return node.type !== 'BlockStatement'
  })
  return names
}

/** Names bound by the parameters and declarations of the functions and blocks around a node. */
function isBoundAround(name: string, parents: readonly SyntaxNode[]): boolean {
  return parents.some((parent) => {
    const params = (parent.params ?? []) as SyntaxNode[]
    const plain = params.map((one) => nameOf(one) ?? nameOf(one.left))
    if (plain.includes(name)) return true
    const body = parent.type === 'BlockStatement' ? (parent.body as SyntaxNode[]) : []
    return body.some((statement) => {
      if (nameOf(statement.id) === name) return true
      const declarations = (statement.declarations ?? []) as SyntaxNode[]
      return declarations.some((one) => nameOf(one.id) === name)
    })
  })
}

function checkMath(node: SyntaxNode, parent: SyntaxNode | undefined, report: Report): void {
  const isPlainMember =
    parent?.type === 'MemberExpression' && parent.object === node && parent.computed !== true
  if (!isPlainMember) {
    report(node, 'Math may only be used as Math.name, so that this check can see the name')
    return
  }
  const name = nameOf(parent.property) ?? ''
  if (exactMath.has(name)) return
  const instead = name === 'random' ? entropy : `use ${name} of shared/detmath`
  report(node, `Math.${name}: ${instead}`)
}

/** a ** b is the host's pow; exact only for small integers that are written out. */
function checkPower(node: SyntaxNode, report: Report): void {
  if (node.type !== 'BinaryExpression' && node.type !== 'AssignmentExpression') return
  if (node.operator !== '**' && node.operator !== '**=') return
  const [left, right] = [node.left, node.right].map((side) => (side as SyntaxNode).value)
  if (typeof left === 'bigint' || typeof right === 'bigint') return
  const written = Number.isInteger(left) && Number.isInteger(right)
  if (written && (left as number) ** (right as number) <= 2 ** 53) return
  report(node, `${node.operator}: multiply, or use pow of shared/detmath (allowed: two integers written out)`)
}

function checkIdentifier(
  node: SyntaxNode,
  parents: readonly SyntaxNode[],
  declared: ReadonlySet<string>,
  report: Report,
) {
  const name = nameOf(node) ?? ''
  const parent = parents.at(-1)
  if (isPropertyName(node, parent)) {
    const instead =
      parent?.type === 'MemberExpression' && Object.hasOwn(members, name) ? members[name] : undefined
    if (instead !== undefined) report(node, `${name}: ${instead}`)
    return
  }
  if (name !== 'Math' && !Object.hasOwn(globals, name)) return
  if (declared.has(name) || isBoundAround(name, parents)) return
  if (name === 'Math') checkMath(node, parent, report)
  else report(node, `${name}: ${globals[name]}`)
}

function checkFile(source: Source): Violation[] {
  const violations: Violation[] = []
  const report: Report = (node, text) => {
    violations.push({ path: source.path, line: lineAt(source.text, node.start), text })
  }
  const program = parse(source)
  const declared = declaredAtTop(program)
  for (const one of importsOf(source)) {
    const { line, specifier } = one
    if (specifier === undefined)
      violations.push({ path: source.path, line, text: 'import of a computed name: name it' })
    else if (isNodeModule(specifier))
      violations.push({ path: source.path, line, text: `${specifier}: ${outside}` })
  }
  walk(program, (node, parents) => {
    if (node.type.startsWith('TS') && !holdsValues.has(node.type)) return false
    checkPower(node, report)
    if (node.type === 'Identifier') checkIdentifier(node, parents, declared, report)
    if (node.type === 'MetaProperty' && nameOf(node.meta) === 'import')
      report(node, `import.meta: ${outside}`)
    return undefined
  })
  return violations
}

/** Every banned use in the pure folders, with what to use instead. Test files may do as they like. */
export function bannedUses(sources: readonly Source[]): Violation[] {
  return sources
    .filter(({ path }) => !isTest(path) && pureFolders.some((folder) => path.startsWith(`${folder}/`)))
    .flatMap(checkFile)
}
