import { readFileSync } from 'node:fs'
import { join, matchesGlob } from 'node:path'
import { expect, test } from 'vitest'
import config from '../../vitest.config.js'
import { phases } from '../tools/phases.mjs'
import { services } from '../tools/services.mjs'
import { readSources, root } from './source.js'

interface Project {
  readonly test: { readonly name: string; readonly include: readonly string[] }
}
const projects = (config as unknown as { test: { projects: Project[] } }).test.projects

test('every test file is run by exactly one phase of npm test', () => {
  const testFiles = readSources().filter((source) => source.path.endsWith('.test.ts'))
  const homes = testFiles.map(({ path }) => ({
    path,
    in: projects
      .filter(({ test: one }) => one.include.some((glob) => matchesGlob(path, glob)))
      .map((one) => one.test.name),
  }))
  expect(homes.filter((home) => home.in.length !== 1)).toEqual([])
  const empty = projects.filter(({ test: one }) => !homes.some((home) => home.in[0] === one.name))
  expect(empty.map((project) => `phase ${project.test.name} has no test`)).toEqual([])
})

test('every vitest project is a phase, and phases name known services only', () => {
  const run = phases.flatMap((phase) => phase.project ?? [])
  expect(run.sort()).toEqual(projects.map((project) => project.test.name).sort())
  for (const need of phases.flatMap((phase) => [...(phase.needs ?? []), ...(phase.wants ?? [])]))
    expect(Object.keys(services)).toContain(need)
})

test('no test is switched off in the source without a reason', () => {
  const off = /\b(?:test|it|describe)\.(?:skip|todo|only)\b/
  const found = readSources()
    .filter((source) => source.path.endsWith('.test.ts') && source.path !== 'tests/house/phases.test.ts')
    .filter((source) => off.test(source.text))
  expect(found.map((source) => source.path)).toEqual([])
})

test('.ci/run runs what a newcomer runs, without input', () => {
  const script = readFileSync(join(root, '.ci/run'), 'utf8')
  expect(script).toMatch(/^npm ci\b.*<\/dev\/null$/m)
  expect(script).toMatch(/^npm test <\/dev\/null$/m)
})
