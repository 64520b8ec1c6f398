// Running modules: each is compiled and instantiated once (synchronously, so that problems stay plain functions) and has
// one memory, which is used again for every evaluation. One set of lanes at a time lives in it; when another needs
// the place, what was there is copied out and comes back when it is wanted again. So nobody has to release anything;
// whoever does spares the copy.

import { check } from '../../../shared/check.js'
import { modules } from './modules.js'

/** What a module exports (wasm/kernel.ts). */
interface Kernel {
  readonly memory: { readonly buffer: ArrayBuffer; grow(pages: number): number }
  readonly run: (steps: number) => void
  /** One bit for every lane that may have a fault. */
  readonly look: () => number
  readonly sample: () => void
}

/** The host's; every browser and Node has it, the language's own types do not. */
declare const WebAssembly: {
  readonly Module: new (bytes: Uint8Array) => object
  readonly Instance: new (module: object) => { readonly exports: unknown }
}

export interface Engine extends Kernel {
  /** The memory as numbers of the module's precision, and as words. */
  numbers: Float64Array | Float32Array
  words: Int32Array
  resident: Tenant | undefined
}

/** Whose content a memory holds. */
export interface Tenant {
  readonly module: string
  readonly bytes: number
  /** Content while another one has the memory. */
  saved: Uint8Array | undefined
  /** Nobody wants it any more: it need not be saved. */
  released: boolean
}

const engines = new Map<string, Engine>()

/** The engine of a module with this tenant's content in its memory. `write` fills it the first time. */
export function settle(tenant: Tenant, write?: (engine: Engine) => void): Engine {
  check(!tenant.released, 'lanes that were released are not used again')
  const engine = engineOf(tenant.module)
  if (engine.resident === tenant) return engine
  const last = engine.resident
  if (last && !last.released) last.saved = new Uint8Array(engine.memory.buffer).slice(0, last.bytes)
  makeRoom(engine, tenant)
  engine.resident = tenant
  if (tenant.saved) new Uint8Array(engine.memory.buffer).set(tenant.saved)
  else {
    check(write !== undefined, 'lanes that have never been in memory are written')
    write(engine)
  }
  tenant.saved = undefined
  return engine
}

/** The memory ends with zeros of its own: nothing is read before it is written. */
function makeRoom(engine: Engine, { module: name, bytes }: Tenant): void {
  const lacking = bytes - engine.memory.buffer.byteLength
  if (lacking > 0) engine.memory.grow(Math.ceil(lacking / pageBytes))
  if (engine.words.buffer !== engine.memory.buffer) look(engine, name)
}

const pageBytes = 65_536

function look(engine: Engine, name: string): void {
  const { buffer } = engine.memory
  engine.words = new Int32Array(buffer)
  engine.numbers = name.includes('single') ? new Float32Array(buffer) : new Float64Array(buffer)
}

function engineOf(name: string): Engine {
  const known = engines.get(name)
  if (known) return known
  check(Object.hasOwn(modules, name), `there is a module ${name}`)
  const bytes = decode(modules[name as keyof typeof modules])
  const kernel = new WebAssembly.Instance(new WebAssembly.Module(bytes)).exports as Kernel
  const { memory, run, look: lookAt, sample } = kernel
  const engine: Engine = {
    ...{ memory, run, look: lookAt, sample },
    numbers: new Float64Array(memory.buffer),
    words: new Int32Array(memory.buffer),
    resident: undefined,
  }
  look(engine, name)
  engines.set(name, engine)
  return engine
}

const digits = 'ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/'

/** Base64 (RFC 4648) without the help of the host, whose name for it differs. */
function decode(text: string): Uint8Array {
  const values = new Uint8Array(128)
  for (let i = 0; i < digits.length; i++) values[digits.charCodeAt(i)] = i
  const length = (text.length / 4) * 3 - (text.endsWith('==') ? 2 : text.endsWith('=') ? 1 : 0)
  const bytes = new Uint8Array(length)
  for (let from = 0, to = 0; from < text.length; from += 4) {
    let group = 0
    for (let i = 0; i < 4; i++) group = group * 64 + values[text.charCodeAt(from + i)]!
    bytes[to++] = group >> 16
    if (to < length) bytes[to++] = group >> 8
    if (to < length) bytes[to++] = group
  }
  return bytes
}
