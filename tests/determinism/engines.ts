// Running the golden module elsewhere: in another process of any Node, and in a browser.

import { spawnSync } from 'node:child_process'
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { openBrowser } from '../browser/driver.js'
import type { Digests } from './golden.js'

/** What an engine says of itself and what it computed. */
export interface Report {
  readonly version: string
  readonly processor: string
  readonly digests: Digests
  /** Sines of the host's own: what would differ. */
  readonly hostSines: string
}

// Run on the oldest Node we know of; says on stderr how far it has come, for the day when one engine stops.
const runner = `
import computeGolden from './golden.mjs'
import { createHash } from 'node:crypto'
const digests = computeGolden((name) => process.stderr.write(name + '\\n'))
const sines = Float64Array.from({ length: 20000 }, (_, i) => Math.sin(0.37 * i))
const hostSines = createHash('sha256').update(new Uint8Array(sines.buffer)).digest('hex')
console.log(JSON.stringify({ version: process.version, processor: process.arch, digests, hostSines }))
`

/** A folder with the module in it, and what runs it. */
export function engineRoom(module: string) {
  const folder = mkdtempSync(join(tmpdir(), 'skerry-golden-'))
  writeFileSync(join(folder, 'golden.mjs'), module)
  writeFileSync(join(folder, 'run.mjs'), runner)
  writeFileSync(join(folder, 'page.html'), '<!doctype html><title>golden</title>')
  return {
    /** In a process of this Node-like program. */
    inNode: (program: string, flags: readonly string[]): Report => {
      const done = spawnSync(program, [...flags, join(folder, 'run.mjs')], {
        encoding: 'utf8',
        timeout: 580_000,
        env: { PATH: process.env.PATH },
      })
      if (done.status !== 0)
        throw new Error(
          `${program} ${flags.join(' ')} ended with ${done.status ?? done.signal}: ${done.stderr}`,
        )
      return JSON.parse(done.stdout) as Report
    },
    /** In a page of Chromium (SKERRY_CHROMIUM). */
    inBrowser: async (): Promise<Digests> => {
      const browser = await openBrowser()
      try {
        const page = await browser.open(join(folder, 'page.html'), { widthPx: 100, heightPx: 100 })
        const address = `data:text/javascript;base64,${Buffer.from(module, 'utf8').toString('base64')}`
        return await page.ask<Digests>(`import('${address}').then((module) => module.default())`)
      } finally {
        await browser.close()
      }
    },
    leave: () => rmSync(folder, { recursive: true, force: true }),
  }
}
