import { createHash } from 'node:crypto'
import {
  chmodSync,
  existsSync,
  mkdtempSync,
  readdirSync,
  readFileSync,
  rmSync,
  utimesSync,
  writeFileSync,
} from 'node:fs'
import { tmpdir } from 'node:os'
import { join, relative } from 'node:path'
import { afterAll, expect, test } from 'vitest'
import { signatureOf } from '../../shared/cluster/signature.js'
import { Refusal } from '../../shared/refusals.js'
import { cacheFolder, PluginCache, readKey } from './plugins.js'

const root = mkdtempSync(join(tmpdir(), 'skerry-plugins-'))
afterAll(() => rmSync(root, { recursive: true, force: true }))
let folders = 0
const folder = () => join(root, String(++folders))
const key = new TextEncoder().encode('the key of the water works')

function bundle(text: string) {
  const bytes = new TextEncoder().encode(text)
  const pluginDigest = createHash('sha256').update(bytes).digest('hex')
  return { bytes, pinned: { search: 'weir', pluginDigest, pluginBytes: bytes.length } }
}

async function refusal(promise: Promise<unknown>): Promise<Refusal> {
  const error: unknown = await promise.catch((reason: unknown) => reason)
  if (error instanceof Refusal) return error
  throw new Error(`expected a refusal, got ${String(error)}`)
}

test('a bundle is fetched once, then served from the folder, whole', async () => {
  const cache = new PluginCache({ folder: folder() })
  const { bytes, pinned } = bundle('export default 1')
  let fetched = 0
  const fetch = async () => {
    fetched++
    return bytes
  }
  const path = await cache.file(pinned, fetch)
  expect(readFileSync(path!)).toEqual(Buffer.from(bytes))
  expect(await cache.file(pinned, fetch)).toBe(path)
  expect(fetched).toBe(1)
})

test('a file that was damaged or put there by somebody is not run: it is fetched again', async () => {
  const place = folder()
  const cache = new PluginCache({ folder: place })
  const { bytes, pinned } = bundle('export default 2')
  const path = (await cache.file(pinned, async () => bytes))!
  writeFileSync(path, 'export default "something else"')
  expect(await cache.file(pinned, async () => bytes)).toBe(path)
  expect(readFileSync(path, 'utf8')).toBe('export default 2')
  expect(readdirSync(place)).toEqual([`${pinned.pluginDigest}.mjs`])
})

test('other bytes than announced are refused and not kept', async () => {
  const place = folder()
  const { pinned } = bundle('export default 3')
  const fault = await refusal(
    new PluginCache({ folder: place }).file(pinned, async () => bundle('evil').bytes),
  )
  expect(fault.code).toBe('plugin-untrusted')
  expect(fault.exitCode).toBe(77)
  expect(existsSync(place) ? readdirSync(place) : []).toEqual([])
})

test('with a key: unsigned and wrongly signed bundles are refused before anything is fetched; a signed one runs', async () => {
  const cache = new PluginCache({ folder: folder(), key: () => key })
  const { bytes, pinned } = bundle('export default 4')
  const never = () => Promise.reject(new Error('fetched'))
  expect((await refusal(cache.file(pinned, never))).detail).toContain('carries no signature')
  const foreign = signatureOf(new TextEncoder().encode('the key of another site'), pinned.pluginDigest)
  const wrong = await refusal(cache.file({ ...pinned, signature: foreign }, never))
  expect(wrong.detail).toContain('not made with the key of this worker')
  const signature = signatureOf(key, pinned.pluginDigest)
  expect(await cache.file({ ...pinned, signature }, async () => bytes)).toBeDefined()
})

test('the signature of one bundle does not serve another', async () => {
  const cache = new PluginCache({ folder: folder(), key: () => key })
  const signature = signatureOf(key, bundle('export default 5').pinned.pluginDigest)
  const fault = await refusal(cache.file({ ...bundle('evil').pinned, signature }, async () => undefined))
  expect(fault.code).toBe('plugin-untrusted')
})

test('what the queue does not have yet is no fault', async () => {
  expect(await new PluginCache({ folder: folder() }).file(bundle('late').pinned, async () => undefined)).toBe(
    undefined,
  )
})

test('the folder stays within its bounds: what was not used for longest goes', async () => {
  const place = folder()
  const cache = new PluginCache({ folder: place, bytesMost: 250 })
  const bundles = ['a', 'b', 'c'].map((letter) => bundle(letter.repeat(100)))
  const paths: string[] = []
  for (const [i, { bytes, pinned }] of bundles.entries()) {
    const path = (await cache.file(pinned, async () => bytes))!
    paths.push(path)
    utimesSync(path, new Date(1000 * i), new Date(1000 * i))
    // Used again: the second is the oldest now.
    if (i === 1) await cache.file(bundles[0]!.pinned, async () => undefined)
  }
  expect(paths.map((path) => existsSync(path))).toEqual([true, false, true])
})

test('a problem that is too large is refused by its announced size', async () => {
  const { pinned } = bundle('x')
  const fault = await refusal(
    new PluginCache({ folder: folder() }).file({ ...pinned, pluginBytes: 2 ** 30 }, async () => undefined),
  )
  expect(fault.code).toBe('too-large-to-send')
})

test('a key file: read without its line end; refused when others may read it, when short, when absent', () => {
  const file = join(root, 'key')
  writeFileSync(file, 'the key of the water works\n', { mode: 0o600 })
  expect(readKey(file)).toEqual(key)
  chmodSync(file, 0o640)
  expect(() => readKey(file)).toThrow('mode 640')
  writeFileSync(join(root, 'short'), 'short', { mode: 0o600 })
  expect(() => readKey(join(root, 'short'))).toThrow('5 bytes')
  expect(() => readKey(join(root, 'none'))).toThrow('no such key file')
})

test('a folder that is named relative to here is the same folder from everywhere', () => {
  const absolute = folder()
  expect(cacheFolder(relative(process.cwd(), absolute), folder(), undefined)).toBe(absolute)
})
