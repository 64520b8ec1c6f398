// The pinned bundles on this machine: fetched by digest, checked, kept.
//
// A bundle runs only when its bytes have the digest that the coordinator announced and, where this site has a key, when
// the announcement carries the signature of that digest. Files are named by their digest and appear complete
// (written beside and renamed), so any number of agents can share a folder. The folder is bounded: what was not used
// for longest goes first.

import { createHash, randomBytes } from 'node:crypto'
import {
  chmodSync,
  existsSync,
  mkdirSync,
  readdirSync,
  readFileSync,
  renameSync,
  rmSync,
  statSync,
  utimesSync,
  writeFileSync,
} from 'node:fs'
import { join, resolve } from 'node:path'
import type { Announcement } from '../../shared/cluster/messages.js'
import { isSignatureOf, keyBytesLeast } from '../../shared/cluster/signature.js'
import { limits } from '../../shared/limits.js'
import { refuse } from '../../shared/refusals.js'

export interface PluginCacheOptions {
  readonly folder: string
  /** The cluster key, where the site has one; asked for each time, because a coordinator that moved brings its own. */
  readonly key?: () => Uint8Array | undefined
  readonly bytesMost?: number
}

export type PluginFetch = () => Promise<Uint8Array | undefined>

type Pinned = Pick<Announcement, 'search' | 'pluginDigest' | 'pluginBytes' | 'signature'>

const usualBytesMost = 2 ** 29
const bundle = /^[0-9a-f]{64}\.mjs$/
/** What a writer that was killed left behind goes after so long. */
const leftoverMs = 3_600_000

export class PluginCache {
  private readonly options: PluginCacheOptions

  constructor(options: PluginCacheOptions) {
    this.options = options
  }

  /**
   * The file of a bundle that may run here. Refuses with 'plugin-untrusted' (not signed, or with another key, or bytes
   * that do not have the announced digest), 'too-large-to-send', or what the disk did. Undefined when the queue does not have it (yet).
   */
  async file(pinned: Pinned, fetch: PluginFetch): Promise<string | undefined> {
    mustBeSigned(pinned, this.options.key?.())
    if (pinned.pluginBytes > limits.pluginBytes) {
      throw refuse('too-large-to-send', {
        detail: `the problem of search ${pinned.search} has ${pinned.pluginBytes} bytes; at most ${limits.pluginBytes} are taken`,
      })
    }
    const path = join(this.options.folder, `${pinned.pluginDigest}.mjs`)
    if (isWhole(path, pinned.pluginDigest)) {
      touch(path)
      return path
    }
    const bytes = await fetch()
    if (bytes === undefined) return undefined
    const digest = digestOf(bytes)
    if (digest !== pinned.pluginDigest) {
      throw refuse('plugin-untrusted', {
        detail: `the queue holds other bytes than search ${pinned.search} announced: SHA-256 ${short(digest)}, expected ${short(pinned.pluginDigest)}`,
        cure: 'Start the coordinator again, which puts the pinned problem there; if it happens again, somebody else writes to this Redis.',
      })
    }
    this.write(path, bytes)
    return path
  }

  private write(path: string, bytes: Uint8Array): void {
    const { folder } = this.options
    const beside = join(folder, `${process.pid}-${randomBytes(4).toString('hex')}.part`)
    try {
      mkdirSync(folder, { recursive: true, mode: 0o700 })
      writeFileSync(beside, bytes, { mode: 0o600, flush: true })
      renameSync(beside, path)
    } catch (error) {
      rmSync(beside, { force: true })
      throw refuse('disk-error', {
        detail: `the problem could not be kept: ${error instanceof Error ? error.message : String(error)}`,
        where: { file: folder },
        cure: 'Name a folder that can be written with --cache.',
        cause: error,
      })
    }
    this.trim(path)
  }

