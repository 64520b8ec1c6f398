// Bundling a plug-in: one TypeScript or JavaScript file, with its imports and its wasm, becomes one module whose
// bytes are pinned in the record. The same sources give the same bytes in any folder on any machine: no absolute
// names, no time, no settings of the surroundings (tsconfig) enter.

import { createHash } from 'node:crypto'
import { readdirSync, readFileSync, realpathSync, statSync } from 'node:fs'
import { builtinModules } from 'node:module'
import { basename, dirname, extname, join, relative, sep } from 'node:path'
import {
  type BuildOptions,
  type BuildResult,
  build,
  type Message,
  type OnResolveArgs,
  type Plugin,
} from 'esbuild'
import { type Refusal, refuse } from '../../shared/refusals.js'
import { builtInProblems } from '../../sim/problems/index.js'
import { emittedFile, emittedRoot } from '../entry.js'
import { nearNames } from './near.js'
import { openingText, reservedNames, substitutions } from './purity.js'

export interface PluginBundle {
  /** One ES module; its default export is the problem. */
  readonly code: string
  /** Hex SHA-256 of `code` in UTF-8. */
  readonly digest: string
  /** What went in: the plug-in's files relative to its folder, packages as node_modules/..., ours as skerry/... */
  readonly inputs: readonly string[]
  /** For a person, each with file and line. */
  readonly warnings: readonly string[]
}

const extensions = ['.ts', '.mts', '.js', '.mjs'] as const

/**
 * Bundles the plug-in in `file`. Refuses: problem-not-found (with near names), problem-does-not-bundle (with file, line
 * and column: syntax errors, imports that are missing, imports of Node's own modules).
 */
export async function bundlePlugin(file: string): Promise<PluginBundle> {
  const entry = mustExist(file)
  return bundleModule(file, `./${basename(entry)}`, dirname(entry))
}

/** True for the name of a problem that comes with this package: skerry/problems/NAME. */
export function isBuiltIn(problem: string): boolean {
  return problem.startsWith(builtInPrefix)
}

/** Bundles the problem 'skerry/problems/NAME'. Refuses problem-not-found, with near names. */
export async function bundleBuiltIn(module: string): Promise<PluginBundle> {
  const name = module.slice(builtInPrefix.length)
  if (!Object.hasOwn(builtInProblems, name)) {
    const near = nearNames(name, Object.keys(builtInProblems)).map((one) => `${builtInPrefix}${one}`)
    throw refuse('problem-not-found', {
      detail: `there is no problem ${module}; there are ${Object.keys(builtInProblems).sort().join(', ')}.`,
      ...(near.length === 0 ? {} : { cure: `Did you mean ${near.join(' or ')}?` }),
    })
  }
  return bundleModule(module, module, emittedRoot)
}

const builtInPrefix = 'skerry/problems/'

async function bundleModule(file: string, module: string, folder: string): Promise<PluginBundle> {
  const result = await buildOrRefuse(file, {
    ...fixedOptions,
    stdin: { contents: wrapper(module), resolveDir: folder, sourcefile: 'plug-in', loader: 'js' },
    absWorkingDir: folder,
    format: 'esm',
    banner: { js: openingText(await detMathCode()) },
    define: substitutions(),
    plugins: [ownModules, pureModules, stoppedClock],
  })
  const inputs = Object.keys(result.metafile?.inputs ?? {})
  const used = Object.values(result.metafile?.outputs ?? {}).flatMap((output) => Object.keys(output.inputs))
  const code = withoutPaths(result.outputFiles?.[0]?.text ?? '', inputs, folder)
  return {
    code,
    digest: createHash('sha256').update(code, 'utf8').digest('hex'),
    inputs: used.filter((input) => input !== 'plug-in').map((input) => canonicalName(input, folder)),
    warnings: result.warnings.filter((warning) => warning.id !== 'import-is-undefined').map(messageLine),
  }
}

