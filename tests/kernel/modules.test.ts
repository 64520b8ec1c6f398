// The committed WebAssembly modules are what their sources give, and use nothing whose result may differ.

import { readFileSync } from 'node:fs'
import { describe, expect, test } from 'vitest'
import { modules } from '../../sim/lattice/lanes/modules.js'
import { compile, modulesFile, modulesText, variants } from '../tools/kernel.mjs'

const isCompiled = (name: string) => Object.hasOwn(modules, name)
const bytesOf = (name: string) => Buffer.from(modules[name as keyof typeof modules], 'base64')
const compiled = new Map<string, Promise<{ bytes: Uint8Array; text: string }>>()
function compileOnce(variant: (typeof variants)[number]) {
  const known = compiled.get(variant.name) ?? compile(variant)
  compiled.set(variant.name, known)
  return known
}

test('every variant has a module and every module a variant', () => {
  expect(variants.map(({ name }) => name).sort()).toEqual(Object.keys(modules).sort())
})

describe.each(variants.filter(({ name }) => isCompiled(name)))('$name', (variant) => {
  test('compiles to the committed bytes (else: npm run kernel)', async () => {
    const { bytes } = await compileOnce(variant)
    expect(Buffer.from(bytes).equals(bytesOf(variant.name))).toBe(true)
  })

  test('has no relaxed instruction, no import, and only operations whose results are fixed', async () => {
    const { text } = await compileOnce(variant)
    expect(text).not.toMatch(/relaxed|fma|nearest|\(import/)
    expect(operationsOf(text).filter((operation) => !fixed.has(operation))).toEqual([])
  })
})

test('the file of modules is as the script writes it', () => {
  const all = Object.entries(modules).map(([name, text]) => ({ name, bytes: Buffer.from(text, 'base64') }))
  expect(readFileSync(modulesFile, 'utf8')).toBe(modulesText(all))
})

test('a relaxed instruction would be seen', () => {
  expect(operationsOf('(f64x2.relaxed_madd (local.get $0))')).toEqual(['f64x2.relaxed_madd', 'local.get'])
  expect(fixed.has('f64x2.relaxed_madd')).toBe(false)
})

/** Names of all instructions in a text of the folded form. */
function operationsOf(text: string): string[] {
  const names = text.matchAll(/\(([a-z][a-z0-9]*(?:x[0-9]+)?\.[a-z0-9_.]+)/g)
  return [...new Set(Array.from(names, ([, name]) => name!))].sort()
}

/**
 * What the modules may use: WebAssembly gives these the same results everywhere (WebAssembly Core Specification 2.0,
 * numerics), NaN patterns apart. Relaxed operations (3.0) are left out on purpose: their results are the host's.
 */
const fixed = new Set([
  ...['local.get', 'local.set', 'local.tee', 'memory.size', 'memory.grow'],
  ...['i32', 'i64'].flatMap((type) =>
    [
      ...['const', 'load', 'store', 'add', 'sub', 'mul', 'and', 'or', 'xor', 'shl', 'shr_u', 'shr_s', 'eqz'],
      ...['eq', 'ne', 'lt_s', 'lt_u', 'gt_s', 'gt_u', 'le_s', 'le_u', 'ge_s', 'ge_u', 'div_u', 'rem_u'],
      ...['wrap_i64', 'extend_i32_u', 'reinterpret_f64'],
    ].map((name) => `${type}.${name}`),
  ),
  ...['f32', 'f64'].flatMap((type) =>
    [
      ...[
        'const',
        'load',
        'store',
        'add',
        'sub',
        'mul',
        'div',
        'sqrt',
        'neg',
        'abs',
        'floor',
        'eq',
        'ne',
        'lt',
      ],
      ...['gt', 'le', 'ge', 'convert_i32_s', 'convert_i32_u', 'demote_f64', 'promote_f32'],
    ].map((name) => `${type}.${name}`),
  ),
  ...['f32x4', 'f64x2'].flatMap((type) =>
    [...['add', 'sub', 'mul', 'div', 'sqrt', 'neg', 'abs', 'floor', 'pmin', 'pmax', 'lt', 'ne', 'splat']].map(
      (name) => `${type}.${name}`,
    ),
  ),
  ...['v128.load', 'v128.store', 'v128.const', 'v128.and', 'v128.or', 'v128.bitselect', 'v128.load32_splat'],
  ...['v128.load64_splat', 'v128.load32_zero', 'v128.load64_zero', 'v128.load32_lane', 'v128.load64_lane'],
  ...[
    'i32x4.bitmask',
    'i64x2.bitmask',
    'i32x4.extract_lane',
    'i32x4.shl',
    'i64x2.shl',
    'i32x4.trunc_sat_f32x4_s',
  ],
])
