// What `skerry preflight` looks at: rows, each with what was found, what was expected and how to mend it.

export type Status = 'good' | 'doubtful' | 'bad'

export interface Line {
  readonly what: string
  readonly status: Status
  /** In a few words, with numbers and units. */
  readonly found: string
  /** What to do next; only where it is not good. */
  readonly cure?: string
}

export const good = (what: string, found: string): Line => ({ what, status: 'good', found })
export const doubtful = (what: string, found: string, cure: string): Line => ({
  what,
  status: 'doubtful',
  found,
  cure,
})
export const bad = (what: string, found: string, cure: string): Line => ({ what, status: 'bad', found, cure })

const marks: { readonly [status in Status]: string } = { good: 'good', doubtful: 'doubt', bad: 'BAD' }

/** Lines as a terminal shows them: status, what, found, and the cure below. */
export function drawLines(group: string, lines: readonly Line[]): string[] {
  const width = Math.max(...lines.map(({ what }) => what.length))
  return [
    `${group}`,
    ...lines.flatMap(({ status, what, found, cure }) => [
      `  ${marks[status].padEnd(5)}  ${what.padEnd(width)}  ${found}`,
      ...(cure === undefined ? [] : [`         ${' '.repeat(width)}  next: ${cure}`]),
    ]),
  ]
}