/** What could change the output and is not the plug-in's own is fixed here. */
const fixedOptions = {
  bundle: true,
  write: false,
  metafile: true,
  platform: 'neutral',
  target: 'es2022',
  // `a ** b` becomes Math.pow(a, b), which the opening text makes exact.
  supported: { 'exponent-operator': false },
  charset: 'utf8',
  mainFields: ['module', 'main'],
  conditions: ['import', 'module'],
  loader: { '.wasm': 'binary' },
  legalComments: 'inline',
  tsconfigRaw: {},
  logLevel: 'silent',
} satisfies BuildOptions

/** Mentions the reserved names freely, so that the bundler renames a plug-in's own top-level ones. */
function wrapper(module: string): string {
  const mentions = reservedNames.map((reserved) => `typeof ${reserved}`).join(', ')
  return `import * as plugin from ${JSON.stringify(module)}\nexport default plugin.default\nexport const hidden = [${mentions}]\n`
}

/** The real path of the plug-in. */
function mustExist(file: string): string {
  const entry = realPathOf(file)
  if (entry === undefined) throw notFound(file)
  if (!statSync(entry).isFile()) {
    throw refuse('problem-not-found', { detail: `${file} is a folder; expected a file.`, where: { file } })
  }
  if (!extensions.some((extension) => extension === extname(entry))) {
    throw refuse('problem-does-not-bundle', {
      detail: `${basename(file)} ends in '${extname(entry)}'; expected one of ${extensions.join(', ')}.`,
      where: { file },
      cure: 'Write the problem as a TypeScript or JavaScript module.',
    })
  }
  return entry
}

function realPathOf(file: string): string | undefined {
  try {
    return realpathSync(file)
  } catch {
    return undefined
  }
}

function notFound(file: string): Refusal {
  const near = nearNames(basename(file), scriptsIn(dirname(file)))
  const detail = `there is no file ${file}.`
  if (near.length === 0) return refuse('problem-not-found', { detail, where: { file } })
  return refuse('problem-not-found', { detail, where: { file }, cure: `Did you mean ${near.join(' or ')}?` })
}

function scriptsIn(folder: string): string[] {
  try {
    return readdirSync(folder).filter((name) => extensions.some((extension) => extension === extname(name)))
  } catch {
    return []
  }
}

async function buildOrRefuse(file: string, options: BuildOptions): Promise<BuildResult> {
  try {
    return await build(options)
  } catch (error) {
    const errors = isBuildFailure(error) ? error.errors : []
    const first = errors[0]
    if (first === undefined) throw error
    const others = errors.length > 1 ? ` (and ${errors.length - 1} more)` : ''
    throw refuse('problem-does-not-bundle', {
      detail: `${first.text}${others}`,
      where: whereOf(file, first),
      cause: error,
    })
  }
}

function isBuildFailure(error: unknown): error is { readonly errors: readonly Message[] } {
  return error instanceof Error && 'errors' in error && Array.isArray(error.errors)
}

function whereOf(file: string, message: Message) {
  const location = message.location
  if (location === null || location.file === 'plug-in') return { file }
  return { file: join(dirname(file), location.file), line: location.line, column: location.column + 1 }
}

function messageLine(message: Message): string {
  const place = message.location
  return place === null ? message.text : `${place.file}, line ${place.line}: ${message.text}`
}

/** Parts that carry a library with them: who does not import one does not have it in the bundle. */
const largeParts: { readonly [part: string]: string } = {
  rigid2d: 'sim/rigid/rigid2d.js',
  rigid3d: 'sim/rigid/rigid3d.js',
}

/** 'skerry' and 'skerry/...' are this package's emitted files, whatever is installed beside the plug-in. */
const ownModules: Plugin = {
  name: 'own modules',
  setup(bundler) {
    bundler.onResolve({ filter: /^skerry(\/|$)/ }, ({ path }) => {
      const inner = path.slice('skerry/'.length)
      const module =
        inner === '' ? 'sim/index' : inner.startsWith('problems/') ? `sim/${inner}` : largeParts[inner]
      if (module === undefined) {
        const others = Object.keys(largeParts).map((part) => `'skerry/${part}'`)
        const names = ["'skerry'", ...others].join(', ')
        return {
          errors: [{ text: `there is no '${path}': import from ${names} or 'skerry/problems/NAME'` }],
        }
      }
      return { path: emittedFile(module.replace(/\.js$/, '')), sideEffects: false }
    })
    // What a plug-in does not use of ours stays out, with the packages it would pull in. So does the check that
    // defineProblem makes: whoever loads the bundle makes it (load.ts), and it would bring a whole package along.
    bundler.onResolve({ filter: /^\.\.?\// }, ({ path, importer }) => {
      if (!importer.startsWith(emittedRoot + sep)) return undefined
      const resolved = join(dirname(importer), path)
      if (resolved === join(emittedRoot, 'sim', 'problem-check.js')) {
        return { path: 'problem-check', namespace: 'left-out', sideEffects: false }
      }
      return { path: resolved, sideEffects: false }
    })
    bundler.onLoad({ filter: /.*/, namespace: 'left-out' }, () => ({
      contents: 'export function checkProblem() {}',
    }))
  },
}

