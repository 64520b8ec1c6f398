import { spawnSync } from 'node:child_process'
import { join } from 'node:path'
import { expect, test } from 'vitest'
import { root } from '../house/source.js'

/** The test runner with no chromium to be had, and what it said. */
function npmTest(...args: string[]) {
  const env = { ...process.env, SKERRY_CHROMIUM: join(root, 'no-such-program') }
  const done = spawnSync(process.execPath, ['tests/tools/run-tests.mjs', ...args], {
    cwd: root,
    encoding: 'utf8',
    env,
  })
  const lines = done.stdout.trimEnd().split('\n')
  return { status: done.status, lines, last: lines.at(-1), errors: done.stderr }
}

test('a missing service ends the run with what was not run, a cure, and a non-zero exit', () => {
  const { status, lines, last } = npmTest('--only', 'browser')
  expect(last).toMatch(/^0 passed, 0 failed, \d+ not run: needs chromium$/)
  expect(status).toBe(1)
  const text = lines.join('\n')
  expect(text).toMatch(/^not run: .*replay.* \(needs chromium\)$/m)
  expect(text).toContain('With root: apt-get install chromium')
  expect(text).toContain('without root: set SKERRY_CHROMIUM')
})

test('a service left out knowingly turns its tests into skipped ones, each named with the reason', () => {
  const { lines, last } = npmTest('--only', 'browser', '--without', 'chromium')
  expect(last).toMatch(/^0 passed, 0 failed, \d+ skipped$/)
  const named = lines.filter((line) => /^skipped: tests\/browser\/.* \(--without chromium\)$/.test(line))
  expect(last).toBe(`0 passed, 0 failed, ${named.length} skipped`)
  // Exactly one line is the closing line.
  expect(lines.filter((line) => /^\d+ passed, \d+ failed/.test(line))).toHaveLength(1)
})

test.each([
  [['--only', 'nothing'], "there is no phase 'nothing'"],
  [['--without', 'coffee'], "there is no service 'coffee'"],
  [['--fast'], '--fast'],
])('%s is refused with 64, and the help says what there is', (args, reason) => {
  const { status, errors } = npmTest(...args)
  expect(status).toBe(64)
  expect(errors).toContain(reason)
  expect(errors).toContain('--only')
})
