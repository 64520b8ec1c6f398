// Runs before npm installs better-sqlite3 and says in about a second what it would miss, one line a piece.
//
// npm 7 to 11 run the scripts of the package in hand after those of its dependencies, so a `preinstall` of ours
// alone would speak only after the compiler has failed. Therefore a clone has this folder as a development
// dependency too (copied, not linked: see .npmrc): npm runs every dependency's `preinstall` before any
// dependency's `install`. Where Skerry is itself a dependency, its own `preinstall` does the same.

import { spawnSync } from 'node:child_process'
import {
  existsSync,
  lstatSync,
  mkdirSync,
  readFileSync,
  renameSync,
  rmSync,
  symlinkSync,
  writeFileSync,
} from 'node:fs'
import { homedir } from 'node:os'
import { dirname, join, resolve } from 'node:path'
import { inspect } from './pieces.mjs'

/** The version of its cache that node-gyp 9 to 12 ask for. */
const gypCacheVersion = '11'
const fetchLimitMs = 1500
const prebuiltLimitMs = 20_000

function gypCache() {
  const asked = process.env.npm_config_devdir
  if (asked) return asked.replace(/^~/, homedir())
  if (process.platform === 'darwin') return join(homedir(), 'Library', 'Caches', 'node-gyp')
  return join(process.env.XDG_CACHE_HOME || join(homedir(), '.cache'), 'node-gyp')
}

function read(path) {
  try {
    return readFileSync(path, 'utf8')
  } catch {
    return undefined
  }
}

function run(command, args, input) {
  const done = spawnSync(command, args, { input: input ?? '', encoding: 'utf8', timeout: 10_000 })
  return done.status === 0 ? done.stdout : undefined
}

async function headersCanBeFetched() {
  const url = process.release.headersUrl
  if (url === undefined) return false
  try {
    const answer = await fetch(url, { method: 'HEAD', signal: AbortSignal.timeout(fetchLimitMs) })
    return answer.ok
  } catch {
    return false
  }
}

/** The packages lie unpacked when this runs: the real fetch is the best test, and what it fetched is kept. */
function prebuiltCanBeHad() {
  let folder = process.cwd()
  for (; !existsSync(join(folder, 'node_modules', 'better-sqlite3')); folder = dirname(folder)) {
    if (dirname(folder) === folder) return false
  }
  const modules = join(folder, 'node_modules')
  const done = spawnSync(process.execPath, [join(modules, 'prebuild-install', 'bin.js')], {
    cwd: join(modules, 'better-sqlite3'),
    timeout: prebuiltLimitMs,
    stdio: 'ignore',
  })
  return done.status === 0
}

const prefix = resolve(dirname(process.execPath), '..')
const headerCache = join(gypCache(), process.versions.node)
const variables = process.config.variables

/** Links headers that lie beside the Node program to where node-gyp looks, so that it need not fetch them. */
function seed() {
  const half = `${headerCache}.${process.pid}`
  try {
    mkdirSync(join(half, 'include'), { recursive: true })
    symlinkSync(join(prefix, 'include', 'node'), join(half, 'include', 'node'))
    writeFileSync(join(half, 'installVersion'), `${gypCacheVersion}\n`)
    rmSync(headerCache, { recursive: true, force: true })
    renameSync(half, headerCache)
  } catch (error) {
    rmSync(half, { recursive: true, force: true })
    console.error(`skerry: could not link Node's headers of ${prefix} into ${headerCache}: ${error.message}`)
    console.error(`skerry: if the build fails for want of headers, run: npm_config_nodedir=${prefix} npm ci`)
  }
}

// A link of ours whose Node has gone would keep node-gyp from fetching the headers again.
if (lstatSync(join(headerCache, 'include', 'node'), { throwIfNoEntry: false })?.isSymbolicLink()) {
  if (!existsSync(join(headerCache, 'include', 'node'))) rmSync(headerCache, { recursive: true, force: true })
}

const { lines, seedHeaders } = await inspect({
  env: process.env,
  platform: process.platform,
  nodeVersion: process.versions.node,
  prefix,
  headerCache,
  builtInPrefix: variables.use_prefix_to_find_headers ? variables.node_prefix : undefined,
  osRelease: read('/etc/os-release') ?? '',
  read,
  run,
  headersCanBeFetched,
  prebuiltCanBeHad,
})
if (seedHeaders) seed()
if (lines.length > 0) {
  console.error('skerry: SQLite (better-sqlite3) cannot be installed here yet.')
  for (const line of lines) console.error(`skerry: ${line}`)
  process.exitCode = 1
}
