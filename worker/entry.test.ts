import { existsSync } from 'node:fs'
import { beforeAll, expect, test } from 'vitest'
import { Refusal } from '../shared/refusals.js'
import { ensureBuilt } from '../tests/tools/built.js'
import { emittedFile, emittedRoot } from './entry.js'

beforeAll(() => ensureBuilt(), 60_000)

test('finds emitted files and folders with an index', () => {
  for (const module of ['worker/thread', 'shared/detmath']) {
    const file = emittedFile(module)
    expect(existsSync(file) && file.startsWith(emittedRoot) && file.endsWith('.js')).toBe(true)
  }
})

test('what was not built is refused, with the command that builds it', () => {
  expect(() => emittedFile('worker/nothing')).toThrow(Refusal)
  try {
    emittedFile('worker/nothing')
  } catch (error) {
    expect(error instanceof Refusal && error.detail).toContain('worker/nothing')
    expect(error instanceof Refusal && error.cure).toContain('npm run build')
  }
})
