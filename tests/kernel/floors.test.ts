// The kernel's speed against plain C and the reference, a short form of `npm run bench -- kernel`: floors that hold whoever
// else is on the machine, because only ratios between programs that take turns count, and a row has three chances.

import { mkdtempSync, rmSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { build } from 'esbuild'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { compilerVersion } from '../bench/kernel/contestants.js'
import { type Finding, measureBody, type Paths, rows } from '../bench/kernel/figure.js'

const folder = mkdtempSync(join(tmpdir(), 'skerry-floors-'))
const benchFolder = fileURLToPath(new URL('../bench/kernel/', import.meta.url))
const paths: Paths = { source: join(benchFolder, 'lattice.c'), mover: join(folder, 'mover.mjs'), folder }
const attempts = 3
const rounds = 7

beforeAll(async () => {
  const entryPoints = [join(benchFolder, 'mover.ts')]
  await build({ entryPoints, bundle: true, platform: 'node', format: 'esm', outfile: paths.mover })
})
afterAll(() => rmSync(folder, { recursive: true, force: true }))

describe.each([2, 3] as const)('in %i dimensions', (dimensions) => {
  const findings: Finding[] = []
  const best = (what: string) =>
    Math.max(...findings.filter(({ row }) => row.what === what).map(({ ratio }) => ratio.median))

  beforeAll(async () => {
    for (let attempt = 0; attempt < attempts; attempt++) {
      findings.push(...(await measureBody(dimensions, paths, rounds, 0)))
      const low = findings.some(({ row }) => best(row.what) < row.floor)
      if (!low) break
    }
  }, 600_000)

  test.for(rows)('$what is at least $floor', ({ what, floor }, context) => {
    const measured = findings.some(({ row }) => row.what === what)
    if (!measured && compilerVersion() === undefined) context.skip('there is no gcc on this machine')
    if (!measured && what.includes('256')) context.skip('the processor has no vectors of 256 bits')
    expect(best(what)).toBeGreaterThanOrEqual(floor)
  })
})
