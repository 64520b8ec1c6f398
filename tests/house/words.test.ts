// What must not stand in a file that we publish: paths of the machine it was written on, and hosts of package
// registries (the client knows its registry; a lock file without hosts works with any).

import { execFileSync } from 'node:child_process'
import { existsSync, readFileSync } from 'node:fs'
import { join } from 'node:path'
import { expect, test } from 'vitest'
import { root } from './source.js'

// Taken apart, so that this file does not hold what it looks for.
const forbidden = [
  ['/wo', 'rk/'],
  ['/tm', 'p/'],
  ['/ro', 'ot/'],
  ['/ho', 'me/'],
  ['/Us', 'ers/'],
  ['registry.np', 'mjs'],
  ['registry.ya', 'rnpkg'],
  ['deb.deb', 'ian'],
  ['archive.ubu', 'ntu'],
  ['py', 'pi.org'],
].map((pieces) => pieces.join(''))

function trackedFiles(): string[] {
  const args = ['ls-files', '-z', '--cached', '--others', '--exclude-standard']
  const listed = execFileSync('git', args, { cwd: root, encoding: 'utf8' }).split('\0')
  return listed.filter((path) => path !== '' && existsSync(join(root, path)))
}

function complaints(path: string, text: string): string[] {
  const lines = text.split('\n')
  return lines.flatMap((line, index) =>
    forbidden.filter((word) => line.includes(word)).map((word) => `${path}:${index + 1} holds ${word}`),
  )
}

test('no file holds a path of the machine it was written on, or the host of a package registry', () => {
  const files = trackedFiles()
  expect(files.length).toBeGreaterThan(20)
  const found = files.flatMap((path) => complaints(path, readFileSync(join(root, path), 'latin1')))
  expect(found).toEqual([])
})

test('each forbidden word is caught with its place', () => {
  for (const word of forbidden)
    expect(complaints('a.md', `first\nsee ${word}x`)).toEqual([`a.md:2 holds ${word}`])
})
