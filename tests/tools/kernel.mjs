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
import binaryen from 'assemblyscript/binaryen'

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

/** The bytes of one variant's module, and its disassembly. Throws with what the compiler said. */
export async function compile(variant) {
  const files = new Map()
  const { error, stderr } = await asc.main(
    ['wasm/kernel.ts', ...options, ...more, '--outFile', 'kernel.wasm'],
    {
      readFile: (name) => sourceOf(variant, name.replaceAll('\\', '/')),
      writeFile: (name, contents) => files.set(name, contents),
      listFiles: () => [],
    },
  )
  if (error) throw new Error(`${variant.name}: ${error.message}\n${stderr.toString()}`)
  return foldOffsets(files.get('kernel.wasm'))
}

/** All that a module may use. Relaxed SIMD is not among them: validation refuses it. */
export const features =
  binaryen.Features.SIMD128 | binaryen.Features.NontrappingFPToInt | binaryen.Features.SignExt

/**
 * Moves constants that are added to an address into the offset of the load or store. The compiler's own pass leaves out
 * splat loads and additions of 64, which it has turned into subtractions of -64; each costs an instruction in the
 * innermost loop. Allowed because no address is near 2^32.
 */
function foldOffsets(bytes) {
  const module = binaryen.readBinary(bytes)
  module.setFeatures(features)
  for (let i = 0; i < module.getNumFunctions(); i++) {
    const { body } = binaryen.getFunctionInfo(module.getFunctionByIndex(i))
    if (body !== 0) visit(body)
  }
  if (!module.validate()) throw new Error('folding offsets broke the module')
  const folded = { bytes: Uint8Array.from(module.emitBinary()), text: module.emitText() }
  module.dispose()
  return folded
}

/** Every expression below this one, and this one. */
function visit(expression) {
  const info = binaryen.getExpressionInfo(expression)
  if (info.id === binaryen.ConstId) return
  const kind = memoryKinds.get(info.id)
  if (kind !== undefined) fold(expression, kind)
  for (const [name, value] of Object.entries(info)) {
    if (!children.has(name)) continue
    for (const child of Array.isArray(value) ? value : [value]) if (child !== 0) visit(child)
  }
}

const memoryKinds = new Map([
  [binaryen.LoadId, binaryen.Load],
  [binaryen.StoreId, binaryen.Store],
  [binaryen.SIMDLoadId, binaryen.SIMDLoad],
  [binaryen.SIMDLoadStoreLaneId, binaryen.SIMDLoadStoreLane],
])

/** Fields of an expression that hold expressions. */
const children = new Set([
  ...['children', 'operands', 'condition', 'ifTrue', 'ifFalse', 'body', 'value', 'ptr', 'left', 'right'],
  ...['vec', 'a', 'b', 'c', 'shift', 'delta'],
])

function fold(expression, kind) {
  const address = binaryen.getExpressionInfo(kind.getPtr(expression))
  if (address.id !== binaryen.BinaryId) return
  const sign = address.op === binaryen.AddInt32 ? 1 : address.op === binaryen.SubInt32 ? -1 : 0
  const added = binaryen.getExpressionInfo(address.right)
  if (sign === 0 || added.id !== binaryen.ConstId) return
  const offset = kind.getOffset(expression) + sign * added.value
  if (offset < 0) return
  kind.setOffset(expression, offset)
  kind.setPtr(expression, address.left)
  fold(expression, kind)
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
