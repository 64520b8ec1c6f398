// What can be done with a genome, encoding by encoding: one row of a table each (encodings/rows.ts). Adding an encoding is a
// type in genome.ts, a row there and its operators in coordinator/evolution.
//
// Canonical bytes of a genome are the bytes of its parts in order of declaration, without separators; their
// length follows from the specification alone:
//   real            8 bytes a number (bytes.ts: double)
//   integer         value - low in the fewest of 1, 2, 4 bytes that hold high - low
//   choice, layout  index in 1 byte up to 256 options, else 2
//   bits            8 a byte, first bit lowest, unused bits 0

import { ByteReader, ByteWriter } from './bytes.js'
import { check } from './check.js'
import { encodingKinds, rowOf } from './encodings/rows.js'
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
import type { Stream } from './streams.js'

export { encodingKinds }

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

// ------------------------------------------------------------------------------------- whole genomes

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

/** One writer for all genomes: its memory is made once. */
const genomeWriter = new ByteWriter(4096)

/** Canonical bytes of a genome; the genome must fit its specification. */
export function genomeBytes(spec: GenomeSpec, genome: Genome): Uint8Array {
  const writer = genomeWriter.reset()
  for (const part of Object.keys(spec)) {
    const encoding = spec[part]!
    const row = rowOf(encoding)
    const value = genome[part]
    check(
      value !== undefined && value.length === row.slots(encoding),
      'a genome has every part at its length',
    )
    row.write(encoding, value, writer)
  }
  return writer.finish()
}

/** The genome behind canonical bytes. Refuses ('bytes-malformed') what no genome of this specification gives. */
export function genomeFromBytes(spec: GenomeSpec, bytes: Uint8Array): Genome {
  const reader = new ByteReader(bytes, 'genome')
  const genome: { [part: string]: PartValue } = {}
  for (const part of Object.keys(spec)) {
    const encoding = spec[part]!
    const row = rowOf(encoding)
    const value = row.read(encoding, reader)
    const fault = row.fault(encoding, value)
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

/** What somebody gave, as it is named in a sentence about what was expected. */
export function foundText(value: unknown): string {
  if (value === null || value === undefined || typeof value === 'number') return String(value)
  return typeof value === 'string'
    ? `'${value}'`
    : Array.isArray(value)
      ? 'a list'
      : `a value of type ${typeof value}`
}
