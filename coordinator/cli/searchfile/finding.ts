// One complaint about a search file, with everything a stranger needs to mend it: where, what was found, what
// was expected, what to do. Complaints are collected and shown together; none hides another.

import { plainText, type Refusal, type RefusalCode, refuse } from '../../../shared/refusals.js'

export interface Place {
  /** From 1. */
  readonly line: number
  /** From 1. */
  readonly column: number
}

export interface Finding {
  /** 'refused' stops the search; 'warning' is printed and the search goes on. */
  readonly severity: 'refused' | 'warning'
  /** Row of the table of refusals; a warning has the code it would have if it were refused. */
  readonly code: RefusalCode
  readonly place: Place
  /** Path of the field, such as islands[1].lookahead; '' for the file as a whole. */
  readonly field: string
  readonly found: string
  readonly expected: string
  /** What to do next, as a sentence. */
  readonly advice?: string
}

/** Several lines for a person; the first one begins `file:line:column`, which editors and terminals can follow. */
export function printFinding(file: string, finding: Finding): string {
  const head = `${file}:${finding.place.line}:${finding.place.column}  ${finding.severity}: ${finding.field || 'the file'}`
  const lines = [head, `    found     ${finding.found}`, `    expected  ${finding.expected}`]
  if (finding.advice) lines.push(`    so        ${finding.advice}`)
  return lines.join('\n')
}

/** All findings, refusals first, each group in the order of the file. */
export function printFindings(file: string, findings: readonly Finding[]): string {
  return sortFindings(findings)
    .map((finding) => printFinding(file, finding))
    .join('\n')
}

/** Refusals before warnings, then by place; ties keep their order. */
export function sortFindings(findings: readonly Finding[]): Finding[] {
  const rank = (finding: Finding) => (finding.severity === 'refused' ? 0 : 1)
  return [...findings].sort(
    (a, b) => rank(a) - rank(b) || a.place.line - b.place.line || a.place.column - b.place.column,
  )
}

export function isRefused(findings: readonly Finding[]): boolean {
  return findings.some((finding) => finding.severity === 'refused')
}

/** A value of the file in a few words: its kind and, when short, itself. */
export function describeValue(value: unknown): string {
  if (value === undefined) return 'nothing'
  if (value === null) return 'an empty value'
  if (Array.isArray(value)) return `a list of ${value.length}`
  if (typeof value === 'object') return 'a map of fields'
  const text = typeof value === 'string' ? JSON.stringify(plainText(value)) : String(value)
  const short = text.length > 60 ? `${text.slice(0, 57)}...` : text
  const kind = { string: 'the text', number: 'the number', boolean: 'the truth value' }[
    typeof value as string
  ]
  return `${kind ?? 'the value'} ${short}`
}

/** So many problems of one kind are shown; somebody who made a mistake twenty times need not read it twenty times. */
const alikeMost = 3

/** How many problems of the same kind come before this one. */
function before(findings: readonly Finding[], finding: Finding): number {
  const alike = (other: Finding) => other.code === finding.code && other.expected === finding.expected
  return findings.slice(0, findings.indexOf(finding)).filter(alike).length
}

/** The refusal that shows what was refused, of many alike the first ones; undefined when nothing was. */
export function refusalOf(file: string, findings: readonly Finding[]): Refusal | undefined {
  const refused = sortFindings(findings).filter((finding) => finding.severity === 'refused')
  const first = refused[0]
  if (!first) return undefined
  if (refused.length > 1) {
    const shown = refused.filter((finding) => before(refused, finding) < alikeMost)
    const more = refused.length - shown.length
    const rest = more > 0 ? `\n    and ${more} more of the kinds above` : ''
    const detail = `the first of ${refused.length} problems of ${file}\n${printFindings(file, shown)}${rest}`
    return refuse(first.code, {
      detail,
      cure: 'Mend the lines above; `skerry check` tries the file without starting a search.',
    })
  }
  return refuse(first.code, {
    detail: `found ${first.found}; expected ${first.expected}.`,
    where: { file, ...first.place, ...(first.field ? { field: first.field } : {}) },
    ...(first.advice ? { cure: first.advice } : {}),
  })
}

/** a, b or c */
export function eitherOf(names: readonly string[]): string {
  if (names.length <= 1) return names[0] ?? 'nothing'
  return `${names.slice(0, -1).join(', ')} or ${names[names.length - 1]}`
}
