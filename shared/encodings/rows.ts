// The table of encodings: one row each, with everything that is done with a single part. Whole genomes are
// encodings.ts, where the bytes are described.

import type { ByteReader, ByteWriter } from '../bytes.js'
import { exp, log } from '../detmath/exponential.js'
import type {
  BitsEncoding,
  ChoiceEncoding,
  Encoding,
  IntegerEncoding,
  LayoutEncoding,
  PartValue,
  RealEncoding,
} from '../genome.js'
import type { Stream } from '../streams.js'

/** What a specification has wrong: the field and a sentence. */
export interface SpecFault {
  readonly field: string
  readonly detail: string
}

type ArrayKind = typeof Float64Array | typeof Int32Array | typeof Uint8Array

/** Everything that is done with one encoding. Values handed to write, random's users and text are checked ones. */
export interface EncodingRow<E extends Encoding, V extends PartValue> {
  /** Relations between fields that its schema (schemas.ts) cannot say; only called when the shape holds. */
  relations(encoding: E): SpecFault | undefined
  slots(encoding: E): number
  bytes(encoding: E): number
  /** What is wrong with a value of the right kind and length, or undefined. */
  fault(encoding: E, value: V): string | undefined
  /** The kind of array that holds a value. */
  readonly array: ArrayKind
  write(encoding: E, value: V, writer: ByteWriter): void
  read(encoding: E, reader: ByteReader): V
  /** A founder's value, uniform over everything the encoding allows. */
  random(encoding: E, stream: Stream): V
  /** The value for a person, with its unit. */
  text(encoding: E, value: V): string
}

/** high must lie above low, by an amount that is a number. */
function boundsFault(low: number, high: number): SpecFault | undefined {
  if (low < high && high - low < Infinity) return undefined
  return { field: 'high', detail: `expected a number above low (${low}), found ${high}` }
}

/** First slot whose value `allows` refuses, as a sentence. */
function firstFault(value: PartValue, allows: (x: number) => boolean, expected: string): string | undefined {
  for (let i = 0; i < value.length; i++) {
    if (!allows(value[i]!)) return `slot ${i}: expected ${expected}, found ${value[i]}`
  }
  return undefined
}

const realRow: EncodingRow<RealEncoding, Float64Array> = {
  relations({ low, high, scale }) {
    if (scale === 'log' && !(low > 0)) {
      return { field: 'low', detail: `expected a number above 0 with scale 'log', found ${low}` }
    }
    return boundsFault(low, high)
  },
  slots: ({ length }) => length,
  bytes: ({ length }) => 8 * length,
  fault: ({ low, high }, value) =>
    firstFault(value, (x) => x >= low && x <= high, `a number from ${low} to ${high}`),
  array: Float64Array,
  write(_, value, writer) {
    for (let i = 0; i < value.length; i++) writer.double(value[i]!)
  },
  read({ length }, reader) {
    const value = new Float64Array(length)
    for (let i = 0; i < length; i++) value[i] = reader.double()
    return value
  },
  random({ length, low, high, scale }, stream) {
    const value = new Float64Array(length)
    const from = scale === 'log' ? log(low) : low
    const span = scale === 'log' ? log(high) - from : high - low
    for (let i = 0; i < length; i++) {
      const x = from + stream.uniform() * span
      value[i] = Math.min(high, Math.max(low, scale === 'log' ? exp(x) : x))
    }
    return value
  },
  text: ({ unit }, value) =>
    withUnit(
      Array.from(value, (x) => String(Number(x.toPrecision(6)))),
      unit,
    ),
}

const integerRow: EncodingRow<IntegerEncoding, Int32Array> = {
  relations: ({ low, high }) => boundsFault(low, high),
  slots: ({ length }) => length,
  bytes: ({ length, low, high }) => length * widthOf(high - low),
  fault: ({ low, high }, value) =>
    firstFault(value, (x) => x >= low && x <= high, `an integer from ${low} to ${high}`),
  array: Int32Array,
  write({ low, high }, value, writer) {
    const width = widthOf(high - low)
    for (let i = 0; i < value.length; i++) writeWidth(writer, width, value[i]! - low)
  },
  read({ length, low, high }, reader) {
    const width = widthOf(high - low)
    const value = new Int32Array(length)
    for (let i = 0; i < length; i++) {
      const above = readWidth(reader, width)
      if (above > high - low) reader.malformed(`found an integer above ${high}`)
      value[i] = low + above
    }
    return value
  },
  random({ length, low, high }, stream) {
    const value = new Int32Array(length)
    for (let i = 0; i < length; i++) value[i] = low + stream.below(high - low + 1)
    return value
  },
  text: ({ unit }, value) => withUnit(Array.from(value, String), unit),
}

const choiceRow: EncodingRow<ChoiceEncoding, Int32Array> = {
  relations: () => undefined,
  slots: ({ length }) => length,
  bytes: ({ length, options }) => length * widthOf(options.length - 1),
  fault: ({ options }, value) => optionFault(options, value),
  array: Int32Array,
  write: ({ options }, value, writer) => writeOptions(options, value, writer),
  read: ({ length, options }, reader) => readOptions(options, length, reader),
  random: ({ length, options }, stream) => randomOptions(options, length, stream),
  text: ({ options }, value) => Array.from(value, (x) => options[x]).join(', '),
}

