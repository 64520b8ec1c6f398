// The door to coordinator/main.ts, opened only by the commands that need it: help, new and check start at once.

import type { House } from './run-options.js'

/** What main.ts exports, loaded when first asked for. */
export async function openHouse(): Promise<House> {
  return import('../main.js')
}
