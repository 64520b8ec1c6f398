// Announcements and heartbeats as they lie in Redis: JSON that anybody could have written. What does not fit is left
// out; one bad entry hides no good one.

import type { z } from 'zod'

/** The entries of a hash that are what `schema` says. */
export function readAll<Schema extends z.ZodType>(
  schema: Schema,
  texts: { readonly [field: string]: string },
): z.infer<Schema>[] {
  return Object.values(texts).flatMap((text) => {
    const value = readOne(schema, text)
    return value === undefined ? [] : [value]
  })
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
