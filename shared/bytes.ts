// Canonical bytes: one value, one sequence of bytes, on every machine. What is hashed, sent and recorded is
// written here.
//
//   u8, u32   little endian
//   double    IEEE 754, little endian; -0 is written as 0, a NaN never (a broken promise)
//   count     unsigned integer to 2^53 - 1 in groups of 7 bits, lowest first, top bit: more follow; shortest form
//   text      UTF-8 bytes after their count
//
// A reader accepts only what a writer can have written, so that equal values always have equal bytes.

import { check } from './check.js'
import { refuse } from './refusals.js'

const encoder = new TextEncoder()
const decoder = new TextDecoder('utf-8', { fatal: true, ignoreBOM: true })

/** Appends values to a growing array of bytes. finish() gives a copy; reset() starts again on the same memory. */
export class ByteWriter {
  private memory: Uint8Array
  private view: DataView
  private length = 0

  constructor(expectedBytes = 256) {
    this.memory = new Uint8Array(expectedBytes)
    this.view = new DataView(this.memory.buffer)
  }

  private room(bytes: number): number {
    const at = this.length
    this.length = at + bytes
    if (this.length > this.memory.length) {
      const larger = new Uint8Array(Math.max(this.length, 2 * this.memory.length))
      larger.set(this.memory)
      this.memory = larger
      this.view = new DataView(larger.buffer)
    }
    return at
  }

  u8(value: number): this {
    check((value & 0xff) === value, 'a byte is an integer from 0 to 255')
    const at = this.room(1)
    this.memory[at] = value
    return this
  }
  u16(value: number): this {
    check((value & 0xffff) === value, 'a u16 is an integer from 0 to 65535')
    const at = this.room(2)
    this.view.setUint16(at, value, true)
    return this
  }
  u32(value: number): this {
    check(value >>> 0 === value, 'a u32 is an integer from 0 to 2^32 - 1')
    const at = this.room(4)
    this.view.setUint32(at, value, true)
    return this
  }
  double(value: number): this {
    check(!Number.isNaN(value), 'NaN never enters canonical bytes')
    const at = this.room(8)
    this.view.setFloat64(at, value === 0 ? 0 : value, true)
    return this
  }
  count(value: number): this {
    check(Number.isSafeInteger(value) && value >= 0, 'a count is an integer from 0 to 2^53 - 1')
    let rest = value
    while (rest >= 128) {
      const at = this.room(1)
      this.memory[at] = (rest % 128) | 128
      rest = Math.floor(rest / 128)
    }
    const at = this.room(1)
    this.memory[at] = rest
    return this
  }
  bytes(value: Uint8Array): this {
    const at = this.room(value.length)
    this.memory.set(value, at)
    return this
  }
  text(value: string): this {
    const utf8 = encoder.encode(value)
    return this.count(utf8.length).bytes(utf8)
  }

  /** A copy of what was written. */
  finish(): Uint8Array {
    return this.memory.slice(0, this.length)
  }
  /** What was written, without copying: valid until the next write or reset. */
  peek(): Uint8Array {
    return this.memory.subarray(0, this.length)
  }
  reset(): this {
    this.length = 0
    return this
  }
}

/** Reads what a ByteWriter wrote. Every method throws the Refusal 'bytes-malformed' on anything else. */
export class ByteReader {
  private readonly memory: Uint8Array
  private readonly view: DataView
  private readonly what: string
  private at = 0

  /** `what` names the bytes in messages, e.g. 'genome of i3-01842'. */
  constructor(memory: Uint8Array, what: string) {
    this.memory = memory
    this.view = new DataView(memory.buffer, memory.byteOffset, memory.byteLength)
    this.what = what
  }

  private take(bytes: number): number {
    const at = this.at
    if (at + bytes > this.memory.length) {
      this.malformed(`expected ${bytes} more bytes, found ${this.memory.length - at}`)
    }
    this.at = at + bytes
    return at
  }

  /** Throws the refusal for these bytes; callers use it for values that no writer gives. */
  malformed(detail: string): never {
    throw refuse('bytes-malformed', { detail: `${this.what}, byte ${this.at}: ${detail}` })
  }

  u8(): number {
    return this.memory[this.take(1)]!
  }
  u16(): number {
    return this.view.getUint16(this.take(2), true)
  }
  u32(): number {
    return this.view.getUint32(this.take(4), true)
  }
  double(): number {
    const value = this.view.getFloat64(this.take(8), true)
    if (Number.isNaN(value) || Object.is(value, -0))
      this.malformed('found NaN or -0, which are never written')
    return value
  }
  count(): number {
    let value = 0
    for (let unit = 1; ; unit *= 128) {
      const byte = this.u8()
      value += (byte & 127) * unit
      if (value > Number.MAX_SAFE_INTEGER) this.malformed('found a count above 2^53 - 1')
      if (byte < 128) {
        if (byte === 0 && unit > 1) this.malformed('found a count that is not in its shortest form')
        return value
      }
      if (unit > 2 ** 49) this.malformed('found a count of more than 8 bytes')
    }
  }
  bytes(length: number): Uint8Array {
    const at = this.take(length)
    return this.memory.slice(at, at + length)
  }
  text(): string {
    const utf8 = this.bytes(this.count())
    try {
      return decoder.decode(utf8)
    } catch {
      return this.malformed('found text that is not UTF-8')
    }
  }
  /** Nothing may be left over. */
  end(): void {
    const left = this.memory.length - this.at
    if (left > 0) this.malformed(`found ${left} bytes after the end`)
  }
}