const bitsRow: EncodingRow<BitsEncoding, Uint8Array> = {
  relations: () => undefined,
  slots: ({ length }) => length,
  bytes: ({ length }) => Math.ceil(length / 8),
  fault: (_, value) => firstFault(value, (x) => x === 0 || x === 1, '0 or 1'),
  array: Uint8Array,
  write({ length }, value, writer) {
    for (let first = 0; first < length; first += 8) {
      let byte = 0
      for (let i = first; i < Math.min(first + 8, length); i++) byte |= value[i]! << (i - first)
      writer.u8(byte)
    }
  },
  read({ length }, reader) {
    const value = new Uint8Array(length)
    for (let first = 0; first < length; first += 8) {
      const byte = reader.u8()
      if (first + 8 > length && byte >> (length - first) !== 0) reader.malformed('found bits after the last')
      for (let i = first; i < Math.min(first + 8, length); i++) value[i] = (byte >> (i - first)) & 1
    }
    return value
  },
  random({ length }, stream) {
    const value = new Uint8Array(length)
    let word = 0
    for (let i = 0; i < length; i++) {
      if (i % 32 === 0) word = stream.word()
      value[i] = (word >>> (i % 32)) & 1
    }
    return value
  },
  text: (_, value) => value.join(''),
}

const layoutRow: EncodingRow<LayoutEncoding, Int32Array> = {
  relations: () => undefined,
  slots: slotsOfLayout,
  bytes: (encoding) => slotsOfLayout(encoding) * widthOf(encoding.options.length - 1),
  fault: ({ options }, value) => optionFault(options, value),
  array: Int32Array,
  write: ({ options }, value, writer) => writeOptions(options, value, writer),
  read: (encoding, reader) => readOptions(encoding.options, slotsOfLayout(encoding), reader),
  random: (encoding, stream) => randomOptions(encoding.options, slotsOfLayout(encoding), stream),
  text({ size, options }, value) {
    const width = size[size.length - 1]!
    const lines: string[] = []
    for (let first = 0; first < value.length; first += width) {
      lines.push(Array.from(value.subarray(first, first + width), (x) => options[x]).join(', '))
    }
    return lines.join(' / ')
  },
}

type RowOf<K extends Encoding['kind']> = EncodingRow<Extract<Encoding, { kind: K }>, PartValue>
export const encodings = {
  real: realRow,
  integer: integerRow,
  choice: choiceRow,
  bits: bitsRow,
  layout: layoutRow,
} as unknown as { readonly [K in Encoding['kind']]: RowOf<K> }

export const encodingKinds = Object.keys(encodings) as readonly Encoding['kind'][]

/** The row of an encoding. Safe because a row only ever gets encodings of its own kind. */
export function rowOf(encoding: Encoding): EncodingRow<Encoding, PartValue> {
  return encodings[encoding.kind] as unknown as EncodingRow<Encoding, PartValue>
}

// ------------------------------------------------------------------------------ helpers of the rows

function slotsOfLayout({ size }: LayoutEncoding): number {
  let slots = 1
  for (const axis of size) slots *= axis
  return slots
}

/** Fewest of 1, 2 or 4 bytes that hold 0 to most. */
function widthOf(most: number): 1 | 2 | 4 {
  return most <= 0xff ? 1 : most <= 0xffff ? 2 : 4
}
function writeWidth(writer: ByteWriter, width: 1 | 2 | 4, value: number): void {
  if (width === 1) writer.u8(value)
  else if (width === 2) writer.u16(value)
  else writer.u32(value)
}
function readWidth(reader: ByteReader, width: 1 | 2 | 4): number {
  return width === 1 ? reader.u8() : width === 2 ? reader.u16() : reader.u32()
}

function optionFault(options: readonly string[], value: PartValue): string | undefined {
  return firstFault(
    value,
    (x) => x >= 0 && x < options.length,
    `an option index from 0 to ${options.length - 1}`,
  )
}
function writeOptions(options: readonly string[], value: PartValue, writer: ByteWriter): void {
  const width = widthOf(options.length - 1)
  for (let i = 0; i < value.length; i++) writeWidth(writer, width, value[i]!)
}
function readOptions(options: readonly string[], length: number, reader: ByteReader): Int32Array {
  const width = widthOf(options.length - 1)
  const value = new Int32Array(length)
  for (let i = 0; i < length; i++) {
    const index = readWidth(reader, width)
    if (index >= options.length) reader.malformed(`found option ${index} of ${options.length}`)
    value[i] = index
  }
  return value
}
function randomOptions(options: readonly string[], length: number, stream: Stream): Int32Array {
  const value = new Int32Array(length)
  for (let i = 0; i < length; i++) value[i] = stream.below(options.length)
  return value
}

function withUnit(numbers: readonly string[], unit: string | undefined): string {
  return unit === undefined || unit === '' ? numbers.join(', ') : `${numbers.join(', ')} ${unit}`
}
