// Where the emitted JavaScript of this package lies. Threads and child processes cannot run TypeScript on the
// oldest Node we support, and a plug-in must be bundled with the same kernel bytes wherever it is bundled; so
// both always take the emitted files, also when this very file runs from its source in a test.
//
// Running from dist/worker/entry.js the emitted root is dist/; running from worker/entry.ts it is dist/ beside
// worker/, and every emitted file must then be newer than its source, or results would come from old code.

import { existsSync, readFileSync, statSync } from 'node:fs'
import { dirname, join, relative, resolve } from 'node:path'
import { fileURLToPath } from 'node:url'
import { refuse } from '../shared/refusals.js'

const here = fileURLToPath(import.meta.url)
const runsFromSource = here.endsWith('.ts')
const parent = resolve(dirname(here), '..')

/** The folder with the emitted files: sim/index.js, worker/thread.js ... */
export const emittedRoot: string = runsFromSource ? join(parent, 'dist') : parent
const sourceRoot = runsFromSource ? parent : undefined

const fresh = new Set<string>()

/**
 * Path of the emitted file of a module, e.g. 'worker/thread' or 'shared/detmath' (a file or a folder with an index).
 * Refuses with `internal` when it, or a file it imports, was not built or is older than its source.
 */
export function emittedFile(module: string): string {
  const file = [join(emittedRoot, `${module}.js`), join(emittedRoot, module, 'index.js')].find(existsSync)
  if (file === undefined) throw notBuilt(`${module} has not been built: there is no emitted file for it.`)
  try {
    if (sourceRoot !== undefined) mustBeFresh(file, sourceRoot)
  } catch (error) {
    // Files on the way to the old one were taken for fresh; the next call looks at all of them again.
    fresh.clear()
    throw error
  }
  return file
}

/** Walks the relative imports, so that a changed helper two files away is noticed as well. */
function mustBeFresh(file: string, root: string): void {
  if (fresh.has(file)) return
  const module = relative(emittedRoot, file).replace(/\.js$/, '')
  const source = join(root, `${module}.ts`)
  if (!existsSync(file)) throw notBuilt(`${module} has not been built.`)
  if (existsSync(source) && statSync(source).mtimeMs > Math.max(statSync(file).mtimeMs, builtMs())) {
    throw notBuilt(`${module} was changed after it was built.`)
  }
  fresh.add(file)
  for (const [, specifier] of readFileSync(file, 'utf8').matchAll(/\bfrom\s*['"](\.{1,2}\/[^'"]+)['"]/g)) {
    mustBeFresh(join(dirname(file), specifier!), root)
  }
}

/** When the build last found that dist/ is what the sources give. */
function builtMs(): number {
  return statSync(join(emittedRoot, '.built'), { throwIfNoEntry: false })?.mtimeMs ?? 0
}

function notBuilt(detail: string): Error {
  return refuse('internal', {
    detail,
    cure: 'Run `npm run build` in the folder of the package, then try again.',
  })
}
