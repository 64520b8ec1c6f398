// The rigid-body library inside a plug-in's bundle: one file, ready when it is imported, the same bits wherever it runs.

import { mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { pathToFileURL } from 'node:url'
import { Worker } from 'node:worker_threads'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { ensureBuilt } from '../../tests/tools/built.js'
import { bundlePlugin, type PluginBundle } from './bundle.js'
import { importPlugin } from './import.js'

const folder = mkdtempSync(join(tmpdir(), 'skerry-rigid-'))
beforeAll(() => ensureBuilt(), 60_000)
afterAll(() => rmSync(folder, { recursive: true, force: true }))

/** A plug-in whose export tells the digests of a heap of boxes that a driven arm pushes over. */
function plugin(dimensions: 2 | 3): string {
  const z = dimensions === 3 ? ', 0' : ''
  const half = (x: number, y: number) => (dimensions === 3 ? `[${x}, ${y}, 0.2]` : `[${x}, ${y}]`)
  return `
    import { library, withRigid } from 'skerry/rigid${dimensions}d'
    const material = { friction: 0.4, restitution: 0.2, density: 30 }
    const box = (half: number[]) => [{ outline: { kind: 'box' as const, halfM: half }, material }]
    const heap = Array.from({ length: 6 }, (_, i) => ({
      name: 'box ' + i, positionM: [0.6 + 0.02 * i, 0.1 + 0.2 * i${z}], shapes: box(${half(0.1, 0.1)}),
    }))
    const spec = {
      gravityMps2: [0, -9.81${z}], stepSeconds: 1 / 120,
      bodies: [
        { name: 'floor', fixed: true, positionM: [0, -0.1${z}], shapes: box(${half(5, 0.1)}) },
        { name: 'arm', positionM: [0, 0.6${z}], shapes: box(${half(0.3, 0.02)}) },
        ...heap,
      ],
      joints: [{
        name: 'shoulder', kind: 'hinge' as const, a: 'floor', b: 'arm', onAM: [-0.3, 0.7${z}], onBM: [-0.3, 0${z}],
        ${dimensions === 3 ? 'axis: [0, 0, 1],' : ''}
        motor: { stiffness: 500, damping: 30, effortMost: 80, rateMost: 4, powerMostW: 200 },
      }],
    }
    export default {
      library,
      digests: () => withRigid(spec, (world) => {
        for (let i = 0; i < 240; i++) {
          world.command(0, -1.2 * Math.sin(i / 40))
          world.advance(1)
        }
        return [world.digest(), world.innerDigest(), String(world.driveOf(0).workJ)]
      }),
    }`
}

interface Told {
  readonly library: string
  digests(): string[]
}

/** What a bundle in a file tells when a fresh thread imports it. */
function fromThread(file: string): Promise<string[]> {
  const code = `
    import { parentPort } from 'node:worker_threads'
    const { default: told } = await import(${JSON.stringify(pathToFileURL(file).href)})
    parentPort.postMessage(told.digests())`
  const worker = new Worker(new URL(`data:text/javascript,${encodeURIComponent(code)}`))
  return new Promise((resolve, reject) => {
    worker.once('message', resolve)
    worker.once('error', reject)
  })
}

async function bundled(dimensions: 2 | 3): Promise<PluginBundle & { readonly file: string }> {
  const source = join(folder, `rigid${dimensions}.ts`)
  writeFileSync(source, plugin(dimensions))
  const bundle = await bundlePlugin(source)
  const file = join(folder, `rigid${dimensions}.mjs`)
  writeFileSync(file, bundle.code)
  return { ...bundle, file }
}

describe.each([2, 3] as const)('a plug-in with rigid bodies in %d-D', (dimensions) => {
  test('is one file without the other library, asks no clock, and gives the same bits everywhere', async () => {
    const { code, file, inputs, warnings } = await bundled(dimensions)
    expect(warnings).toEqual([])
    expect(code).not.toMatch(/\.now\(\)\}/)
    const libraries = inputs.filter((input) => input.includes('@dimforge'))
    expect(libraries).toEqual([
      `node_modules/@dimforge/rapier${dimensions}d-deterministic-compat/dist/rapier.mjs`,
    ])
    const told = (await importPlugin({ code })) as Told
    expect(told.library).toMatch(new RegExp(`^rapier${dimensions}d-deterministic-`))
    const first = told.digests()
    expect(told.digests()).toEqual(first)
    expect(await fromThread(file)).toEqual(first)
    expect(first).toEqual(golden[dimensions])
  })
})

/** Equal on every machine; a new version of the library changes them and its own name in every problem's version. */
const golden = {
  2: [
    '11dffe56778a26727ff69bf773717b57d55bb0037dd66217e7ad40f4a769ad00',
    'dd7e4ca3f0ed1c1f5057324c4453e633125adefebf25823601f8eb1bbad7a1d7',
    '1.2795963046714458',
  ],
  3: [
    '7c0ccd8f2ee15e90787cc26fc3eaafb197d95cf3c27951154251dc3e9c7dbbd6',
    '8903bcc161c65e920f2da87647a7bf8304dcff629618c03c6c0ae603389edf76',
    '0.5122110495030907',
  ],
}
