// Which kinds of event the program writes into a record: read from the calls that write them.

import { isTest, parse, plainString, type Source, type SyntaxNode, walk } from './source.js'

/** Functions that take a kind of event, with the place of that argument. */
const writers: { readonly [name: string]: number } = {
  note: 0,
  eventRow: 0,
  order: 1,
  orderAtEpoch: 0,
  orderAt: 1,
}

function calledName(callee: SyntaxNode | undefined): string | undefined {
  const named = (callee?.type === 'MemberExpression' ? callee.property : callee) as SyntaxNode | undefined
  return named?.name as string | undefined
}

/** Kinds of event that engine and main write, sorted. */
export function eventKinds(sources: readonly Source[]): string[] {
  const kinds = new Set<string>()
  const places = sources.filter(({ path }) => !isTest(path) && /^coordinator\/(engine\/|main)/.test(path))
  for (const source of places) {
    walk(parse(source), (node) => {
      if (node.type !== 'CallExpression') return undefined
      const place = writers[calledName(node.callee as SyntaxNode) ?? '']
      const kind = place === undefined ? undefined : plainString((node.arguments as unknown[])[place])
      if (kind !== undefined && /^[a-z]+(-[a-z]+)*$/.test(kind)) kinds.add(kind)
      return undefined
    })
  }
  return [...kinds].sort()
}
