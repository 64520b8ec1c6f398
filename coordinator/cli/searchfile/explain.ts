// From what zod says to what a person can act on: the place in the file, what stands there, and for an unknown
// field or option the name that was probably meant.

import type { z } from 'zod'
import { plainText, type RefusalCode } from '../../../shared/refusals.js'
import { describeValue, eitherOf, type Finding } from './finding.js'
import { nearestName } from './nearest.js'
import { type FieldPath, fieldName, type LocatedText } from './text.js'

type Issue = z.core.$ZodIssue
type Schema = z.core.$ZodType

/** All findings of one field of the top level. */
export function explainIssues(
  located: LocatedText,
  root: string,
  schema: Schema,
  value: unknown,
  issues: readonly Issue[],
): Finding[] {
  const findings = issues.flatMap((issue) => explainIssue({ located, root, schema, value }, [], issue))
  // A number may break several checks of one field, whose messages are the same.
  const alike = (a: Finding, b: Finding) => a.field === b.field && a.expected === b.expected
  return findings.filter((finding, index) => findings.findIndex((other) => alike(finding, other)) === index)
}

interface Subject {
  readonly located: LocatedText
  readonly root: string
  readonly schema: Schema
  readonly value: unknown
}

function explainIssue(subject: Subject, before: FieldPath, issue: Issue): Finding[] {
  const path = [...before, ...(issue.path as (string | number)[])]
  if (issue.code === 'unrecognized_keys') return issue.keys.map((key) => unknownField(subject, path, key))
  if (issue.code === 'invalid_union') {
    const branch = fittingBranch(issue.errors)
    if (branch) return branch.flatMap((inner) => explainIssue(subject, path, inner))
  }
  return [wrongValue(subject, path, issue)]
}

/** The one alternative of a union that fits the kind of the value: its complaints lie deeper than the value. */
function fittingBranch(branches: readonly (readonly Issue[])[]): readonly Issue[] | undefined {
  const fits = (issues: readonly Issue[]) =>
    issues.length > 0 && issues.every((issue) => issue.path.length > 0 || issue.code === 'unrecognized_keys')
  return branches.find(fits)
}

function unknownField(subject: Subject, path: FieldPath, key: string): Finding {
  const known = namesAt(subject.schema, path)
  return unknownName({
    located: subject.located,
    path: [subject.root, ...path, key],
    what: 'field',
    known,
  })
}

export function meantAdvice(name: string): string {
  return `Did you mean "${name}"?`
}

/** An unknown field, part, setting or option at `path`, whose last step is the name that was found. */
export function unknownName(facts: {
  readonly located: LocatedText
  readonly path: FieldPath
  readonly what: string
  readonly known: readonly string[]
}): Finding {
  const name = String(facts.path[facts.path.length - 1])
  const meant = nearestName(name, facts.known)
  return {
    severity: 'refused',
    code: 'unknown-field',
    place: facts.located.placeOfKey(facts.path),
    field: fieldName(facts.path),
    found: `the unknown ${facts.what} "${plainText(name)}"`,
    expected: facts.known.length === 0 ? `no ${facts.what} here` : eitherOf(facts.known),
    advice: meant ? meantAdvice(meant) : `Delete it, or use one of the names above.`,
  }
}

function wrongValue(subject: Subject, path: FieldPath, issue: Issue): Finding {
  const full = [subject.root, ...path]
  const found = valueAt(subject.value, path)
  const options = issue.code === 'invalid_value' ? issue.values.map(String) : []
  const meant = typeof found === 'string' ? nearestName(found, options) : undefined
  const advice = meant ? meantAdvice(meant) : found === undefined ? 'Add the field.' : undefined
  return {
    severity: 'refused',
    code: codeOf(issue, found),
    place: subject.located.placeOf(full),
    field: fieldName(full),
    found: describeValue(found),
    expected: issue.message,
    ...(advice ? { advice } : {}),
  }
}

function codeOf(issue: Issue, found: unknown): RefusalCode {
  if (found === undefined) return 'missing-field'
  return issue.code === 'invalid_type' || issue.code === 'invalid_union' ? 'wrong-type' : 'impossible-value'
}

function valueAt(value: unknown, path: FieldPath): unknown {
  return path.reduce<unknown>((inner, step) => {
    if (typeof inner !== 'object' || inner === null || !Object.hasOwn(inner, step)) return undefined
    return (inner as { readonly [step: string]: unknown })[step]
  }, value)
}

/** The field names a schema allows at a path; empty where it names none. */
export function namesAt(schema: Schema, path: FieldPath): string[] {
  const definition = schema._zod.def as {
    readonly type: string
    readonly shape?: { readonly [key: string]: Schema }
    readonly element?: Schema
    readonly valueType?: Schema
    readonly innerType?: Schema
    readonly options?: readonly Schema[]
  }
  if (definition.innerType) return namesAt(definition.innerType, path)
  if (definition.options) return firstFilled(definition.options.map((option) => namesAt(option, path)))
  const [step, ...rest] = path
  if (definition.shape) {
    if (step === undefined) return Object.keys(definition.shape)
    const inner = definition.shape[String(step)]
    return inner ? namesAt(inner, rest) : []
  }
  const inner = definition.element ?? definition.valueType
  return inner && step !== undefined ? namesAt(inner, rest) : []
}

function firstFilled(lists: readonly string[][]): string[] {
  return lists.find((list) => list.length > 0) ?? []
}
