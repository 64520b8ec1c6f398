// From the text of a search file to plain values with places. YAML 1.2 core; aliases, anchors, tags and
// merge keys are refused (they let a short file grow without bound, and nobody needs them here), duplicate
// keys too, and the size is limited before anything is parsed.

import type { Document, Node, Pair, YAMLError } from 'yaml'
import { isAlias, isMap, isPair, isScalar, isSeq, LineCounter, parseDocument, visit } from 'yaml'
import { limits } from '../../../shared/limits.js'
import { plainText, type RefusalCode } from '../../../shared/refusals.js'
import type { Finding, Place } from './finding.js'

export type FieldPath = readonly (string | number)[]

export interface LocatedText {
  readonly value: unknown
  readonly findings: readonly Finding[]
  /** Where the value at a path stands; the nearest enclosing place when there is none. */
  readonly placeOf: (path: FieldPath) => Place
  /** Where the key of a field stands. */
  readonly placeOfKey: (path: FieldPath) => Place
}

const start: Place = { line: 1, column: 1 }

/** islands[1].lookahead */
export function fieldName(path: FieldPath): string {
  return path.reduce<string>((name, step) => {
    if (typeof step === 'number') return `${name}[${step}]`
    const part = plainText(step)
    return name === '' ? part : `${name}.${part}`
  }, '')
}

/** Reads the text; a nesting beyond the parser's recursion ends as a finding too. See parseText. */
export function readText(text: string): LocatedText {
  if (text.length > limits.searchFileBytes) return tooLong(text.length)
  if (isNestedBeyondReason(text)) return tooDeep()
  try {
    const located = parseText(text)
    return deeperThan(located.value, limits.searchFileDepth) ? tooDeep() : located
  } catch (error) {
    if (error instanceof RangeError) return tooDeep()
    throw error
  }
}

/** `value` is undefined when there are findings, because half-read YAML says nothing sure. */
function parseText(text: string): LocatedText {
  const lines = new LineCounter()
  const document = parseDocument(text, {
    lineCounter: lines,
    prettyErrors: false,
    version: '1.2',
    merge: false,
  })
  const placeAt = (offset: number): Place => {
    const { line, col } = lines.linePos(offset)
    return { line: Math.max(1, line), column: Math.max(1, col) }
  }
  const findings = [
    ...[...document.errors, ...document.warnings]
      // Tags are named by forbidden().
      .filter((error) => error.code !== 'TAG_RESOLVE_FAILED')
      .map((error) => complaint(error, text, placeAt)),
    ...forbidden(document, placeAt),
  ]
  const value = findings.length === 0 ? document.toJS({ maxAliasCount: 0 }) : undefined
  const offsetPlace = (node: Node | undefined) => (node?.range ? placeAt(node.range[0]) : start)
  return {
    value,
    findings,
    placeOf: (path) => offsetPlace(nodeAt(document, path).node),
    placeOfKey: (path) => {
      const { key, node } = nodeAt(document, path)
      return offsetPlace(key ?? node)
    },
  }
}

/**
 * A thousand brackets open at once, or a thousand dashes in a row: no search file, and the parser would take seconds.
 * Brackets in texts and comments count too, which is why the bound is so far off.
 */
function isNestedBeyondReason(text: string): boolean {
  let open = 0
  for (const [bracket] of text.matchAll(/[[\]{}]/g)) {
    open = bracket === '[' || bracket === '{' ? open + 1 : Math.max(0, open - 1)
    if (open > 1000) return true
  }
  return /(?:[-?:] ){1000}/.test(text)
}

/** Whether some value lies more than `levels` levels deep. */
function deeperThan(value: unknown, levels: number): boolean {
  if (typeof value !== 'object' || value === null) return false
  return levels === 0 || Object.values(value).some((inner) => deeperThan(inner, levels - 1))
}

function tooLong(length: number): LocatedText {
  return unreadable('file-too-large', `${length} characters`, `at most ${limits.searchFileBytes}`)
}

