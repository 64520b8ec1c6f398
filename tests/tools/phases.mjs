// The phases of `npm test`, in order: what is fast and needs nothing but Node comes first. A row is one line of
// the report. `project` is a project of vitest.config.ts; `commands` are checks that count as one test each.

import { join } from 'node:path'

/** Sizes of the long tests: how many kills, how many seeds. A larger value on request, through the environment. */
export const sizes = {
  SKERRY_CHAOS_KILLS: '50',
  SKERRY_CHAOS_SEEDS: '3',
  SKERRY_SEEDS: '2000',
}

const bin = (...path) => join('node_modules', ...path)

/**
 * `needs`: services without which the phase is not run. `wants`: services that are looked for; a test that has none
 * of its own skips itself and says so.
 * @typedef {{ name: string, says: string, commands?: { name: string, args: string[] }[], project?: string,
 *   needs?: string[], wants?: string[] }} Phase
 * @type {Phase[]}
 */
export const phases = [
  {
    name: 'build',
    says: 'TypeScript to dist/, because Node 20 runs no TypeScript and worker threads start from files',
    commands: [{ name: 'build', args: ['tests/tools/build.mjs'] }],
  },
  {
    name: 'static',
    says: 'types of code and tests; style',
    commands: [
      { name: 'types (tsc)', args: [bin('typescript', 'bin', 'tsc'), '-p', 'tests'] },
      { name: 'style (biome)', args: [bin('@biomejs', 'biome', 'bin', 'biome'), 'check', '.'] },
    ],
  },
  { name: 'house', says: 'imports, banned calls, sizes, documents', project: 'house' },
  { name: 'unit', says: 'units, properties, reference values', project: 'unit' },
  {
    name: 'kernel',
    says: 'the WebAssembly modules: compiled again, same bits everywhere, fast',
    project: 'kernel',
  },
  {
    name: 'determinism',
    says: 'golden simulations: the same bits on Node 20, 22 and 24, in Chromium and on emulated aarch64',
    project: 'determinism',
    wants: ['node-20', 'node-22', 'node-24', 'node-aarch64', 'chromium'],
  },
  { name: 'contract', says: 'one suite a port, over every adapter', project: 'contract' },
  { name: 'queue', says: 'a real Redis and real workers', project: 'queue', needs: ['redis-server'] },
  { name: 'package', says: 'what would be published', project: 'package' },
  { name: 'cluster', says: 'simulated clusters under seeds', project: 'cluster' },
  { name: 'chaos', says: 'real processes, killed', project: 'chaos', needs: ['redis-server'] },
  { name: 'browser', says: 'pages in a real browser', project: 'browser', needs: ['chromium'] },
]
