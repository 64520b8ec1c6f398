// Promise: what a person does with the real program around its budgets, prints and failures ends in words that say
// what happened. Short searches in real processes.

import { spawnSync } from 'node:child_process'
import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { dirname, join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { afterAll, expect, it } from 'vitest'

const skerry = join(dirname(fileURLToPath(import.meta.url)), '../../dist/coordinator/cli/skerry.js')
const root = mkdtempSync(join(tmpdir(), 'skerry-commands-'))
afterAll(() => rmSync(root, { recursive: true, force: true }))

const problem = (inSimulate = '') => `import { defineProblem, real } from 'skerry'
console.log('a problem that prints while it is loaded')
export default defineProblem({
  name: 'bowl', version: '1', summary: 'A noisy bowl that takes a while.',
  genome: { x: real({ length: 3, low: -1, high: 1 }) },
  objectives: { error: { direction: 'minimise', unit: '1' } },
  drawCondition: (stream) => stream.normal(),
  simulate: ({ x }, situations) => situations.map(({ condition }) => {
    ${inSimulate}
    let waste = 0
    for (let i = 0; i < 4e5; i++) waste += Math.sqrt(i)
    return { objectives: { error: x.reduce((sum, one) => sum + one * one, 0) + 0.05 * condition + 0 * waste } }
  }),
})
`

let folders = 0
/** A folder with a problem; gives back how to run a search of this budget in it. */
function bench(inSimulate?: string) {
  const folder = join(root, String(++folders))
  mkdirSync(folder)
  writeFileSync(join(folder, 'problem.js'), problem(inSimulate))
  return (budget: string, ...more: string[]) => {
    const text = `name: bowl
problem: ./problem.js
seed: 5
budget: { ${budget} }
replicates: { first: 2, topUp: 2, most: 4 }
islands:
  - { count: 2, method: steady-state, population: 8, lookahead: 4 }
migration: { every: 3 rounds, emigrants: 1, topology: ring, lag: 1 }
control: { kind: drift, budget: same }
`
    writeFileSync(join(folder, 'search.yaml'), text)
    const done = spawnSync(process.execPath, [skerry, 'run', 'search.yaml', '--cores', '2', ...more], {
      cwd: folder,
      encoding: 'utf8',
      timeout: 60_000,
    })
    return { exitCode: done.status, out: done.stdout, err: done.stderr }
  }
}

it('a date ends the search at an epoch, and says which', () => {
  const until = new Date(Date.now() + 4000).toISOString()
  const { exitCode, out } = bench()(`simulations: 1000000, until: '${until}'`)
  expect(exitCode).toBe(0)
  expect(out).toContain(`The search finishes with the epoch, because it is ${until}`)
})

it('hours follow the accepted file; raised after they ended the search it goes on, until the new ones end it', () => {
  const run = bench()
  run('simulations: 400, coreHours: 10', '--stop-after', '40')
  const refused = run('simulations: 400, coreHours: 0.000001')
  expect(refused.exitCode).toBe(78)
  expect(refused.err).toContain('--accept-changes')
  const ended = run('simulations: 400, coreHours: 0.000001', '--accept-changes')
  expect(ended.exitCode).toBe(0)
  expect(ended.out).toContain('because 0.000001 core-hours are used')
  const raised = run('simulations: 400, coreHours: 10', '--accept-changes')
  expect(raised.exitCode).toBe(0)
  expect(raised.out).toMatch(/finished: (39\d|400) of 400 simulations/)
})

it('--json stays one object when the problem prints, and holds the comparison with the control', () => {
  const { exitCode, out, err } = bench("console.log('a problem that prints')")('simulations: 120', '--json')
  expect(exitCode).toBe(0)
  const told = JSON.parse(out) as { readonly ended: string; readonly summary: readonly string[] }
  expect(told.ended).toBe('finished')
  expect(told.summary.join('\n')).toMatch(
    /Control drift \(c1-\d+, the best of 120 simulations\): error .* The search's best /,
  )
  expect(err).toContain('a problem that prints while it is loaded')
})

it('a search in which everything fails says why, while it runs and at the end', () => {
  const { exitCode, out } = bench("throw new Error('no stiffness given')")('simulations: 120')
  expect(exitCode).toBe(0)
  expect(out).toContain('No machine has been simulated without failure yet.')
  expect(out).toContain('The first failed because: the problem threw: no stiffness given.')
})

it('more cores than any machine has are refused in words', () => {
  const { exitCode, err } = bench()('simulations: 120', '--cores', '9999')
  expect(exitCode).toBe(64)
  expect(err).toContain('--cores 9999; expected at most')
})
