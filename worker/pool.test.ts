import { spawn } from 'node:child_process'
import { existsSync, mkdtempSync, readFileSync, readlinkSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { pathToFileURL } from 'node:url'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import { genomeBytes } from '../shared/encodings.js'
import { idOf } from '../shared/ids.js'
import { Refusal } from '../shared/refusals.js'
import type { DispatchFact, WorkItem } from '../shared/result.js'
import { ensureBuilt } from '../tests/tools/built.js'
import { emittedFile } from './entry.js'
import { bundlePlugin } from './plugin/bundle.js'
import { createPool, type PoolOptions } from './pool.js'

const folder = mkdtempSync(join(tmpdir(), 'skerry-pool-'))
beforeAll(() => ensureBuilt(), 60_000)
afterAll(() => rmSync(folder, { recursive: true, force: true }))

let made = 0
/** The pinned bundle of a plug-in whose objective is `expression` of x; `before` runs when it is loaded. */
async function pinned(expression: string, before = ''): Promise<string> {
  const source = join(folder, `p${++made}.js`)
  writeFileSync(
    source,
    `import { defineProblem, real } from 'skerry'
    ${before}
    export default defineProblem({
      name: 'probe', version: '1', summary: 'a test', genome: { x: real({ low: 0, high: 100 }) },
      objectives: { value: { direction: 'maximise', unit: '1' } },
      drawCondition: () => 0,
      simulate: ({ x: [x] }, situations) => situations.map(() => ({ objectives: { value: ${expression} } })),
    })`,
  )
  const file = join(folder, `p${made}.mjs`)
  writeFileSync(file, (await bundlePlugin(source)).code)
  return file
}

function itemOf(x: number, more: Partial<WorkItem> = {}): WorkItem {
  const spec = { x: { kind: 'real', length: 1, low: 0, high: 100, scale: 'linear' } } as const
  return {
    island: 1,
    evaluation: x,
    individual: idOf(1, x),
    firstReplicate: 0,
    replicates: 1,
    genome: genomeBytes(spec, { x: Float64Array.of(x) }),
    expectedCost: 1,
    attempt: 1,
    purpose: 'evaluate',
    isolation: 'shared',
    avoid: [],
    ...more,
  }
}

/** Starts a pool, lets it answer the items, closes it. Rejects with what made it fail. */
async function answers(
  options: Partial<PoolOptions> & { readonly pluginFile: string },
  items: readonly WorkItem[],
): Promise<DispatchFact[]> {
  const facts: DispatchFact[] = []
  let finish: (() => void) | undefined
  let fail: ((error: Error) => void) | undefined
  const finished = new Promise<void>((resolve, reject) => {
    finish = resolve
    fail = reject
  })
  finished.catch(() => undefined)
  const pool = createPool(
    { seed: 1, sharedConditions: true, threads: 2, ...options },
    {
      fact: (fact) => {
        facts.push(fact)
        if (facts.length === items.length) finish?.()
      },
      failed: (error) => fail?.(error),
    },
  )
  try {
    await pool.start()
    pool.submit(items)
    await finished
    return facts
  } finally {
    await pool.close()
  }
}

describe('a bundle that cannot be loaded is refused at the start, not tried for ever', () => {
  test.each([
    ['throws', "throw new Error('no such pump')", 'no such pump'],
    ['ends its thread', 'process.exit(5)', 'exit code 5'],
  ])('one that %s', async (_, before, detail) => {
    const pluginFile = await pinned('x', before)
    const error: unknown = await answers({ pluginFile }, [itemOf(1)]).catch((reason: unknown) => reason)
    expect(error instanceof Refusal && error.code).toBe('no-workers')
    expect(error instanceof Refusal && error.detail).toContain(detail)
  })

  test('one that is gone', async () => {
    const error: unknown = await answers({ pluginFile: join(folder, 'gone.mjs') }, []).catch(
      (reason: unknown) => reason,
    )
    expect(error instanceof Refusal && error.code).toBe('no-workers')
  })

  test('also when only processes cannot load it', async () => {
    const pluginFile = await pinned(
      'x',
      // The heap of such a process is bounded by an option, which tells it apart from the agent.
      "if (process.execArgv.length > 0) throw new Error('not here')",
    )
    const error: unknown = await answers({ pluginFile }, [itemOf(1, { isolation: 'alone' })]).catch(
      (reason: unknown) => reason,
    )
    expect(error instanceof Refusal && error.detail).toContain('not here')
  })
})

test('memory outside the heap is told apart in a process: only the eater is lost, there', async () => {
  const eat = `const eat = (x) => {
    const eaten = []
    for (let n = 0; n < 160; n++) { eaten.push(new Float64Array(2 ** 21).fill(n)); for (let i = 0; i < 4e6; i++) x += Math.sqrt(i) }
    return x
  }
  const wait = (x) => { let y = x; for (let i = 0; i < 3e7; i++) y += Math.sqrt(i); return y }`
  const pluginFile = await pinned('x === 1 ? eat(x) : x === 2 ? wait(x) : x', eat)
  const facts = await answers(
    { pluginFile, megabytes: 48 },
    [1, 2, 3, 4].map((x) => itemOf(x)),
  )
  const lost = facts.filter((fact) => fact.kind === 'lost')
  expect(lost.map(({ item, cause }) => [item.evaluation, cause])).toEqual([[1, 'memory']])
  expect(lost[0]?.executor.kind).toBe('process')
}, 90_000)

test('a confirming process is replaced after its number of items', async () => {
  const pluginFile = await pinned('process.pid')
  const items = Array.from({ length: 7 }, (_, i) => itemOf(i + 1, { purpose: 'confirm' }))
  const facts = await answers({ pluginFile, confirmationsPerProcess: 3 }, items)
  const pids = facts.map((fact) => (fact.kind === 'result' ? fact.result.values[0] : undefined))
  expect(pids.slice(0, 3)).toEqual([pids[0], pids[0], pids[0]])
  expect(new Set(pids).size).toBe(3)
})

test('local times and texts in a plug-in are the same on every machine', async () => {
  const value = 'new Date(2026, 6, 1).getTimezoneOffset() + (1234.5).toLocaleString().length'
  const facts = await answers({ pluginFile: await pinned(value) }, [
    itemOf(1),
    itemOf(2, { isolation: 'alone' }),
  ])
  expect(facts.map((fact) => fact.kind === 'result' && fact.result.values[0])).toEqual([7, 7])
})

test('a process has no environment of ours and a folder of its own', async () => {
  const before =
    "if (process.cwd().includes('skerry-work-')) { if (process.env.PATH || process.env.HOME) throw new Error('environment') }"
  const pluginFile = await pinned("process.cwd().includes('skerry-work-') ? 1 : 0", before)
  const [fact] = await answers({ pluginFile }, [itemOf(1, { isolation: 'alone' })])
  expect(fact?.kind === 'result' && fact.result.values[0]).toBe(1)
})

test('no orphans: when the parent is killed, a child ends although its simulation never returns', async () => {
  const pidFile = join(folder, 'child.pid')
  const endless = await pinned('(() => { for (;;); })()')
  const script = `
    const { createPool } = await import(${JSON.stringify(pathToFileURL(emittedFile('worker/pool')).href)})
    const { writeFileSync, readFileSync } = await import('node:fs')
    const pool = createPool({ pluginFile: ${JSON.stringify(endless)}, seed: 1, sharedConditions: true, threads: 1 },
      { fact() {}, failed(error) { console.error(error); process.exit(1) } })
    await pool.start()
    const item = ${JSON.stringify({ ...itemOf(1, { isolation: 'alone' }), genome: undefined })}
    pool.submit([{ ...item, genome: new Uint8Array(${JSON.stringify([...itemOf(1).genome])}) }])
    // The child works on its item when it has used CPU for a while.
    setInterval(() => {
      const children = readFileSync('/proc/self/task/' + process.pid + '/children', 'utf8').trim().split(' ').filter(Boolean)
      if (children.length > 1) setTimeout(() => writeFileSync(${JSON.stringify(pidFile)}, children.join(' ')), 2000)
    }, 100)
  `
  const parent = spawn(process.execPath, ['--input-type=module', '-e', script], {
    stdio: ['ignore', 'ignore', 'inherit'],
  })
  await until(() => existsSync(pidFile) && readFileSync(pidFile, 'utf8') !== '', 20)
  const children = readFileSync(pidFile, 'utf8').split(' ').map(Number)
  expect(children.length).toBe(2)
  expect(children.every(isAlive)).toBe(true)
  const folders = children.map((pid) => readlinkSync(`/proc/${pid}/cwd`))
  expect(folders.every((path) => existsSync(path))).toBe(true)
  parent.kill('SIGKILL')
  await until(() => !children.some(isAlive), 10)
  expect(folders.filter((path) => existsSync(path))).toEqual([])
}, 40_000)

function isAlive(pid: number): boolean {
  try {
    process.kill(pid, 0)
    return true
  } catch {
    return false
  }
}

async function until(holds: () => boolean, seconds: number): Promise<void> {
  const endMs = performance.now() + seconds * 1000
  while (!holds()) {
    if (performance.now() > endMs) throw new Error(`not within ${seconds} s`)
    await new Promise((resolve) => setTimeout(resolve, 50))
  }
}
