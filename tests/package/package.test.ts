// What a stranger gets from the registry: packed, unpacked into an empty folder and run from there, without the
// repository in reach. Dependencies are linked instead of installed, because compiling SQLite takes a minute and
// is npm's work, not the package's.

import { execFileSync, spawnSync } from 'node:child_process'
import {
  existsSync,
  mkdirSync,
  mkdtempSync,
  readdirSync,
  readFileSync,
  rmSync,
  symlinkSync,
  writeFileSync,
} from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterAll, beforeAll, expect, test } from 'vitest'
import { root } from '../house/source.js'

let home = ''
let packed: string[] = []
const manifest = JSON.parse(readFileSync(join(root, 'package.json'), 'utf8'))

beforeAll(() => {
  home = mkdtempSync(join(tmpdir(), 'skerry-package-'))
  execFileSync(process.execPath, [join(root, 'tests/tools/build.mjs')], { cwd: root, stdio: 'inherit' })
  const args = ['pack', '--ignore-scripts', '--json', '--pack-destination', home]
  const [report] = JSON.parse(execFileSync('npm', args, { cwd: root, encoding: 'utf8' }))
  packed = report.files.map((file: { path: string }) => file.path)
  execFileSync('tar', ['-xzf', join(home, report.filename), '-C', home])
  linkDependencies()
})

afterAll(() => rmSync(home, { recursive: true, force: true }))

/** home/node_modules/skerry is the unpacked package, everything beside it a link to what is installed here. */
function linkDependencies(): void {
  const modules = join(home, 'node_modules')
  mkdirSync(modules)
  for (const name of readdirSync(join(root, 'node_modules'))) {
    if (!name.startsWith('.') && !name.startsWith('skerry'))
      symlinkSync(join(root, 'node_modules', name), join(modules, name))
  }
  execFileSync('mv', [join(home, 'package'), join(modules, 'skerry')])
}

const skerry = (...args: string[]) => {
  const program = join(home, 'node_modules', 'skerry', manifest.bin.skerry)
  return spawnSync(process.execPath, [program, ...args], {
    cwd: home,
    encoding: 'utf8',
    env: { ...process.env, NO_COLOR: '1' },
  })
}

test('the package holds the program, the documents and the set-up script', () => {
  const wanted = ['LICENSE', 'README.md', 'DEVELOPERS.md', 'CHANGELOG.md', 'CITATION.cff', 'package.json']
  const entries = [
    manifest.bin.skerry,
    manifest.types,
    manifest.exports['.'].default,
    'coordinator/setup/preinstall.mjs',
  ]
  const paths = [...wanted, ...entries].map((path: string) => path.replace(/^\.\//, ''))
  expect(paths.filter((path) => !packed.includes(path))).toEqual([])
})

test('the package holds nothing else: no tests, no sources, no build stamp, no records', () => {
  const known =
    /^(dist\/.+\.(js|d\.ts|html|css|svg|wasm|yaml|mjs)|coordinator\/setup\/\w+\.mjs|[A-Z]+\.md|LICENSE|CITATION\.cff|package\.json)$/
  expect(packed.filter((path) => !known.test(path) || path.includes('.test.'))).toEqual([])
})

test('the set-up script runs from the unpacked package', () => {
  const cwd = join(home, 'node_modules', 'skerry')
  const done = spawnSync('sh', ['-c', manifest.scripts.preinstall], { cwd, encoding: 'utf8' })
  expect(done.stderr).toBe('')
  expect(done.status).toBe(0)
})

test('skerry --help and --version work', () => {
  const help = skerry('--help')
  expect(help.stderr).toBe('')
  expect(help.status).toBe(0)
  expect(help.stdout).toContain('skerry')
  expect(skerry('--version').stdout.trim()).toBe(manifest.version)
})

test('a plug-in author gets types for what the package exports', () => {
  const source = `import { defineProblem } from 'skerry'\nexport const make: typeof defineProblem = defineProblem\n`
  writeFileSync(join(home, 'problem.ts'), source)
  const tsc = join(root, 'node_modules', 'typescript', 'bin', 'tsc')
  const args = ['--noEmit', '--strict', '--module', 'nodenext', '--types', '', '--skipLibCheck', 'problem.ts']
  const done = spawnSync(process.execPath, [tsc, ...args], { cwd: home, encoding: 'utf8' })
  expect(done.stdout).toBe('')
  expect(done.status).toBe(0)
})

/** The first fenced block of this language in the README. */
function example(language: string): string {
  const text = readFileSync(join(root, 'README.md'), 'utf8')
  const block = new RegExp(`\`\`\`${language}\\n([^\`]*)\`\`\``).exec(text)?.[1]
  if (block === undefined) throw new Error(`README.md has no ${language} example`)
  return block
}

test('the search file and the problem that README.md shows pass skerry check and the type check', () => {
  const folder = join(home, 'example')
  mkdirSync(folder)
  writeFileSync(join(folder, 'search.yaml'), example('yaml'))
  writeFileSync(join(folder, 'pump-mount.ts'), example('ts'))
  const tsc = join(root, 'node_modules', 'typescript', 'bin', 'tsc')
  const args = [
    '--noEmit',
    '--strict',
    '--module',
    'nodenext',
    '--types',
    '',
    '--skipLibCheck',
    'pump-mount.ts',
  ]
  expect(spawnSync(process.execPath, [tsc, ...args], { cwd: folder, encoding: 'utf8' }).stdout).toBe('')
  const checked = skerry('check', join('example', 'search.yaml'))
  expect(checked.stderr).toBe('')
  expect(checked.status).toBe(0)
})

test('a new search made by the package runs in an empty folder', () => {
  const made = skerry('new', 'culvert')
  expect(made.stderr).toBe('')
  expect(made.status).toBe(0)
  const files = readdirSync(join(home, 'culvert')).filter((file) => /\.ya?ml$/.test(file))
  expect(files).toHaveLength(1)
  const run = skerry(
    'run',
    join('culvert', files[0]!),
    '--stop-after',
    '40',
    '--cores',
    '1',
    '--record',
    'record',
  )
  expect(run.stderr).toBe('')
  expect(run.status).toBe(0)
  expect(existsSync(join(home, 'record', 'record.db'))).toBe(true)
})
