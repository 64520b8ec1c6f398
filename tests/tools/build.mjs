// Builds dist/ with the TypeScript compiler, and only when a source is newer than the last build.
// Node 20 cannot run TypeScript, and worker threads are started from files: so demo, tests and package all
// run what this makes. `--force` builds always.

import { spawnSync } from 'node:child_process'
import { createHash } from 'node:crypto'
import {
  copyFileSync,
  existsSync,
  mkdirSync,
  readdirSync,
  readFileSync,
  rmSync,
  utimesSync,
  writeFileSync,
} from 'node:fs'
import { dirname, extname, join, relative, sep } from 'node:path'
import { fileURLToPath } from 'node:url'

const root = join(dirname(fileURLToPath(import.meta.url)), '..', '..')
const dist = join(root, 'dist')
const stamp = join(dist, '.built')
const folders = ['shared', 'sim', 'worker', 'coordinator']
/** Copied as they are; anything else that is not TypeScript stays out of the package. */
const copied = new Set(['.html', '.css', '.svg', '.wasm', '.yaml', '.js', '.mjs'])
const notShipped = /\.test\.ts$|coordinator[\\/]setup[\\/]|[\\/]examples[\\/]|lattice[\\/]wasm[\\/]/

function* filesBelow(folder) {
  if (!existsSync(folder)) return
  const entries = readdirSync(folder, { withFileTypes: true })
  for (const entry of entries.sort((a, b) => (a.name < b.name ? -1 : 1))) {
    const path = join(folder, entry.name)
    if (entry.isDirectory()) yield* filesBelow(path)
    else yield path
  }
}

/** Names and contents of all that goes into dist/. */
function fingerprint(files) {
  const hash = createHash('sha256')
  for (const file of [...files, join(root, 'tsconfig.json'), join(root, 'package-lock.json')]) {
    hash.update(`${relative(root, file)}\0`)
    hash.update(readFileSync(file))
  }
  return hash.digest('hex')
}

function compiler() {
  const path = join(root, 'node_modules', 'typescript', 'bin', 'tsc')
  return existsSync(path) ? path : undefined
}

/** Output of sources that are gone would still be packed and run. */
function removeOrphans(sources) {
  const expected = new Set(sources.map((file) => relative(root, file).replace(/\.ts$/, '')))
  for (const file of [...filesBelow(dist)]) {
    const name = relative(dist, file)
    const source = name.replace(/\.(d\.ts|js\.map|js)$/, '')
    if (name.startsWith(`tests${sep}`)) continue // the benchmarks' (bench.mjs)
    if (file !== stamp && !expected.has(name) && !expected.has(source)) rmSync(file)
  }
}

export function build({ force = false } = {}) {
  const sources = folders
    .flatMap((folder) => [...filesBelow(join(root, folder))])
    .filter((file) => !notShipped.test(file))
    .filter((file) => extname(file) === '.ts' || copied.has(extname(file)))
  const now = fingerprint(sources)
  if (!force && existsSync(stamp) && readFileSync(stamp, 'utf8') === now) {
    // Sources that were touched and not changed are not newer than dist/ (worker/entry.ts looks at this time).
    utimesSync(stamp, new Date(), new Date())
    return { built: false, status: 0 }
  }
  const tsc = compiler()
  if (tsc === undefined) {
    console.error('build: the TypeScript compiler is not installed. Run `npm ci` without --omit=dev.')
    return { built: false, status: existsSync(stamp) ? 0 : 1 }
  }
  const done = spawnSync(process.execPath, [tsc, '-p', root], { cwd: root, stdio: 'inherit' })
  if (done.status !== 0) return { built: false, status: done.status ?? 1 }
  for (const file of sources.filter((source) => extname(source) !== '.ts')) {
    const target = join(dist, relative(root, file))
    mkdirSync(dirname(target), { recursive: true })
    copyFileSync(file, target)
  }
  removeOrphans(sources)
  writeFileSync(stamp, now)
  return { built: true, status: 0 }
}

if (process.argv[1] === fileURLToPath(import.meta.url)) {
  const startMs = Date.now()
  const { built, status } = build({ force: process.argv.includes('--force') })
  if (built) console.log(`build: dist/ made in ${((Date.now() - startMs) / 1000).toFixed(1)} s`)
  process.exitCode = status
}