function tooDeep(): LocatedText {
  return unreadable('not-yaml', 'very deep nesting', `at most ${limits.searchFileDepth} levels of fields`)
}

function unreadable(code: RefusalCode, found: string, expected: string): LocatedText {
  const finding: Finding = {
    severity: 'refused',
    code,
    place: start,
    field: '',
    found,
    expected,
    advice: 'Check that this is a search file; data belongs beside the problem, not in here.',
  }
  return { value: undefined, findings: [finding], placeOf: () => start, placeOfKey: () => start }
}

const codes: { readonly [code: string]: { readonly expected: string; readonly advice: string } } = {
  DUPLICATE_KEY: {
    expected: 'every field once',
    advice: 'Delete one of the two: which one was meant cannot be told from the file.',
  },
  TAB_AS_INDENT: { expected: 'spaces for indentation', advice: 'Replace the tab by spaces.' },
  MULTIPLE_DOCS: { expected: 'one document', advice: 'Remove the line --- and what follows it.' },
  BAD_INDENT: {
    expected: 'fields of one map in one column',
    advice: 'Line this field up with its neighbours.',
  },
}

function complaint(error: YAMLError, text: string, placeAt: (offset: number) => Place): Finding {
  const known = codes[error.code]
  const place = placeAt(error.pos[0])
  const duplicated = error.code === 'DUPLICATE_KEY' ? wordAt(text, error.pos[0]) : ''
  return {
    severity: 'refused',
    code: duplicated ? 'duplicate-key' : 'not-yaml',
    place,
    field: duplicated,
    found: duplicated ? `"${duplicated}" a second time` : plainText(error.message),
    expected: known?.expected ?? 'YAML that can be read',
    advice: known?.advice ?? 'Mend this place first; what follows it could not be read.',
  }
}

function wordAt(text: string, offset: number): string {
  return plainText(/^["']?([^:\s"']*)/.exec(text.slice(offset, offset + 80))?.[1] ?? '')
}

/** Aliases, anchors, tags of one's own and merge keys. */
function forbidden(document: Document, placeAt: (offset: number) => Place): Finding[] {
  const findings: Finding[] = []
  const refuse = (node: Node, found: string) =>
    findings.push({
      severity: 'refused',
      code: 'alias-refused',
      place: node.range ? placeAt(node.range[0]) : start,
      field: '',
      found,
      expected: 'plain values: no aliases, anchors, tags or merge keys',
      advice: 'Write the value out where it is used.',
    })
  visit(document, {
    Node: (_key, node) => {
      if (findings.length >= 20) return visit.BREAK
      if (isAlias(node)) refuse(node, `the alias *${plainText(node.source)}`)
      else if (node.anchor) refuse(node, `the anchor &${plainText(node.anchor)}`)
      else if (node.tag && !node.tag.startsWith('tag:yaml.org,2002:')) {
        refuse(node, `the tag ${plainText(node.tag)}`)
      }
      return undefined
    },
    Pair: (_key, pair) => {
      if (isScalar(pair.key) && pair.key.value === '<<') refuse(pair.key, 'the merge key <<')
    },
  })
  return findings
}

/** The deepest node on a path that exists, and the key that leads to the path's end when it exists. */
function nodeAt(document: Document, path: FieldPath): { node: Node | undefined; key: Node | undefined } {
  let node = (document.contents ?? undefined) as Node | undefined
  let key: Node | undefined
  for (const step of path) {
    key = undefined
    if (isMap(node)) {
      const pair = node.items.find(
        (item) => isPair(item) && isScalar(item.key) && String(item.key.value) === String(step),
      ) as Pair<Node, Node | null> | undefined
      if (!pair) return { node, key: undefined }
      key = pair.key
      node = pair.value ?? pair.key
    } else if (isSeq(node) && typeof step === 'number') {
      const item = node.items[step] as Node | undefined
      if (!item) return { node, key: undefined }
      node = item
    } else return { node, key: undefined }
  }
  return { node, key }
}
