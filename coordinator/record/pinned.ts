// What a record pins for ever: the plan, the text of the search file and the plug-in. They are the beginning of
// the chain, so that a changed byte is found at every start.

import { createHash, randomUUID } from 'node:crypto'
import { existsSync, readFileSync, renameSync, rmSync, writeFileSync } from 'node:fs'
import { basename } from 'node:path'
import { z } from 'zod'
import { check } from '../../shared/check.js'
import { equalBytes } from '../../shared/digests.js'
import type { SearchPlan } from '../evolution/plan.js'
import { genesisOf } from './chain.js'
import { fileTrouble } from './files.js'
import type { GuardedDatabase } from './guard.js'
import { damaged, decode } from './rows.js'
import type { Column } from './storage.js'

export interface Pinned {
  readonly plan: SearchPlan
  readonly searchText: string
  /** The bundled plug-in; its SHA-256 is plan.problem.digest. */
  readonly pluginCode: Uint8Array
}

/** What tells one search from another. Fields that are absent are not compared. */
export interface SearchIdentity {
  readonly name?: string
  readonly seed?: number
  /** Hexadecimal SHA-256 of the plug-in. */
  readonly pluginDigest?: string
}

/** Rows of `meta`, in the order of their keys. JSON gives every finite double back exactly. */
export function metaOf({ plan, searchText, pluginCode }: Pinned, createdMs: number): Column[][] {
  check(sha256Hex(pluginCode) === plan.problem.digest, 'the plan names the digest of the pinned plug-in')
  return [
    ['created_ms', createdMs],
    ['plan', JSON.stringify(plan)],
    ['plugin', pluginCode],
    ['search', searchText],
  ]
}

const needs = z.object({
  cores: z.number().int().positive(),
  memoryMB: z.number().int().positive(),
  tokens: z.record(z.string(), z.number().int().positive()),
})
const planSchema = z.looseObject({
  name: z.string(),
  seed: z.number().int().nonnegative(),
  semantics: z.number().int(),
  problem: z.looseObject({
    name: z.string(),
    digest: z.string().regex(/^[0-9a-f]{64}$/),
    needs: needs.optional(),
  }),
  islands: z.array(z.looseObject({ island: z.number().int().positive() })),
})

/** What the record pins, after its digests have been compared. @throws Refusal 'record-corrupted' */
export function readPinned(database: GuardedDatabase): Pinned {
  const rows = database.prepare('SELECT key, value FROM meta ORDER BY key').all()
  const head = database.prepare('SELECT head FROM appends WHERE sequence = 0').get()?.[0]
  const what = 'the beginning of the record (append 0)'
  if (!(head instanceof Uint8Array) || !equalBytes(head, genesisOf(rows))) {
    throw damaged(what, 'the plan, the search file or the plug-in stored in it has been changed')
  }
  const values = new Map(rows.map(([key, value]) => [key, value]))
  const [plan, searchText, pluginCode] = [values.get('plan'), values.get('search'), values.get('plugin')]
  if (typeof plan !== 'string' || typeof searchText !== 'string' || !(pluginCode instanceof Uint8Array)) {
    throw damaged(what, 'the plan, the search file or the plug-in is missing')
  }
  // The digest above says that these are the bytes we wrote; the schema catches a writer that was not us.
  const parsed = decode(what, () => planSchema.parse(JSON.parse(plan)))
  return { plan: parsed as unknown as SearchPlan, searchText, pluginCode: Uint8Array.from(pluginCode) }
}

/** In words, what differs between the search of a record and the one expected. */
export function differences(plan: SearchPlan, expected: SearchIdentity): string[] {
  const rows: readonly (readonly [string, string | number, string | number | undefined])[] = [
    ['name', plan.name, expected.name],
    ['seed', plan.seed, expected.seed],
    ['SHA-256 of the plug-in', plan.problem.digest, expected.pluginDigest],
  ]
  return rows
    .filter(([, found, wanted]) => wanted !== undefined && wanted !== found)
    .map(([field, found, wanted]) => `${field}: the record has ${found}, expected ${wanted}`)
}

/** Writes the copies beside the database where they are missing or altered; says what it mended. */
export function writeCopies(
  files: { readonly plugin: string; readonly search: string },
  { searchText, pluginCode }: Pinned,
  created: boolean,
): string[] {
  const notices: string[] = []
  const copies = [
    { path: files.plugin, bytes: pluginCode, what: 'the pinned plug-in' },
    { path: files.search, bytes: Buffer.from(searchText), what: 'the search file' },
  ]
  for (const { path, bytes, what } of copies) {
    const state = !existsSync(path) ? 'missing' : readFileSync(path).equals(bytes) ? 'good' : 'altered'
    if (state === 'good') continue
    writeWhole(path, bytes)
    if (!created)
      notices.push(`${basename(path)} was ${state}; it was written again from the record's copy of ${what}.`)
  }
  return notices
}

/** All of a file or nothing of it. */
function writeWhole(path: string, bytes: Uint8Array): void {
  const temporary = `${path}.new-${randomUUID()}`
  try {
    writeFileSync(temporary, bytes)
    renameSync(temporary, path)
  } catch (error) {
    rmSync(temporary, { force: true })
    throw fileTrouble(error, path)
  }
}

export function sha256Hex(bytes: Uint8Array): string {
  return createHash('sha256').update(bytes).digest('hex')
}
