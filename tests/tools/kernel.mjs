// `npm run kernel`: compiles the lattice kernel (AssemblyScript in sim/lattice/wasm/) into one WebAssembly module a
// variant and writes them, as base64, into sim/lattice/lanes/modules.ts, so that plug-in bundles, browsers and the
// package need no compiler. A test compiles again and compares (kernel.test.ts).
//
// A variant is two files that exist only while it is compiled: `variant.ts` (plain constants) and `vector.ts`, which is
// one of the vector-*.ts.

import { readFileSync, writeFileSync } from 'node:fs'
import { dirname, join } from 'node:path'
import { fileURLToPath } from 'node:url'
import asc from 'assemblyscript/asc'

const root = join(dirname(fileURLToPath(import.meta.url)), '..', '..')
const folder = join(root, 'sim', 'lattice')
export const modulesFile = join(folder, 'lanes', 'modules.ts')

const widths = [
  { name: 'double1', vector: 'scalar', vectors: 1, owns: [false] },
  { name: 'double2', vector: 'f64x2', vectors: 1, owns: [false, true] },
  { name: 'double4', vector: 'f64x2', vectors: 2, owns: [false, true] },
  { name: 'single8', vector: 'f32x4', vectors: 2, owns: [false, true] },
]

/** Every variant: its name, and the constants that make it. */
export const variants = [2, 3].flatMap((dimensions) =>
  widths.flatMap(({ name, vector, vectors, owns }) =>
    owns.map((own) => ({
      name: `${dimensions === 2 ? 'plane' : 'space'}-${name}${own ? '-own' : ''}`,
      dimensions,
      vector,
      vectors,
      own,
    })),
  ),
)

const options = [
  '--optimizeLevel',
  '3',
  '--shrinkLevel',
  '0',
  '--noAssert',
  '--enable',
  'simd',
  '--runtime',
  'stub',
]
// Memory grows on demand from the host; the passes fold offsets into addresses once all is inlined.
const more = [
  '--initialMemory',
  '1',
  '--runPasses',
  'optimize-added-constants-propagate,optimize-instructions,vacuum',
]

function sourceOf(variant, name) {
  if (name === 'wasm/variant.ts') {
    return [
      `export const dimensions: usize = ${variant.dimensions}`,
      `export const vectors: usize = ${variant.vectors}`,
      `export const own: bool = ${variant.own}`,
      '',
    ].join('\n')
  }
  if (name === 'wasm/vector.ts')
    return readFileSync(join(folder, 'wasm', `vector-${variant.vector}.ts`), 'utf8')
  if (!/^(wasm|lanes)\/[\w-]+\.ts$/.test(name)) return null
  try {
    return readFileSync(join(folder, ...name.split('/')), 'utf8')
  } catch {
    return null
  }
}

/** The bytes of one variant's module, and with `text` its disassembly. Throws with what the compiler said. */
export async function compile(variant, { text = false } = {}) {
  const files = new Map()
  const { error, stderr } = await asc.main(
    [
      'wasm/kernel.ts',
      ...options,
      ...more,
      '--outFile',
      'kernel.wasm',
      ...(text ? ['--textFile', 'kernel.wat'] : []),
    ],
    {
      readFile: (name) => sourceOf(variant, name.replaceAll('\\', '/')),
      writeFile: (name, contents) => files.set(name, contents),
      listFiles: () => [],
    },
  )
  if (error) throw new Error(`${variant.name}: ${error.message}\n${stderr.toString()}`)
  // A copy: small files share one pool of memory.
  return { bytes: Uint8Array.from(files.get('kernel.wasm')), text: files.get('kernel.wat') }
}

/** The generated file for these modules. */
export function modulesText(modules) {
  const lines = modules.map(({ name, bytes }) => `  '${name}': '${Buffer.from(bytes).toString('base64')}',`)
  return `// Made by \`npm run kernel\` from ../wasm/: do not edit. The kernel's WebAssembly modules in base64.

export const modules = {
${lines.join('\n')}
} as const
`
}

export async function compileAll() {
  const modules = []
  for (const variant of variants) modules.push({ name: variant.name, ...(await compile(variant)) })
  return modules
}

if (process.argv[1] === fileURLToPath(import.meta.url)) {
  const modules = await compileAll()
  writeFileSync(modulesFile, modulesText(modules))
  for (const { name, bytes } of modules) console.log(`${name.padEnd(20)} ${bytes.length} bytes`)
}
