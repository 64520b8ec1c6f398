import { expect, test } from 'vitest'
import { bannedUses } from './banned.js'
import { readSources, show } from './source.js'

const complaints = (text: string, path = 'sim/a.ts') => show(bannedUses([{ path, text }]))

test('the pure core touches no Node, clock, timer, entropy, process or host transcendental', () => {
  expect(show(bannedUses(readSources()))).toEqual([])
})

const caught: [string, string][] = [
  ["import { readFileSync } from 'node:fs'", 'node:fs: let the caller'],
  ["import fs from 'fs'", 'fs: let the caller'],
  ["export * from 'node:path'", 'node:path: let the caller'],
  ["const os = await import('node:os')", 'node:os: let the caller'],
  ['const x = await import(name)', 'import of a computed name'],
  ['const t = Date.now()', 'Date: time comes in'],
  ['const t = new Date()', 'Date: time comes in'],
  ['const t = performance.now()', 'performance: time comes in'],
  ['setTimeout(() => {}, 1)', 'setTimeout: waiting'],
  ['queueMicrotask(() => {})', 'queueMicrotask: waiting'],
  ['const r = Math.random()', 'Math.random: draw from a stream'],
  ['crypto.getRandomValues(a)', 'crypto: draw from a stream'],
  ['const e = process.env.X', 'process: let the caller'],
  ['const b = Buffer.alloc(3)', 'Buffer: use Uint8Array'],
  ['globalThis.process', 'globalThis: name what you mean'],
  ['console.log(1)', 'console: return'],
  ['const s = Math.sin(1)', 'Math.sin: use sin of shared/detmath'],
  ['const s = Math.pow(1, 2)', 'Math.pow: use pow of shared/detmath'],
  ['const s = Math.hypot(1, 2)', 'Math.hypot: use hypot of shared/detmath'],
  ['const s = Math.cbrt(1)', 'Math.cbrt: use cbrt of shared/detmath'],
  ['const s = Math.atan2(1, 2)', 'Math.atan2: use atan2 of shared/detmath'],
  ["const s = Math['sin'](1)", 'Math may only be used as Math.name'],
  ['const { sin } = Math', 'Math may only be used as Math.name'],
  ['const s = x ** 2', '**: multiply'],
  ['const s = 2 ** 0.5', '**: multiply'],
  ['let s = 2\ns **= n', '**=: multiply'],
  ['names.sort((a, b) => a.localeCompare(b))', 'localeCompare: compare with'],
  ['const f = n.toLocaleString()', 'toLocaleString: it depends on the host'],
  ['const w = new WeakRef(o)', 'WeakRef: its answer depends'],
  ['const u = import.meta.url', 'import.meta: let the caller'],
  ['const o = { Date }', 'Date: time comes in'],
]

test.each(caught)('%s is caught and the replacement named', (text, expected) => {
  const found = complaints(text)
  expect(found).toHaveLength(1)
  expect(found[0]).toContain(expected)
})

const allowed = [
  'const a = Math.sqrt(2) + Math.abs(-1) + Math.PI',
  'const limit = 2 ** 40',
  'const big = 2n ** 200n',
  '// Math.random() and Date.now()',
  "const text = 'Math.random()'",
  'function f(process: number) { return process + 1 }',
  'function f() { const module = 1; return module }',
  "import { process } from './stages.js'\nprocess(1)",
  'const point = { Date: 1 }; const d = point.Date',
  'type When = Date',
  'function f(at: Date): Map<string, Date> { return new Map() }',
]

test.each(allowed)('%s is left alone', (text) => {
  expect(complaints(text)).toEqual([])
})

test('the border and the tests may use Node', () => {
  const text = "import { readFileSync } from 'node:fs'\nDate.now()"
  expect(complaints(text, 'worker/a.ts')).toEqual([])
  expect(complaints(text, 'sim/a.test.ts')).toEqual([])
  expect(complaints(text, 'coordinator/engine/a.ts')).toHaveLength(2)
})
