// Which version of the program this is, from its own package.json.

import { readFileSync } from 'node:fs'
import { join } from 'node:path'
import { emittedRoot } from '../../../worker/entry.js'

export function version(): string {
  const text = readFileSync(join(emittedRoot, '..', 'package.json'), 'utf8')
  return (JSON.parse(text) as { readonly version: string }).version
}
