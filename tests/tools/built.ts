// Tests that start threads or processes need the emitted files. `npm test` builds them first; a single test file run by
// hand builds them here when they are missing or old.

import { spawnSync } from 'node:child_process'
import { existsSync, mkdirSync, rmdirSync, statSync } from 'node:fs'
import { dirname, join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { emittedFile } from '../../worker/entry.js'

const root = join(dirname(fileURLToPath(import.meta.url)), '..', '..')
const entries = [
  'worker/pool',
  'worker/thread',
  'worker/alone',
  'worker/plugin/load',
  'sim/index',
  'shared/detmath',
]

/** Makes sure that the emitted files are those of the sources as they are now. */
export function ensureBuilt(): void {
  if (isBuilt()) return
  const lock = join(root, 'node_modules', '.skerry-build-lock')
  const untilMs = Date.now() + 60_000
  while (!takeLock(lock) && Date.now() < untilMs)
    Atomics.wait(new Int32Array(new SharedArrayBuffer(4)), 0, 0, 100)
  try {
    // Errors of types elsewhere do not keep the compiler from emitting; what is missing is refused below.
    if (!isBuilt())
      spawnSync(process.execPath, [join(root, 'node_modules', 'typescript', 'bin', 'tsc'), '-p', root])
  } finally {
    rmdirSync(lock)
  }
  for (const entry of entries) emittedFile(entry)
}

function isBuilt(): boolean {
  try {
    for (const entry of entries) emittedFile(entry)
    return true
  } catch {
    return false
  }
}

function takeLock(lock: string): boolean {
  if (existsSync(lock) && Date.now() - statSync(lock).mtimeMs > 120_000) return true
  try {
    mkdirSync(lock)
    return true
  } catch {
    return false
  }
}