/** Node's own modules have no place in a plug-in; libraries that only try for them at run time get a warning. */
const pureModules: Plugin = {
  name: 'pure modules',
  setup(bundler) {
    bundler.onResolve({ filter: /.*/ }, (found: OnResolveArgs) => {
      const name = found.path.replace(/^node:/, '')
      if (!found.path.startsWith('node:') && !builtinModules.includes(name)) return undefined
      const text = `'${found.path}' is a module of Node: plug-ins are pure, they read no files, clocks or network`
      if (found.kind === 'import-statement') return { errors: [{ text }] }
      return {
        path: found.path,
        external: true,
        warnings: [{ text: `${text}; this ${found.kind} will fail if it runs` }],
      }
    })
  },
}

/**
 * The rigid-body library asks the host's clock some thirty times a step, to be able to tell how long it took; nothing
 * it computes depends on the answer. A plug-in has no clock, so in a bundle the answer is always 0.
 */
const stoppedClock: Plugin = {
  name: 'stopped clock',
  setup(bundler) {
    bundler.onLoad({ filter: /@dimforge[\\/]rapier[23]d-deterministic-compat[\\/].*\.mjs$/ }, ({ path }) => {
      const asks = /(__wbg_now_[0-9a-f]+:function\(\w+\)\{return )[^}]*\.now\(\)\}/g
      const text = readFileSync(path, 'utf8')
      const contents = text.replace(asks, (_, opening: string) => `${opening}0}`)
      if (contents === text)
        return { errors: [{ text: 'the library does not ask for the time where it used to' }] }
      return { contents, loader: 'js' }
    })
  },
}

let detMathText: Promise<string> | undefined

/** shared/detmath as a script that declares `skerryDetMathModule`. */
function detMathCode(): Promise<string> {
  detMathText ??= (async () => {
    const folder = emittedRoot
    const result = await build({
      ...fixedOptions,
      entryPoints: [emittedFile('shared/detmath')],
      absWorkingDir: folder,
      format: 'iife',
      globalName: 'skerryDetMathModule',
    })
    return withoutPaths(
      result.outputFiles?.[0]?.text ?? '',
      Object.keys(result.metafile?.inputs ?? {}),
      folder,
    )
  })()
  return detMathText
}

/** A name for an input that says nothing about the machine. */
function canonicalName(input: string, folder: string): string {
  const packages = input.lastIndexOf('node_modules/')
  if (packages >= 0) return input.slice(packages)
  const inOurs = relative(emittedRoot, join(folder, input))
  if (!inOurs.startsWith('..')) return `skerry/${inOurs.split(sep).join('/')}`
  return input
}

/**
 * The bundler writes the path of each input as a comment over its code, and as the name of a wrapped CommonJS module;
 * both become canonical names.
 */
function withoutPaths(code: string, inputs: readonly string[], folder: string): string {
  const names = new Map(inputs.map((input) => [input, canonicalName(input, folder)]))
  return code
    .replace(/^(\s*\/\/ )(\S.*)$/gm, (line, lead: string, path: string) =>
      names.has(path) ? `${lead}${names.get(path)}` : line,
    )
    .replace(/^(\s*)"([^"]+)"(\(.*\) \{)$/gm, (line, lead: string, path: string, rest: string) =>
      names.has(path) ? `${lead}${JSON.stringify(names.get(path))}${rest}` : line,
    )
}