  /** Removes the bundles that were not used for longest, never the one in hand, until the rest is within bounds. */
  private trim(inHand: string): void {
    const { folder, bytesMost = usualBytesMost } = this.options
    const files = readdirSync(folder).flatMap((name) => {
      const path = join(folder, name)
      const stat = statSync(path, { throwIfNoEntry: false })
      if (stat === undefined) return []
      if (name.endsWith('.part') && Date.now() - stat.mtimeMs > leftoverMs) rmSync(path, { force: true })
      return bundle.test(name) ? [{ path, bytes: stat.size, usedMs: stat.mtimeMs }] : []
    })
    let bytes = files.reduce((sum, file) => sum + file.bytes, 0)
    for (const file of files.sort((a, b) => a.usedMs - b.usedMs)) {
      if (bytes <= bytesMost) return
      if (file.path === inHand) continue
      rmSync(file.path, { force: true })
      bytes -= file.bytes
    }
  }
}

function mustBeSigned({ search, pluginDigest, signature }: Pinned, key: Uint8Array | undefined): void {
  if (key === undefined) return
  if (signature === undefined) {
    throw refuse('plugin-untrusted', {
      detail: `search ${search} carries no signature; this worker has a key`,
    })
  }
  if (!isSignatureOf(signature, key, pluginDigest)) {
    throw refuse('plugin-untrusted', {
      detail: `the signature of search ${search} was not made with the key of this worker`,
    })
  }
}

function isWhole(path: string, digest: string): boolean {
  try {
    return existsSync(path) && digestOf(readFileSync(path)) === digest
  } catch {
    return false
  }
}

/** Its time of last use is that of the file: also bundles that came long ago stay while they are used. */
function touch(path: string): void {
  try {
    utimesSync(path, new Date(), new Date())
  } catch {
    // Somebody else's file: it is used all the same.
  }
}

const digestOf = (bytes: Uint8Array): string => createHash('sha256').update(bytes).digest('hex')
const short = (digest: string): string => `${digest.slice(0, 12)}...`

/**
 * The cluster key of a file: its bytes without white space at the end. Refuses with 'key-unfit' when it can be read by
 * others or is too short to be a key.
 */
export function readKey(file: string): Uint8Array {
  const where = { file }
  let bytes: Buffer
  try {
    const { mode } = statSync(file)
    if ((mode & 0o077) !== 0) {
      const detail = `others than its owner may use it (mode ${(mode & 0o777).toString(8)})`
      throw refuse('key-unfit', { detail, where, cure: `Change its mode: chmod 600 ${file}` })
    }
    bytes = readFileSync(file)
  } catch (error) {
    if (error instanceof Error && 'code' in error && error.code === 'ENOENT')
      throw refuse('file-not-found', { detail: 'there is no such key file', where, cure: keyCure })
    throw error
  }
  const key = Uint8Array.from(bytes.toString('latin1').replace(/\s+$/, ''), (one) => one.charCodeAt(0))
  if (key.length < keyBytesLeast) {
    throw refuse('key-unfit', {
      detail: `it has ${key.length} bytes; at least ${keyBytesLeast} make a key`,
      where,
    })
  }
  return key
}

const keyCure = 'Make one, once for the whole site: (umask 077; openssl rand -hex 32 > FILE)'

/** A folder of the cache that only this user reads, as far as the system can tell. */
export function cacheFolder(asked: string | undefined, home: string, cacheHome: string | undefined): string {
  // Absolute: simulations run in other working folders.
  const folder = resolve(asked ?? join(cacheHome || join(home, '.cache'), 'skerry', 'problems'))
  try {
    mkdirSync(folder, { recursive: true, mode: 0o700 })
    if (asked === undefined) chmodSync(folder, 0o700)
  } catch (error) {
    throw refuse('disk-read-only', {
      detail: `the folder for problems cannot be made: ${error instanceof Error ? error.message : String(error)}`,
      where: { file: folder },
      cure: 'Name a folder that can be written with --cache.',
      cause: error,
    })
  }
  return folder
}
