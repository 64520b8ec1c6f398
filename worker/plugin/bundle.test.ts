import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { dirname, join } from 'node:path'
import { afterAll, beforeAll, describe, expect, test } from 'vitest'
import * as detmath from '../../shared/detmath/index.js'
import { Refusal } from '../../shared/refusals.js'
import { stream } from '../../shared/streams.js'
import { evaluate } from '../../sim/evaluate.js'
import { ensureBuilt } from '../../tests/tools/built.js'
import { bundlePlugin } from './bundle.js'
import { loadPlugin } from './load.js'

const folder = mkdtempSync(join(tmpdir(), 'skerry-bundle-'))
beforeAll(() => ensureBuilt(), 60_000)
afterAll(() => rmSync(folder, { recursive: true, force: true }))

/** Writes files below a fresh folder and gives the path of the first. */
let made = 0
function files(contents: { readonly [name: string]: string | Uint8Array }, below = `case-${++made}`): string {
  const paths = Object.entries(contents).map(([name, text]) => {
    const path = join(folder, below, name)
    mkdirSync(dirname(path), { recursive: true })
    writeFileSync(path, text)
    return path
  })
  return paths[0]!
}

/** A plug-in whose one objective is `expression`, in which `x` is a number the compiler cannot know. */
function pluginOf(expression: string, before = ''): string {
  return `
    import { defineProblem, real } from 'skerry'
    ${before}
    export default defineProblem({
      name: 'probe', version: '1', summary: 'a test', genome: { x: real({ low: 0, high: 10 }) },
      objectives: { value: { direction: 'maximise', unit: '1' } },
      drawCondition: (stream) => stream.uniform(),
      simulate: (genome, situations) => situations.map(() => {
        const x: number = genome.x[0]!
        return { objectives: { value: ${expression} } }
      }),
    })`
}

async function valueFrom(expression: string, x: number, before = ''): Promise<number> {
  const { code } = await bundlePlugin(files({ 'problem.ts': pluginOf(expression, before) }))
  const result = evaluate(await loadPlugin({ code }), { x: Float64Array.of(x) }, 1, true, 1, 0, 1)
  if (result.failures[0]) throw new Error(result.failures[0].reason)
  return result.values[0]!
}

async function refusalOf(work: Promise<unknown>): Promise<Refusal> {
  const error = await work.then(
    () => undefined,
    (reason: unknown) => reason,
  )
  if (!(error instanceof Refusal)) throw new Error(`expected a refusal, found ${String(error)}`)
  return error
}

describe('a bundle', () => {
  const contents = {
    'problem.ts': pluginOf(
      'helped(x) + bytes.length + fromPackage',
      `
      import { helped } from './lib/helper.js'
      import bytes from './kernel.wasm'
      import { fromPackage } from 'pump-tables'
      // Überdruck: a comment and a name outside ASCII
      const größe = 'ä'; void größe`,
    ),
    'lib/helper.ts': 'export const helped = (x: number): number => Math.sin(x)',
    'kernel.wasm': Uint8Array.of(0, 97, 115, 109, 1, 0, 0, 0, 255),
    'node_modules/pump-tables/package.json': '{"name":"pump-tables","main":"index.cjs"}',
    'node_modules/pump-tables/index.cjs': 'exports.fromPackage = 5',
  }

  test('is the same bytes in two folders, and says nothing about the machine', async () => {
    const a = await bundlePlugin(files(contents, 'here'))
    const b = await bundlePlugin(files(contents, 'somewhere/deeper/down'))
    expect(b).toEqual(a)
    expect(a.code).not.toContain(folder)
    expect(a.code).not.toContain('/dist/')
    expect(a.inputs).toEqual(
      expect.arrayContaining(['problem.ts', 'lib/helper.ts', 'node_modules/pump-tables/index.cjs']),
    )
    expect(a.inputs.filter((input) => input.startsWith('..') || input.startsWith('/'))).toEqual([])
    expect(a.digest).toMatch(/^[0-9a-f]{64}$/)
  })

  test('does not depend on a tsconfig that lies about', async () => {
    const plain = await bundlePlugin(files(contents, 'plain'))
    const config =
      '{"compilerOptions":{"target":"es5","useDefineForClassFields":false,"experimentalDecorators":true}}'
    expect(await bundlePlugin(files({ ...contents, 'tsconfig.json': config }, 'with-config'))).toEqual(plain)
  })

  test('changes its digest when a file it imports changes', async () => {
    const a = await bundlePlugin(files(contents, 'before'))
    const helper = 'export const helped = (x: number): number => Math.cos(x)'
    const b = await bundlePlugin(files({ ...contents, 'lib/helper.ts': helper }, 'after'))
    expect(b.digest).not.toBe(a.digest)
  })

  test('holds imports, packages and wasm as bytes, and loads by itself from text and from a file', async () => {
    const { code } = await bundlePlugin(files(contents, 'loads'))
    const pinned = join(folder, 'pinned.mjs')
    writeFileSync(pinned, code)
    for (const source of [{ code }, { file: pinned }]) {
      const result = evaluate(await loadPlugin(source), { x: Float64Array.of(2) }, 1, true, 1, 0, 1)
      expect(result.values[0]).toBe(detmath.sin(2) + 9 + 5)
    }
  })
})

