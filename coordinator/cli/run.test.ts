// What the commands around a running search print, with a search that is made up. What a real search does is tested where the
// parts are joined.

import { existsSync, mkdtempSync, readFileSync, rmSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterAll, afterEach, describe, expect, it, vi } from 'vitest'
import type { Output } from './command.js'
import { nameFrom } from './new.js'
import type { ProgressView } from './progress-view.js'
import type { House, RunEnd, RunOptions } from './run-options.js'
import { runCommandLine } from './table.js'

const house = vi.hoisted(() => ({ now: {} as Partial<House> }))
vi.mock('./house.js', () => ({ openHouse: async () => house.now }))

const root = mkdtempSync(join(tmpdir(), 'skerry-run-'))
afterAll(() => rmSync(root, { recursive: true, force: true }))
afterEach(() => {
  house.now = {}
})

const view: ProgressView = {
  state: 'searching',
  name: 'mount',
  record: 'records/mount',
  recordVersion: 1,
  semantics: 1,
  committed: 10,
  proposed: 12,
  simulations: 40,
  budget: 400,
  failedSimulations: 0,
  setAside: 0,
  islands: [],
  controls: [],
  digest: 'ab'.repeat(32),
  purity: 'none',
}

async function said(argv: readonly string[], isTerminal = false) {
  const out: string[] = []
  const notes: string[] = []
  const stopping = new AbortController()
  const make = (json: boolean): Output => ({
    json,
    isTerminal,
    columns: 80,
    unicode: true,
    print: (text) => out.push(text),
    note: (text) => notes.push(text),
    raw: (text) => out.push(text),
    signal: stopping.signal,
  })
  const exitCode = await runCommandLine(argv, '1', make)
  return { exitCode, out: out.join('\n'), notes: notes.join('\n') }
}

/** A search that tells everything there is to tell, then ends so. */
function searching(ended: RunEnd['ended'], heard: RunOptions[] = []): Partial<House> {
  return {
    runSearch: async (options) => {
      heard.push(options)
      const place = { line: 3, column: 7 }
      options.tell({
        kind: 'warned',
        file: 's.yaml',
        findings: [
          { severity: 'warning', code: 'impossible-value', place, field: 'seed', found: 'a', expected: 'b' },
        ],
      })
      options.tell({ kind: 'said', sentence: 'A thread was replaced.' })
      options.tell({ kind: 'progress', view })
      return {
        ended,
        view: { ...view, state: 'finished' },
        summary: ['Best machine: i1-00001', '  strut 1: 3 mm'],
        brief: ['Best machine: i1-00001'],
        files: [{ what: 'picture', path: 'records/mount/best.svg' }],
      }
    },
  }
}

describe('run', () => {
  it('hands over what was asked for', async () => {
    const heard: RunOptions[] = []
    house.now = searching('finished', heard)
    await said([
      'run',
      's.yaml',
      '--record',
      'r',
      '--cores',
      '3',
      '--stop-after',
      '40',
      '--accept-changes',
      '--force',
    ])
    await said(['run', 's.yaml'])
    expect(heard[0]).toMatchObject({
      file: 's.yaml',
      record: 'r',
      cores: 3,
      stopAfter: 40,
      acceptChanges: true,
      force: true,
    })
    expect(heard[1]).toMatchObject({ file: 's.yaml', acceptChanges: false, force: false })
    expect(heard[1]).not.toHaveProperty('cores')
  })
  it('prints plain lines in a log: what was said, progress, the summary and the files', async () => {
    house.now = searching('finished')
    const { exitCode, out, notes } = await said(['run', 's.yaml'])
    expect(exitCode).toBe(0)
    expect(out).toContain('A thread was replaced.')
    expect(out).toMatch(/^\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d {2}searching: 40 of 400 simulations$/m)
    expect(out).toContain('Best machine: i1-00001')
    expect(out).not.toContain('strut 1')
    expect(out).toContain('records/mount/best.svg')
    expect(out).not.toContain('\u001b')
    expect(notes).toContain('s.yaml:3:7  warning: seed')
  })
  it('prints exactly one JSON object with --json, warnings and sentences on standard error', async () => {
    house.now = searching('stop-after')
    const { out, notes } = await said(['run', 's.yaml', '--json'])
    expect(JSON.parse(out)).toMatchObject({
      ended: 'stop-after',
      state: 'finished',
      digest: view.digest,
      committed: 10,
    })
    expect(notes).toContain('A thread was replaced.')
  })
  it('redraws in place on a terminal and keeps what was said above', async () => {
    house.now = searching('finished')
    const { out } = await said(['run', 's.yaml'], true)
    expect(out).toContain('\u001b[J')
    expect(out.indexOf('A thread was replaced.')).toBeLessThan(out.indexOf('mount is searching'))
  })
  it('ends with exit code 75 when it was interrupted, so that a scheduler runs it again', async () => {
    house.now = searching('interrupted')
    expect(await said(['run', 's.yaml'])).toMatchObject({ exitCode: 75 })
  })
})

describe('progress', () => {
  it('prints at least the promised fields with --json', async () => {
    house.now = { readProgress: () => view }
    const { out, exitCode } = await said(['progress', 'records/mount', '--json'])
    expect(exitCode).toBe(0)
    const promised = ['state', 'committed', 'proposed', 'islands', 'digest', 'purity', 'recordVersion']
    for (const field of promised) expect(JSON.parse(out)).toHaveProperty(field)
  })
  it('prints the view once in a log, and goes on until the end on a terminal', async () => {
    house.now = { readProgress: () => view }
    expect((await said(['progress', 'records/mount'])).out).toContain('mount is searching: 40 of 400')
    let calls = 0
    house.now = { readProgress: () => (++calls < 2 ? view : { ...view, state: 'finished' }) }
    expect((await said(['progress', 'records/mount'], true)).out).toContain('mount is finished')
    expect(calls).toBe(2)
  })
})

describe('rederive', () => {
  it('prints a line an island, the digest and what was simulated again', async () => {
    const islands = [{ name: 'i1', commits: 40, digest: 'cd'.repeat(32) }]
    house.now = {
      rederive: async () => ({ islands, digest: 'ef'.repeat(32), resimulated: 5, exactness: 'bits' }),
    }
    const { out } = await said(['rederive', 'records/mount', '--resimulate', '5'])
    expect(out).toMatch(/^i1 +40 +cdcdcdcdcdcdcdcd$/m)
    expect(out).toContain(`search digest ${'ef'.repeat(32)}`)
    expect(out).toContain('5 evaluations simulated again gave the recorded numbers to the last bit')
  })
})

describe('new', () => {
  it('writes two files, says what to do next, and never overwrites', async () => {
    const folder = join(root, 'My Mount')
    const first = await said(['new', folder, '--workers', '40'])
    expect(first.exitCode).toBe(0)
    expect(first.out).toContain('skerry check')
    const text = readFileSync(join(folder, 'search.yaml'), 'utf8')
    expect(text).toContain('name: my-mount')
    expect(text).toContain('workersExpected: 40')
    expect(existsSync(join(folder, 'problem.ts'))).toBe(true)
    const second = await said(['new', folder])
    expect(second.exitCode).toBe(64)
    expect(second.notes).toContain('never overwrites')
    expect(readFileSync(join(folder, 'search.yaml'), 'utf8')).toBe(text)
  })
  it('makes a name of any folder', () => {
    expect([nameFrom('/a/Pump No. 7/'), nameFrom('...'), nameFrom('x')]).toEqual(['pump-no-7', 'search', 'x'])
  })
})
