// What can be done with a genome, encoding by encoding: one row of `encodings` each. Adding an encoding is a
// type in genome.ts, a row here and its operators in coordinator/evolution.
//
// Canonical bytes of a genome are the bytes of its parts in order of declaration, without separators; their
// length follows from the specification alone:
//   real            8 bytes a number (bytes.ts: double)
//   integer         value - low in the fewest of 1, 2, 4 bytes that hold high - low
//   choice, layout  index in 1 byte up to 256 options, else 2
//   bits            8 a byte, first bit lowest, unused bits 0

import { z } from 'zod'
import { ByteReader, ByteWriter } from './bytes.js'
import { check } from './check.js'
import { exp, log } from './detmath/exponential.js'
import type {
  BitsEncoding,
  ChoiceEncoding,
  Encoding,
  Genome,
  GenomeSpec,
  IntegerEncoding,
  LayoutEncoding,
  PartValue,
  RealEncoding,
} from './genome.js'
import { limits } from './limits.js'
import { refuse } from './refusals.js'
import type { Stream } from './streams.js'

// ------------------------------------------------------------------- constructors for plug-in authors

/** Real numbers in [low, high]. Scale 'log' (low > 0): variation and founders work on the logarithm. */
export function real(of: {
  readonly length?: number
  readonly low: number
  readonly high: number
  readonly scale?: 'linear' | 'log'
  readonly unit?: string
}): RealEncoding {
  const { length = 1, scale = 'linear', ...rest } = of
  return { kind: 'real', length, scale, ...rest }
}

/** Whole numbers in [low, high], both within 32 bits. */
export function integer(of: {
  readonly length?: number
  readonly low: number
  readonly high: number
  readonly unit?: string
}): IntegerEncoding {
  const { length = 1, ...rest } = of
  return { kind: 'integer', length, ...rest }
}

/** Indices into `options`, which have no order. */
export function choice(of: {
  readonly length?: number
  readonly options: readonly string[]
}): ChoiceEncoding {
  return { kind: 'choice', length: of.length ?? 1, options: of.options }
}

/** Zeros and ones. */
export function bits(of: { readonly length: number }): BitsEncoding {
  return { kind: 'bits', length: of.length }
}

/** Slots on a regular lattice of 1 to 3 axes (last axis fastest), each holding one of `options`. */
export function layout(of: {
  readonly size: readonly number[]
  readonly options: readonly string[]
}): LayoutEncoding {
  return { kind: 'layout', size: of.size, options: of.options }
}

// ---------------------------------------------------------------------------------- table of encodings

/** What a specification has wrong: the field and a sentence. */
interface SpecFault {
  readonly field: string
  readonly detail: string
}

type ArrayKind = typeof Float64Array | typeof Int32Array | typeof Uint8Array

/** Everything that is done with one encoding. Values handed to write, random's users and text are checked ones. */
interface EncodingRow<E extends Encoding, V extends PartValue> {
  /** Shape of the specification as a plug-in gives it. */
  readonly schema: z.ZodType
  /** Relations between fields that the schema cannot say; only called when the shape holds. */
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

const lengthSchema = z.int().min(1).max(limits.genomeSlots)
const unitSchema = z.string().max(limits.nameLength).optional()
const int32 = z.int32()
const optionsSchema = z
  .array(z.string().min(1).max(limits.optionLength))
  .min(2)
  .max(limits.optionsMost)
  .refine((options) => new Set(options).size === options.length, { error: 'expected options that differ' })

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
  schema: z.strictObject({
    kind: z.literal('real'),
    length: lengthSchema,
    low: z.number(),
    high: z.number(),
    scale: z.enum(['linear', 'log']),
    unit: unitSchema,
  }),
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
    for (const x of value) writer.double(x)
  },
  read({ length }, reader) {
    return Float64Array.from({ length }, () => reader.double())
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
  schema: z.strictObject({
    kind: z.literal('integer'),
    length: lengthSchema,
    low: int32,
    high: int32,
    unit: unitSchema,
  }),
  relations: ({ low, high }) => boundsFault(low, high),
  slots: ({ length }) => length,
  bytes: ({ length, low, high }) => length * widthOf(high - low),
  fault: ({ low, high }, value) =>
    firstFault(value, (x) => x >= low && x <= high, `an integer from ${low} to ${high}`),
  array: Int32Array,
  write({ low, high }, value, writer) {
    const width = widthOf(high - low)
    for (const x of value) writeWidth(writer, width, x - low)
  },
  read({ length, low, high }, reader) {
    const width = widthOf(high - low)
    return Int32Array.from({ length }, () => {
      const above = readWidth(reader, width)
      return above <= high - low ? low + above : reader.malformed(`found an integer above ${high}`)
    })
  },
  random({ length, low, high }, stream) {
    const value = new Int32Array(length)
    for (let i = 0; i < length; i++) value[i] = low + stream.below(high - low + 1)
    return value
  },
  text: ({ unit }, value) => withUnit(Array.from(value, String), unit),
}

