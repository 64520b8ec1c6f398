// Which kinds of event the program writes into a record: read from the calls that write them.

import { isTest, parse, plainString, type Source, type SyntaxNode, walk } from './source.js'

/** Functions that take a kind of event: the place of that argument, or of an object that has it as `kind`. */
const writers: { readonly [name: string]: number } = {
  note: 0,
  noteData: 0,
  eventRow: 0,
  orderAtEpoch: 0,
  atEpoch: 0,
  order: 1,
  now: 1,
  at: 1,
}

function calledName(callee: SyntaxNode | undefined): string | undefined {
  const named = (callee?.type === 'MemberExpression' ? callee.property : callee) as SyntaxNode | undefined
  return named?.name as string | undefined
}

/** The argument itself, or the value of its property `kind`. */
function kindOf(given: SyntaxNode | undefined): SyntaxNode | undefined {
  if (given?.type !== 'ObjectExpression') return given
  const row = (given.properties as SyntaxNode[]).find(
    (one) => (one.key as SyntaxNode | undefined)?.name === 'kind',
  )
  return row?.value as SyntaxNode | undefined
}

/** Constants of the file that hold a plain string, by name. */
function constants(program: SyntaxNode): Map<string, string> {
  const found = new Map<string, string>()
  walk(program, (node) => {
    const value = node.type === 'VariableDeclarator' ? plainString(node.init) : undefined
    if (value !== undefined) found.set(String((node.id as SyntaxNode).name), value)
    return undefined
  })
  return found
}

/** Kinds of event that are written into the record, sorted. */
export function eventKinds(sources: readonly Source[]): string[] {
  const kinds = new Set<string>()
  const places = sources.filter(
    ({ path }) => !isTest(path) && /^coordinator\/(engine\/|main|cli\/join\/|record\/)/.test(path),
  )
  for (const source of places) {
    const known = constants(parse(source))
    walk(parse(source), (node) => {
      if (node.type !== 'CallExpression') return undefined
      const place = writers[calledName(node.callee as SyntaxNode) ?? '']
      const given = place === undefined ? undefined : (node.arguments as SyntaxNode[])[place]
      const named = kindOf(given)
      const kind = plainString(named) ?? known.get(String(named?.name))
      if (kind !== undefined && /^[a-z]+(-[a-z]+)*$/.test(kind)) kinds.add(kind)
      return undefined
    })
  }
  return [...kinds].sort()
}
