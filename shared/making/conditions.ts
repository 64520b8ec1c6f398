// Conditions on what is declared, in three values: yes, no, unknown. What is not declared is unknown, and a hazard
// that is unknown is shown: silence is no safety.

import type { MakingMethod, Use } from './types.js'

/** A use, and how the machine is made. */
export interface Declared extends Use {
  readonly methods?: readonly MakingMethod[]
}
export type DeclaredField = keyof Declared
export type Truth = 'yes' | 'no' | 'unknown'

export interface Condition {
  /** Everything it looks at. */
  readonly fields: readonly DeclaredField[]
  /** For documents: 'voltageV > 50', 'battery: lithium'. */
  readonly text: string
  readonly holds: (declared: Declared) => Truth
}

type FieldOf<T> = {
  [F in DeclaredField]-?: NonNullable<Declared[F]> extends T ? F : never
}[DeclaredField]
type ListField = FieldOf<readonly string[]>
type WordField = Exclude<FieldOf<string>, ListField>

function onField<F extends DeclaredField>(
  field: F,
  text: string,
  test: (value: NonNullable<Declared[F]>) => boolean,
): Condition {
  return {
    fields: [field],
    text,
    holds: (declared) => {
      const value = declared[field]
      if (value === undefined) return 'unknown'
      return test(value as NonNullable<Declared[F]>) ? 'yes' : 'no'
    },
  }
}

export function above(field: FieldOf<number>, limit: number): Condition {
  return onField(field, `${field} > ${limit}`, (value) => (value as number) > limit)
}

export function isTrue(field: FieldOf<boolean>): Condition {
  return onField(field, field, (value) => value === true)
}

export function isOneOf<F extends WordField>(
  field: F,
  words: readonly NonNullable<Declared[F]>[],
): Condition {
  return onField(field, `${field}: ${words.join(', ')}`, (value) => words.includes(value))
}

export function hasOneOf<F extends ListField>(
  field: F,
  words: readonly NonNullable<Declared[F]>[number][],
): Condition {
  return onField(field, `${field}: ${words.join(', ')}`, (list) =>
    (list as readonly string[]).some((word) => (words as readonly string[]).includes(word)),
  )
}

/** No as soon as one is no; yes when all are. */
export function allOf(...conditions: readonly Condition[]): Condition {
  return combined(conditions, 'and', 'no', 'yes')
}

/** Yes as soon as one is yes; no when all are. */
export function anyOf(...conditions: readonly Condition[]): Condition {
  return combined(conditions, 'or', 'yes', 'no')
}

function combined(
  conditions: readonly Condition[],
  word: 'and' | 'or',
  decisive: Truth,
  otherwise: Truth,
): Condition {
  return {
    fields: [...new Set(conditions.flatMap((one) => one.fields))],
    text: conditions.map(({ text }) => (text.includes(' or ') ? `(${text})` : text)).join(` ${word} `),
    holds: (declared) => {
      const truths = conditions.map((one) => one.holds(declared))
      if (truths.includes(decisive)) return decisive
      return truths.includes('unknown') ? 'unknown' : otherwise
    },
  }
}
