// The door to coordinator/main.ts, opened only by the commands that need it: help, new and check start at once.

import type { House } from './run-options.js'

/** What main.ts exports. A specifier in a variable, because main.ts itself imports from this folder. */
export async function openHouse(): Promise<House> {
  const specifier = '../main.js'
  return (await import(specifier)) as House
}
