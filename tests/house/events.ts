// Which kinds of event the program writes into a record: read from the calls that write them.

import { isTest, parse, plainString, type Source, type SyntaxNode, walk } from './source.js'

/** Functions that take a kind of event, with the place of that argument. */
const writers: { readonly [name: string]: number } = {
  note: 0,
  noteData: 0,
  eventRow: 0,
  order: 1,
  orderAtEpoch: 0,
  orderAt: 1,
}

function calledName(callee: SyntaxNode | undefined): string | undefined {
  const named = (callee?.type === 'MemberExpression' ? callee.property : callee) as SyntaxNode | undefined
  return named?.name as string | undefined
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
      const kind = plainString(given) ?? known.get(String(given?.name))
      if (kind !== undefined && /^[a-z]+(-[a-z]+)*$/.test(kind)) kinds.add(kind)
      return undefined
    })
  }
  return [...kinds].sort()
}