const choiceRow: EncodingRow<ChoiceEncoding, Int32Array> = {
  schema: z.strictObject({ kind: z.literal('choice'), length: lengthSchema, options: optionsSchema }),
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
  schema: z.strictObject({ kind: z.literal('bits'), length: lengthSchema }),
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
  schema: z.strictObject({
    kind: z.literal('layout'),
    size: z.array(lengthSchema).min(1).max(limits.layoutAxes),
    options: optionsSchema,
  }),
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
const encodings = {
  real: realRow,
  integer: integerRow,
  choice: choiceRow,
  bits: bitsRow,
  layout: layoutRow,
} as unknown as { readonly [K in Encoding['kind']]: RowOf<K> }

export const encodingKinds = Object.keys(encodings) as readonly Encoding['kind'][]

/** The row of an encoding. Safe because a row only ever gets encodings of its own kind. */
function rowOf(encoding: Encoding): EncodingRow<Encoding, PartValue> {
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
  for (const x of value) writeWidth(writer, width, x)
}
function readOptions(options: readonly string[], length: number, reader: ByteReader): Int32Array {
  const width = widthOf(options.length - 1)
  return Int32Array.from({ length }, () => {
    const index = readWidth(reader, width)
    return index < options.length ? index : reader.malformed(`found option ${index} of ${options.length}`)
  })
}
function randomOptions(options: readonly string[], length: number, stream: Stream): Int32Array {
  const value = new Int32Array(length)
  for (let i = 0; i < length; i++) value[i] = stream.below(options.length)
  return value
}

function withUnit(numbers: readonly string[], unit: string | undefined): string {
  return unit === undefined || unit === '' ? numbers.join(', ') : `${numbers.join(', ')} ${unit}`
}

// ------------------------------------------------------------------------------------- whole genomes

/** Names of parts start with a letter: the order of such keys is the order of declaration. */
const partName = /^[A-Za-z][A-Za-z0-9-]*$/

/**
 * Refuses ('not-a-problem', with the field) what is no genome specification. Takes what a plug-in gives: after
 * this the type can be trusted.
 */
export function checkSpec(spec: unknown): asserts spec is GenomeSpec {
  if (typeof spec !== 'object' || spec === null || Array.isArray(spec)) {
    throw specRefusal('genome', `expected an object of named parts, found ${foundText(spec)}`)
  }
  const parts = Object.entries(spec as { readonly [part: string]: unknown })
  if (parts.length < 1 || parts.length > limits.partsMost) {
    throw specRefusal('genome', `expected 1 to ${limits.partsMost} parts, found ${parts.length}`)
  }
  let slots = 0
  for (const [part, encoding] of parts) {
    if (!partName.test(part) || part.length > limits.nameLength) {
      throw specRefusal(
        `genome.${part}`,
        `expected a name of letters, digits and hyphens that starts with a letter, at most ${limits.nameLength} long`,
      )
    }
    const fault = encodingFault(encoding)
    if (fault) throw specRefusal(`genome.${part}${fault.field && `.${fault.field}`}`, fault.detail)
    slots += slotsOf(encoding as Encoding)
  }
  if (slots > limits.genomeSlots) {
    throw specRefusal(
      'genome',
      `expected at most ${limits.genomeSlots} slots in all parts together, found ${slots}`,
    )
  }
}

function specRefusal(field: string, detail: string): Error {
  return refuse('not-a-problem', {
    detail,
    where: { field },
    cure: 'Mend this field of the genome in the problem; real(), integer(), choice(), bits() and layout() make parts.',
  })
}

function foundText(value: unknown): string {
  if (value === null || value === undefined || typeof value === 'number') return String(value)
  return typeof value === 'string'
    ? `'${value}'`
    : Array.isArray(value)
      ? 'a list'
      : `a value of type ${typeof value}`
}

function encodingFault(encoding: unknown): SpecFault | undefined {
  if (typeof encoding !== 'object' || encoding === null) {
    return {
      field: '',
      detail: `expected an encoding such as real({ low: 0, high: 1 }), found ${foundText(encoding)}`,
    }
  }
  const kind = (encoding as { readonly kind?: unknown }).kind
  if (typeof kind !== 'string' || !Object.hasOwn(encodings, kind)) {
    return { field: 'kind', detail: `expected one of ${encodingKinds.join(', ')}, found ${foundText(kind)}` }
  }
  const row = encodings[kind as Encoding['kind']] as unknown as EncodingRow<Encoding, PartValue>
  const read = row.schema.safeParse(encoding)
  const issue = read.error?.issues[0]
  if (issue) return { field: issue.path.join('.'), detail: issue.message }
  return row.relations(encoding as Encoding)
}

/** How many numbers a value of this encoding holds. */
export function slotsOf(encoding: Encoding): number {
  return rowOf(encoding).slots(encoding)
}

/** How many bytes every genome of this specification has. */
export function genomeByteLength(spec: GenomeSpec): number {
  let total = 0
  for (const part of Object.keys(spec)) total += rowOf(spec[part]!).bytes(spec[part]!)
  return total
}

/** Canonical bytes of a genome; the genome must fit its specification. */
export function genomeBytes(spec: GenomeSpec, genome: Genome): Uint8Array {
  const writer = new ByteWriter(genomeByteLength(spec))
  for (const part of Object.keys(spec)) {
    const value = genome[part]
    check(
      value !== undefined && value.length === slotsOf(spec[part]!),
      'a genome has every part at its length',
    )
    rowOf(spec[part]!).write(spec[part]!, value, writer)
  }
  return writer.finish()
}

/** The genome behind canonical bytes. Refuses ('bytes-malformed') what no genome of this specification gives. */
export function genomeFromBytes(spec: GenomeSpec, bytes: Uint8Array): Genome {
  const reader = new ByteReader(bytes, 'genome')
  const genome: { [part: string]: PartValue } = {}
  for (const part of Object.keys(spec)) {
    const encoding = spec[part]!
    const value = rowOf(encoding).read(encoding, reader)
    const fault = rowOf(encoding).fault(encoding, value)
    if (fault !== undefined) reader.malformed(`part ${part}, ${fault}`)
    genome[part] = value
  }
  reader.end()
  return genome
}

/** What keeps this from being a genome of the specification, as a sentence that names the part; or undefined. */
export function checkGenome(spec: GenomeSpec, genome: unknown): string | undefined {
  if (typeof genome !== 'object' || genome === null) return `expected a genome, found ${foundText(genome)}`
  for (const part of Object.keys(genome)) {
    if (!Object.hasOwn(spec, part)) return `part ${part}: not in the specification`
  }
  for (const part of Object.keys(spec)) {
    const value: unknown = Object.hasOwn(genome, part)
      ? (genome as { [part: string]: unknown })[part]
      : undefined
    const fault = partFault(spec[part]!, value)
    if (fault !== undefined) return `part ${part}: ${fault}`
  }
  return undefined
}

/** What is wrong with a value of one part, or undefined. */
export function partFault(encoding: Encoding, value: unknown): string | undefined {
  const row = rowOf(encoding)
  const slots = row.slots(encoding)
  if (!(value instanceof row.array))
    return `expected a ${row.array.name} of ${slots}, found ${foundText(value)}`
  if (value.length !== slots) return `expected ${slots} slots, found ${value.length}`
  return row.fault(encoding, value)
}

/** A founder: every part in order from one stream, uniform over what its encoding allows. */
export function randomGenome(spec: GenomeSpec, stream: Stream): Genome {
  const genome: { [part: string]: PartValue } = {}
  for (const part of Object.keys(spec)) genome[part] = randomPart(spec[part]!, stream)
  return genome
}

/** A founder's value of one part. */
export function randomPart(encoding: Encoding, stream: Stream): PartValue {
  return rowOf(encoding).random(encoding, stream)
}

/** Same parts, same values (-0 and 0 are the same). */
export function genomesEqual(spec: GenomeSpec, a: Genome, b: Genome): boolean {
  for (const part of Object.keys(spec)) {
    const x = a[part]!
    const y = b[part]!
    if (x.length !== y.length) return false
    for (let i = 0; i < x.length; i++) if (x[i] !== y[i]) return false
  }
  return true
}

/** One line a part, for a person. */
export function genomeText(spec: GenomeSpec, genome: Genome): readonly string[] {
  return Object.keys(spec).map((part) => `${part}: ${rowOf(spec[part]!).text(spec[part]!, genome[part]!)}`)
}
