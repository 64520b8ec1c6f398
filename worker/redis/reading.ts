// Announcements and heartbeats as they lie in Redis: JSON that anybody could have written. What does not fit is left
// out; one bad entry hides no good one.

import type { z } from 'zod'

interface Entry<Value> {
  readonly text: string
  readonly value: Value | undefined
}

/** Reads the entries of a hash again and again; a text that has not changed is not read twice. */
export class Reader<Schema extends z.ZodType> {
  readonly #schema: Schema
  #known = new Map<string, Entry<z.infer<Schema>>>()

  constructor(schema: Schema) {
    this.#schema = schema
  }

  /** The entries that are what the schema says. */
  read(texts: { readonly [field: string]: string }): z.infer<Schema>[] {
    const known = new Map<string, Entry<z.infer<Schema>>>()
    const values: z.infer<Schema>[] = []
    for (const [field, text] of Object.entries(texts)) {
      const before = this.#known.get(field)
      const entry = before?.text === text ? before : { text, value: readOne(this.#schema, text) }
      known.set(field, entry)
      if (entry.value !== undefined) values.push(entry.value)
    }
    this.#known = known
    return values
  }
}

export function readOne<Schema extends z.ZodType>(
  schema: Schema,
  text: string | null,
): z.infer<Schema> | undefined {
  if (text === null) return undefined
  try {
    return schema.safeParse(JSON.parse(text)).data
  } catch {
    return undefined
  }
}
