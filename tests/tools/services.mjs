// Programs that some tests need beside Node: where each is looked for, how it is installed, and its cure.
//
// Looked for in this order: an environment variable, PATH, the user's cache. Then, on Debian and Ubuntu: as root
// it is installed by apt; without root, where `unpack` names packages, they are unpacked into the cache. What has
// `fetch` (engines.mjs) is always unpacked into the cache. Every step that changes the machine is said. The machine
// comes in as `world`, so that tests can have any.

import { spawnSync } from 'node:child_process'
import {
  accessSync,
  chmodSync,
  constants,
  mkdirSync,
  mkdtempSync,
  readdirSync,
  readFileSync,
  renameSync,
  rmSync,
  writeFileSync,
} from 'node:fs'
import { homedir } from 'node:os'
import { delimiter, join } from 'node:path'
import { engines, fetchNode } from './engines.mjs'

/**
 * `commands`: names on PATH, best first. `apt`: the package root installs. `unpack`: packages that together
 * hold the program and those of its libraries that a plain system lacks; absent where that cannot work. Instead of both,
 * `fetch`: what engines.mjs unpacks.
 */
export const services = {
  chromium: {
    variable: 'SKERRY_CHROMIUM',
    commands: ['chromium', 'chromium-browser', 'google-chrome'],
    apt: 'chromium',
  },
  'redis-server': {
    variable: 'SKERRY_REDIS_SERVER',
    commands: ['redis-server'],
    apt: 'redis-server',
    unpack: [
      'redis-server',
      'redis-tools',
      'libjemalloc2',
      'liblua5.1-0',
      'lua-bitop',
      'lua-cjson',
      'liblzf1',
    ],
  },
  ...engines,
}

/**
 * @typedef {object} World
 * @property {NodeJS.ProcessEnv} env
 * @property {string} cache the user's cache folder for Skerry
 * @property {boolean} root
 * @property {boolean} debian apt-get is there
 * @property {(path: string) => boolean} runs whether this path is a program one may run
 * @property {(packageName: string) => boolean} install by apt, as root
 * @property {(name: string, packages: string[], folder: string) => boolean} unpack into the cache, without root
 * @property {(what: { npm: string, debs: string[] }, folder: string) => boolean} fetch into the cache
 * @property {(line: string) => void} say
 */

/** In the cache. What is fetched has its version in the name, or an old one would be taken for it. */
function folderOf(name, world) {
  const version = services[name].fetch?.npm.split('@').at(-1)
  return join(world.cache, version === undefined ? name : `${name}-${version}`)
}

/** @param {string} name @param {World} world */
function installed(name, world) {
  const row = services[name]
  const folders = (world.env.PATH ?? '').split(delimiter).filter((folder) => folder !== '')
  const onPath = row.commands.flatMap((command) => folders.map((folder) => join(folder, command)))
  return [...onPath, join(folderOf(name, world), 'run')].find((path) => world.runs(path))
}

/**
 * The path of a service's program, or undefined when it cannot be had.
 * @param {keyof typeof services} name @param {World} world @returns {string | undefined}
 */
export function findService(name, world) {
  const row = services[name]
  const asked = world.env[row.variable]
  if (asked) {
    if (world.runs(asked)) return asked
    world.say(`${row.variable} names ${asked}, which is no program that can be run`)
    return undefined
  }
  const found = installed(name, world)
  if (found !== undefined) return found
  if (row.fetch) {
    const folder = folderOf(name, world)
    world.say(
      `${name} is not here: unpacking ${[row.fetch.npm, ...row.fetch.debs].join(', ')} into ${folder}`,
    )
    return world.fetch(row.fetch, folder) ? installed(name, world) : undefined
  }
  if (!world.debian) return undefined
  if (world.root) {
    world.say(`${name} is not here: installing the package ${row.apt} with apt-get (as root)`)
    return world.install(row.apt) ? installed(name, world) : undefined
  }
  if (row.unpack === undefined) return undefined
  const folder = folderOf(name, world)
  world.say(`${name} is not here and this is not root: unpacking its Debian packages into ${folder}`)
  return world.unpack(name, row.unpack, folder) ? installed(name, world) : undefined
}

/** What a person can do about a missing service, with and without root. */
export function cures(name) {
  const row = services[name]
  const accept = `  or accept it knowingly: npm test -- --without ${name}`
  if (row.fetch) {
    const debs = row.fetch.debs.length === 0 ? '' : ` and apt-get download ${row.fetch.debs.join(' ')}`
    return [
      `${name} is missing: it comes by npm pack ${row.fetch.npm}${debs} (Linux, with network)`,
      `  without: set ${row.variable} to the path of such a node program`,
      accept,
    ]
  }
  return [
    `${name} is missing. With root: apt-get install ${row.apt} (Fedora: dnf install ${name === 'redis-server' ? 'redis' : name})`,
    `  without root: set ${row.variable} to the path of a ${name} program`,
    accept,
  ]
}

function command(program, args, options = {}) {
  return spawnSync(program, args, { stdio: ['ignore', 'ignore', 'inherit'], ...options }).status === 0
}

function installByApt(packageName) {
  const env = { ...process.env, DEBIAN_FRONTEND: 'noninteractive' }
  return (
    command('apt-get', ['-qq', 'update'], { env }) &&
    command('apt-get', ['-qq', '-y', '--no-install-recommends', 'install', packageName], { env })
  )
}

/** Writes FOLDER/run, which starts the unpacked program with the unpacked libraries. */
function unpackFromDebs(name, packages, folder) {
  mkdirSync(join(folder, '..'), { recursive: true })
  const half = mkdtempSync(`${folder}-`)
  try {
    // Which of the libraries are packages of their own differs between releases: what is not there is not needed.
    for (const one of packages) command('apt-get', ['-qq', 'download', one], { cwd: half, stdio: 'ignore' })
    const debs = readdirSync(half).filter((file) => file.endsWith('.deb'))
    if (debs.length === 0 || !debs.every((deb) => command('dpkg', ['-x', deb, '.'], { cwd: half })))
      return false
    for (const deb of debs) rmSync(join(half, deb))
    const libraries = readdirSync(join(half, 'usr', 'lib')).filter((entry) => entry.endsWith('-linux-gnu'))
    const path = libraries.map((entry) => `"$here/usr/lib/${entry}"`).join(':')
    const script = `#!/bin/sh\nhere=$(dirname "$0")\nLD_LIBRARY_PATH=${path} exec "$here/usr/bin/${name}" "$@"\n`
    writeFileSync(join(half, 'run'), script)
    chmodSync(join(half, 'run'), 0o755)
    if (!command(join(half, 'run'), ['--version'])) return false
    rmSync(folder, { recursive: true, force: true })
    renameSync(half, folder)
    return true
  } finally {
    rmSync(half, { recursive: true, force: true })
  }
}

function isDebian() {
  try {
    return /^ID(_LIKE)?=.*(debian|ubuntu)/m.test(readFileSync('/etc/os-release', 'utf8'))
  } catch {
    return false
  }
}

/** This machine. @returns {World} */
export function systemWorld() {
  const base = process.env.XDG_CACHE_HOME || join(homedir(), '.cache')
  return {
    env: process.env,
    cache: join(base, 'skerry'),
    root: process.getuid?.() === 0,
    debian: isDebian(),
    runs: (path) => {
      try {
        accessSync(path, constants.X_OK)
        return true
      } catch {
        return false
      }
    },
    install: installByApt,
    unpack: unpackFromDebs,
    fetch: fetchNode,
    say: (line) => console.log(line),
  }
}
