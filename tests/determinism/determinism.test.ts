// The same bits everywhere: a table of golden simulations (golden.ts) whose digests are constants (digests.ts), computed
// here from the sources, and as one bundled module on other versions of Node, with other compilers of the engine, in
// a browser, and on another processor family under emulation. Which engines there are is said by `npm test`
// (tests/tools/phases.mjs); one that is not there is skipped with the way to get it.

import { writeFileSync } from 'node:fs'
import { fileURLToPath } from 'node:url'
import { afterAll, beforeAll, describe, expect, type TestContext, test } from 'vitest'
import { advance } from '../../sim/lattice/advance.js'
import { cures, services } from '../tools/services.mjs'
import { golden } from './digests.js'
import { engineRoom, type Report } from './engines.js'
import computeGolden, { type Digests, machines } from './golden.js'
import { golden as lattices, situations } from './lattices.js'
import { evaluateFounder } from './machines.js'
import { goldenModule } from './module.js'
import { digestOf } from './numbers.js'

let module: string
let room: ReturnType<typeof engineRoom>
const reports = new Map<string, Report>()

beforeAll(async () => {
  module = await goldenModule()
  room = engineRoom(module)
})
afterAll(() => room?.leave())

/** The path of a service's program; without one the test is skipped, with the reason. */
function programOf(name: keyof typeof services, context: TestContext): string {
  const path = process.env[services[name].variable]
  const [cure, instead] = cures(name)
  return path || context.skip(`${cure};${instead?.slice(1)}; npm test -- --only determinism looks for it`)
}

/** To be called after results were changed on purpose, with new versions of the problems they belong to. */
function writeDigests(digests: Digests): void {
  const rows = Object.entries(digests).map(([name, digest]) => `  ${JSON.stringify(name)}: '${digest}',\n`)
  const text = `// What the golden simulations (golden.ts) give, on every machine. Written by
// SKERRY_WRITE_DIGESTS=1 npx vitest run tests/determinism, after results were changed on purpose: a changed problem
// has a new version, a changed law a line in CHANGELOG.md.

// biome-ignore format: a table
export const golden: { readonly [name: string]: string } = {
${rows.join('')}}
`
  writeFileSync(fileURLToPath(new URL('digests.ts', import.meta.url)), text.replaceAll('"', "'"))
}

test('from the sources, on this Node, every golden simulation gives its digest', () => {
  const digests = computeGolden()
  if (process.env.SKERRY_WRITE_DIGESTS) writeDigests(digests)
  else expect(digests, 'meant? SKERRY_WRITE_DIGESTS: see digests.ts').toEqual(golden)
})

test('reference and kernel give one digest', () => {
  for (const kind of ['plane', 'space'])
    expect(golden[`lattices, ${kind}, 4 lanes`]).toBe(golden[`lattices, ${kind}, reference`])
  expect(new Set(Object.values(golden)).size).toBe(Object.keys(golden).length - 2)
})

// Without this a digest could be one of laws that nothing feels, or of lattices that soon stand still.
test.each([2, 3] as const)(
  'golden lattices in %i dimensions feel every law and have no fault',
  (dimensions) => {
    let touched = 0
    for (let body = 0; body < lattices.bodies; body++) {
      for (const lattice of situations(dimensions, body, 4)) {
        expect(advance(lattice, lattices.steps)).toBeUndefined()
        const { passiveCount, activeCount, guidedCount, dragCount, fillCount, apartCount } = lattice
        const counts = [passiveCount, activeCount, guidedCount, dragCount, fillCount, apartCount]
        expect(Math.min(...counts, lattice.prescribedCount, lattice.sweepSteps[1]!)).toBeGreaterThan(0)
        expect(lattice.sweepSteps[1]! + lattice.driveStartStep).toBeLessThan(lattices.steps)
        touched += lattice.sensed[0]!
      }
    }
    expect(touched).toBeGreaterThan(0)
  },
)

const founders = machines.map(([problem, founder, replicates]) => {
  return { name: problem.name, failures: () => evaluateFounder(problem, founder, replicates).failures }
})
test.each(founders)('the golden founder of $name does not fail', ({ failures }) => {
  expect(failures()).toEqual([])
})

test('a digest sees the last bit and the order, and neither the sign of zero nor the kind of no number', () => {
  const numbers = [1, 0, Number.NaN, 1e-300]
  const strange = new Float64Array(new BigUint64Array([0xfff8_0000_0000_0001n]).buffer)[0]!
  expect(digestOf([1, -0, strange, 1e-300])).toBe(digestOf(numbers))
  const others = [
    [1 + Number.EPSILON, 0, Number.NaN, 1e-300],
    [0, 1, Number.NaN, 1e-300],
    [1, 0, 0, 1e-300],
  ]
  for (const other of others) expect(digestOf(other)).not.toBe(digestOf(numbers))
})

test('the module needs nothing of Node', () => {
  expect(module).not.toMatch(/^import\b|\bfrom ['"]|\brequire\(['"]node:|import\(['"]node:/m)
})

describe('as one module, the same digests', () => {
  // V8's own options: the quick compiler of WebAssembly only, its optimising one only, no optimising compiler of
  // JavaScript, and the instructions of an older processor.
  const compilers = [[], ['--liftoff-only'], ['--no-liftoff'], ['--no-opt'], ['--no-enable-avx']]
  test.for(compilers.map((flags) => ({ flags })))('on this Node $flags', ({ flags }, context) => {
    if (flags[0] === '--no-enable-avx' && process.arch !== 'x64') context.skip('an option of x64 only')
    expect(room.inNode(process.execPath, flags).digests).toEqual(golden)
  })

  test.for(['node-20', 'node-22', 'node-24'] as const)('on %s', (name, context) => {
    const report = room.inNode(programOf(name, context), [])
    reports.set(name, report)
    expect(report.version).toMatch(`v${name.slice(-2)}.`)
    expect(report.digests).toEqual(golden)
  })

  test('on aarch64', (context) => {
    const report = room.inNode(programOf('node-aarch64', context), [])
    reports.set('node-aarch64', report)
    expect(report.processor).toBe('arm64')
    expect(report.digests).toEqual(golden)
  })

  test('in Chromium', async (context) => {
    programOf('chromium', context)
    expect(await room.inBrowser()).toEqual(golden)
  })
})

// Without this, emulation could be one that would hide any difference.
test('the host’s own sines do differ between the two processor families, on one version of Node', (context) => {
  const here = reports.get('node-20')
  const there = reports.get('node-aarch64')
  if (!here || !there || here.processor === there.processor || here.version !== there.version)
    return context.skip('needs node-20 and node-aarch64 of one version, on a machine that is not aarch64')
  expect(there.hostSines).not.toBe(here.hostSines)
})
