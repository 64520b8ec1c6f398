// The replay that `run` leaves: one file that any browser opens by itself, moving, without network.

import { spawnSync } from 'node:child_process'
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterAll, beforeAll, expect, test } from 'vitest'
import { demoProblemText } from '../../coordinator/cli/demo.js'
import { root } from '../house/source.js'
import { ensureBuilt } from '../tools/built.js'
import { colours, difference, lookAt } from './pages.js'

let folder = ''
let replay = ''

const searchText = `name: replay
problem: ./problem.js
seed: 7
budget: { simulations: 60 }
islands: [{ method: nsga-ii, population: 10, lookahead: 5 }]
`

beforeAll(() => {
  ensureBuilt()
  folder = mkdtempSync(join(tmpdir(), 'skerry-replay-'))
  writeFileSync(join(folder, 'problem.js'), demoProblemText)
  writeFileSync(join(folder, 'search.yaml'), searchText)
  const program = join(root, 'dist/coordinator/cli/skerry.js')
  const args = [program, 'run', 'search.yaml', '--record', 'record', '--cores', '2']
  const done = spawnSync(process.execPath, args, { cwd: folder, encoding: 'utf8' })
  if (done.status !== 0) throw new Error(`skerry run ended with ${done.status}: ${done.stderr}`)
  replay = join(folder, 'record', 'replay.html')
})

afterAll(() => rmSync(folder, { recursive: true, force: true }))

test('the replay is one file that names no other', () => {
  const text = readFileSync(replay, 'utf8').replaceAll(/xmlns="[^"]*"|www\.w3\.org[\w/.]*/g, '')
  expect(text).not.toMatch(/https?:\/\//)
  expect(text).not.toMatch(/<(?:script|img|link|iframe)[^>]+(?:src|href)=/)
  expect(text).not.toMatch(/\bfetch\(|XMLHttpRequest|WebSocket|import\(/)
})

test('the replay carries the cautions of the machine', () => {
  expect(readFileSync(replay, 'utf8')).toMatch(/caution/i)
})

test('the browser draws the replay, it moves, and the page complains of nothing', () => {
  const early = lookAt(replay, 300)
  const late = lookAt(replay, 2500)
  expect([...early.complaints, ...late.complaints]).toEqual([])
  expect(colours(early.picture)).toBeGreaterThan(5)
  expect(difference(early.picture, late.picture)).toBeGreaterThan(0.0005)
})