describe('mathematics in a plug-in is exact', () => {
  const x = 1.2345678901234567
  const ways = {
    'Math.sin(x)': '',
    "Math['sin'](x)": '',
    'sin(x)': 'const { sin } = Math',
    'library(x)': 'const library = Math.sin',
    'globalThis.Math.sin(x)': '',
    "globalThis['Math']['sin'](x)": '',
    'where.Math.sin(x)': 'const where = globalThis',
    'global.Math.sin(x)': 'declare const global: typeof globalThis',
    'self.Math.sin(x)': 'declare const self: typeof globalThis',
    "eval('Math.sin(' + x + ')')": '',
  }
  test.each(Object.entries(ways))('by way of %s', async (expression, before) => {
    expect(Object.is(await valueFrom(expression, x, before), detmath.sin(x))).toBe(true)
  })

  // The host's sine differs from ours in the last bit for some arguments: without one, the tests above could not fail.
  test('and not the host’s: some sine of the host differs', () => {
    const draws = stream(20261201, 'check')
    const differing = Array.from({ length: 100_000 }, () => 20 * draws.uniform()).find(
      (a) => Math.sin(a) !== detmath.sin(a),
    )
    expect(differing).toBeDefined()
  })

  test('where the host differs, the plug-in has ours', async () => {
    const draws = stream(20261201, 'check')
    const argument = Array.from({ length: 100_000 }, () => 10 * draws.uniform()).find(
      (a) => Math.sin(a) !== detmath.sin(a),
    )!
    expect(await valueFrom('Math.sin(x)', argument)).toBe(detmath.sin(argument))
  })

  test('also for the power operator and its assignment', async () => {
    const { code } = await bundlePlugin(
      files({
        'problem.ts': pluginOf('x ** 0.3 + power(x)', 'const power = (a: number) => { a **= 1.7; return a }'),
      }),
    )
    expect(code).not.toMatch(/x \*\* 0\.3|a \*\*= 1\.7/)
    expect(code).toContain('Math.pow')
    const values = await valueFrom('x ** 0.3 - Math.pow(x, 0.3)', 3)
    expect(values).toBe(0)
  })

  test('exact functions and constants are the host’s', async () => {
    expect(
      await valueFrom('Math.sqrt(x) + Math.floor(x) + Math.PI + Math.max(x, 2) + Math.imul(3, 4)', 7.5),
    ).toBe(Math.sqrt(7.5) + 7 + Math.PI + 7.5 + 12)
  })

  test('a plug-in may call its own things Math, Date or skerryHost', async () => {
    const before = `const Math = { sin: (a: number) => a }; const Date = 2; const skerryHost = 3; import { cosine } from './other.js'`
    const file = files({
      'problem.ts': pluginOf('Math.sin(x) + Date + skerryHost + cosine(x)', before),
      'other.ts': 'export const cosine = (a: number) => Math.cos(a)',
    })
    const { code } = await bundlePlugin(file)
    const result = evaluate(await loadPlugin({ code }), { x: Float64Array.of(4) }, 1, true, 1, 0, 1)
    expect(result.values[0]).toBe(4 + 2 + 3 + detmath.cos(4))
  })
})

test.each([
  ['Math.random()', 'draw it from the condition'],
  ['globalThis.crypto.getRandomValues(new Uint32Array(1))[0]', 'draw it from the condition'],
  ['Date.now()', 'count steps'],
  ['new Date().getTime()', 'count steps'],
  ['performance.now()', 'count steps'],
  ['globalThis.performance.now()', 'count steps'],
])('%s in a simulation fails and says what to do', async (expression, advice) => {
  await expect(valueFrom(expression, 1)).rejects.toThrow(advice)
})

