// The one-way import table and who owns which third-party package, with the check that reads real imports.

import { builtinModules } from 'node:module'
import { posix } from 'node:path'
import { type Import, importsOf, isTest, type Source, type Violation } from './source.js'

/** Longest folder first wins. `types`: only their types may be imported. 'everything': a meeting place. */
export interface FolderRule {
  readonly folder: string
  readonly may: readonly string[] | 'everything'
  readonly types?: readonly string[]
}

export const importTable: readonly FolderRule[] = [
  { folder: 'shared', may: [] },
  { folder: 'sim', may: ['shared'] },
  { folder: 'worker', may: ['sim', 'shared'] },
  { folder: 'coordinator/evolution', may: ['shared'] },
  { folder: 'coordinator/engine', may: ['coordinator/evolution', 'shared'] },
  { folder: 'coordinator/dispatch', may: ['coordinator/engine', 'shared'], types: ['coordinator/evolution'] },
  { folder: 'coordinator/record', may: ['coordinator/engine', 'shared'], types: ['coordinator/evolution'] },
  { folder: 'coordinator/service', may: ['coordinator/engine', 'shared'], types: ['coordinator/evolution'] },
  {
    folder: 'coordinator/evidence',
    may: ['coordinator/record', 'shared'],
    types: ['coordinator/evolution', 'coordinator/engine'],
  },
  { folder: 'coordinator/web', may: ['shared', 'sim'] },
  { folder: 'coordinator/setup', may: [] },
  { folder: 'coordinator/cli', may: 'everything' },
  { folder: 'coordinator/main.ts', may: 'everything' },
]

/** One owner folder a package: elsewhere it is reached through the owner. zod guards every border. */
export const packageOwners: { readonly [name: string]: string | 'everywhere' } = {
  '@dimforge/rapier2d-deterministic-compat': 'sim/rigid',
  '@dimforge/rapier3d-deterministic-compat': 'sim/rigid',
  '@noble/hashes': 'shared',
  'better-sqlite3': 'coordinator/record',
  bullmq: 'worker/redis',
  commander: 'coordinator/cli',
  esbuild: 'worker/plugin',
  'fft.js': 'sim/measure',
  ioredis: 'worker/redis',
  'ml-matrix': 'sim/measure',
  msgpackr: 'shared/cluster',
  yaml: 'coordinator/cli',
  zod: 'everywhere',
}

const isInside = (path: string, folder: string) => path === folder || path.startsWith(`${folder}/`)
const builtins = new Set(builtinModules)

export function isNodeModule(specifier: string): boolean {
  return specifier.startsWith('node:') || builtins.has(specifier)
}

/** '@noble/hashes' of '@noble/hashes/sha2.js'. */
export function packageOf(specifier: string): string {
  return specifier.split('/', specifier.startsWith('@') ? 2 : 1).join('/')
}

function ruleFor(path: string): FolderRule | undefined {
  return importTable.find((rule) => isInside(path, rule.folder))
}

function complaint(path: string, rule: FolderRule, one: Import): string | undefined {
  const { specifier } = one
  if (specifier === undefined) return undefined
  if (isNodeModule(specifier)) return undefined
  if (specifier.startsWith('.')) {
    const target = posix.normalize(posix.join(posix.dirname(path), specifier))
    if (rule.may === 'everything' || isInside(target, rule.folder)) return undefined
    if (rule.may.some((folder) => isInside(target, folder))) return undefined
    const types = rule.types ?? []
    if (one.typeOnly && types.some((folder) => isInside(target, folder))) return undefined
    const allowed = [...rule.may, ...types.map((folder) => `types of ${folder}`)]
    return `imports ${target}; allowed: ${allowed.join(', ') || 'nothing'} and itself`
  }
  const owner = packageOwners[packageOf(specifier)]
  if (owner === undefined) return `imports package ${specifier}, which has no owner in tests/house/imports.ts`
  if (owner === 'everywhere' || isInside(path, owner)) return undefined
  return `imports package ${specifier}; allowed: only ${owner}, its owner`
}

/** Every import against the table. Test files may import anything. */
export function importViolations(sources: readonly Source[]): Violation[] {
  const violations: Violation[] = []
  for (const source of sources.filter((one) => !isTest(one.path))) {
    const rule = ruleFor(source.path)
    if (rule === undefined) {
      violations.push({ path: source.path, line: 1, text: 'lies in no folder of the import table' })
      continue
    }
    for (const one of importsOf(source)) {
      const text = complaint(source.path, rule, one)
      if (text !== undefined) violations.push({ path: source.path, line: one.line, text })
    }
  }
  return violations
}