test('a time that is given is no clock', async () => {
  expect(await valueFrom('new Date(86400000).getTime() + Date.UTC(1970, 0, 1)', 1)).toBe(86400000)
})

describe('bad plug-ins are refused', () => {
  test('a missing file, with the near name', async () => {
    const file = files({ 'crawler.ts': '' })
    const refusal = await refusalOf(bundlePlugin(join(dirname(file), 'crawlr.ts')))
    expect(refusal.code).toBe('problem-not-found')
    expect(refusal.cure).toContain('crawler.ts')
  })

  test('a missing file in a missing folder', async () => {
    expect((await refusalOf(bundlePlugin(join(folder, 'nowhere', 'p.ts')))).code).toBe('problem-not-found')
  })

  test('a folder and a file of another kind', async () => {
    expect((await refusalOf(bundlePlugin(folder))).code).toBe('problem-not-found')
    const refusal = await refusalOf(bundlePlugin(files({ 'problem.py': 'pass' })))
    expect(refusal.code).toBe('problem-does-not-bundle')
    expect(refusal.detail).toContain('.py')
  })

  test('a syntax error, with file, line and column', async () => {
    const file = files({ 'problem.ts': 'export const a = 1\nexport default {{\n' })
    const refusal = await refusalOf(bundlePlugin(file))
    expect(refusal.code).toBe('problem-does-not-bundle')
    expect(refusal.where).toEqual({ file, line: 2, column: 17 })
  })

  test('an import that is not there, in the file that wants it', async () => {
    const file = files({
      'problem.ts': "import './part.js'\nexport default 1",
      'part.ts': "\nimport 'pump-tables'",
    })
    const refusal = await refusalOf(bundlePlugin(file))
    expect(refusal.code).toBe('problem-does-not-bundle')
    expect(refusal.detail).toContain('pump-tables')
    expect(refusal.where).toMatchObject({ file: join(dirname(file), 'part.ts'), line: 2 })
  })

  test.each(['node:fs', 'fs', 'node:worker_threads'])('a module of Node: %s', async (name) => {
    const text = `import * as it from '${name}'\nexport default it`
    const refusal = await refusalOf(bundlePlugin(files({ 'problem.ts': text })))
    expect(refusal.code).toBe('problem-does-not-bundle')
    expect(refusal.detail).toContain('plug-ins are pure')
  })

  test('an unknown part of this package', async () => {
    const refusal = await refusalOf(
      bundlePlugin(files({ 'problem.ts': "import 'skerry/worker'\nexport default 1" })),
    )
    expect(refusal.detail).toContain("import from 'skerry'")
  })

  test('one that only tries for Node at run time gets a warning', async () => {
    const { warnings } = await bundlePlugin(
      files({ 'problem.ts': pluginOf('x', "export const late = () => import('node:fs')") }),
    )
    expect(warnings.join()).toContain('node:fs')
  })

  test('a wrong export of a library name warns before it runs', async () => {
    const file = files({
      'problem.ts': "import { nothing } from './b.js'\nexport default nothing",
      'b.ts': 'export const b = 1',
    })
    expect((await refusalOf(bundlePlugin(file))).detail).toContain('nothing')
  })

  const loaded = async (text: string) => {
    const { code } = await bundlePlugin(files({ 'problem.ts': text }))
    return loadPlugin({ code })
  }

  test('one that throws while it is loaded', async () => {
    const refusal = await refusalOf(loaded("throw new RangeError('no such pump')"))
    expect(refusal.code).toBe('problem-throws')
    expect(refusal.detail).toContain('RangeError: no such pump')
  })

  test('one without a default export', async () => {
    const refusal = await refusalOf(loaded('export const problem = 1'))
    expect(refusal.code).toBe('not-a-problem')
    expect(refusal.detail).toContain('no default export')
  })

  test.each(['export default 7', 'export default () => 1', "export default 'text'", 'export default null'])(
    'one that is no problem: %s',
    async (text) => {
      expect((await refusalOf(loaded(text))).code).toBe('not-a-problem')
    },
  )

  test('one with a field that does not fit, named', async () => {
    const file = pluginOf('x').replace("'maximise'", "'maximize'")
    expect((await refusalOf(loaded(file))).where).toMatchObject({ field: 'objectives.value.direction' })
  })

  test('a bundle that is gone', async () => {
    expect((await refusalOf(loadPlugin({ file: join(folder, 'gone.mjs') }))).code).toBe('problem-not-found')
  })
})
