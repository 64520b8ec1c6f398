// Between the rows of the engine's port and the columns of the database, both ways. What comes out of the
// database is checked: a file can be damaged or written by somebody else.

import { endianness } from 'node:os'
import { z } from 'zod'
import { ByteReader, ByteWriter } from '../../shared/bytes.js'
import { check } from '../../shared/check.js'
import { digestBytes, resultDigest } from '../../shared/digests.js'
import type { Genome, PartValue } from '../../shared/genome.js'
import { limits } from '../../shared/limits.js'
import { Refusal, refuse } from '../../shared/refusals.js'
import type { EvaluationResult, SimulationFailure } from '../../shared/result.js'
import type { ArrivalRow, BirthRow, EventRow, MailRow } from '../engine/ports.js'
import type { Block, Individual, Origin } from '../evolution/types.js'
import type { Column } from './storage.js'

check(endianness() === 'LE', 'numbers are stored as the processor holds them, which is little endian')

/** Damage found while reading. `what` names the row for a person. */
export function damaged(what: string, detail: string, cause?: unknown): Refusal {
  return refuse('record-corrupted', { detail: `${what}: ${detail}`, cause })
}

/** Runs a decoder; whatever it finds wrong becomes damage of the row `what`. */
export function decode<T>(what: string, decoder: () => T): T {
  try {
    return decoder()
  } catch (error) {
    if (error instanceof Refusal && error.code === 'record-corrupted') throw error
    throw damaged(what, error instanceof Error ? error.message : String(error), error)
  }
}

// ------------------------------------------------------------------------------------------ columns

export function numberAt(columns: readonly Column[], index: number): number {
  const value = columns[index]
  if (typeof value !== 'number' || Number.isNaN(value))
    throw damaged(`column ${index}`, 'a number is missing')
  return value
}
export function textAt(columns: readonly Column[], index: number): string {
  const value = columns[index]
  if (typeof value !== 'string') throw damaged(`column ${index}`, 'a text is missing')
  return value
}
export function bytesAt(columns: readonly Column[], index: number): Uint8Array {
  const value = columns[index]
  if (!(value instanceof Uint8Array)) throw damaged(`column ${index}`, 'bytes are missing')
  return value
}
/** A digest of its own memory (what the database gives are Buffers). */
export function digestAt(columns: readonly Column[], index: number): Uint8Array {
  const value = bytesAt(columns, index)
  if (value.length !== digestBytes) throw damaged(`column ${index}`, `a digest has ${value.length} bytes`)
  return Uint8Array.from(value)
}

// ------------------------------------------------------------------------------------------ results

/** The bytes of the numbers, without copying. */
export function bytesOfNumbers(numbers: Float64Array): Uint8Array {
  return new Uint8Array(numbers.buffer, numbers.byteOffset, numbers.byteLength)
}

/** `what` is asked for only when the row is damaged: this runs for every result of a record. */
export function numbersOfBytes(bytes: Uint8Array, what: () => string): Float64Array {
  if (bytes.length % 8 !== 0) throw damaged(what(), `${bytes.length} bytes are no whole number of doubles`)
  const numbers = ownNumbers(bytes)
  for (let i = 0; i < numbers.length; i++) {
    if (!Number.isFinite(numbers[i]!)) throw damaged(what(), `number ${i} is not finite`)
  }
  return numbers
}

/** The bytes as doubles: the same memory where nobody else has a part in it, else a copy. */
function ownNumbers(bytes: Uint8Array): Float64Array {
  if (bytes.byteLength === bytes.buffer.byteLength) return new Float64Array(bytes.buffer)
  const numbers = new Float64Array(bytes.length / 8)
  bytesOfNumbers(numbers).set(bytes)
  return numbers
}

const failureSchema = z.array(z.tuple([z.number().int().nonnegative(), z.string()]))

/** null, as nearly always, or JSON pairs of simulation and reason. */
export function textOfFailures(failures: readonly SimulationFailure[]): string | null {
  if (failures.length === 0) return null
  return JSON.stringify(failures.map(({ simulation, reason }) => [simulation, reason]))
}

const noFailures: readonly SimulationFailure[] = []

export function failuresOfText(text: Column | undefined, what: () => string): readonly SimulationFailure[] {
  if (text === null || text === undefined) return noFailures
  return decode(what(), () =>
    failureSchema.parse(JSON.parse(String(text))).map(([simulation, reason]) => ({ simulation, reason })),
  )
}

/** An arrival read back. The digest is not stored: it follows from the result, and is computed when asked for. */
export class StoredArrival implements ArrivalRow {
  readonly island: number
  readonly evaluation: number
  readonly worker: string
  readonly host: string
  readonly processor?: string
  readonly attempt: number
  readonly cpuSeconds: number
  readonly result: EvaluationResult
  #digest: Uint8Array | undefined

  constructor(row: Omit<ArrivalRow, 'digest'>) {
    this.island = row.island
    this.evaluation = row.evaluation
    this.worker = row.worker
    this.host = row.host
    if (row.processor !== undefined) this.processor = row.processor
    this.attempt = row.attempt
    this.cpuSeconds = row.cpuSeconds
    this.result = row.result
  }

  get digest(): Uint8Array {
    this.#digest ??= resultDigest(this.result)
    return this.#digest
  }
}

/** Our own promise about what is appended: finite numbers, never -0, keys that are counted from 1. */
export function checkArrival(row: ArrivalRow): void {
  check(
    row.island >= 1 && row.evaluation >= 1 && row.attempt >= 1,
    'islands, evaluations and attempts count from 1',
  )
  check(Number.isFinite(row.cpuSeconds), 'the CPU time of an arrival is a finite number')
  const { values } = row.result
  for (let i = 0; i < values.length; i++) {
    const value = values[i]!
    check(Number.isFinite(value), 'the numbers of a result are finite when they are recorded')
    check(value !== 0 || !Object.is(value, -0), 'the numbers of a result are never -0 when they are recorded')
  }
}

// ------------------------------------------------------------------------------------------ commits

/**
 * Evaluations of the commits first, first + 1, ...: null where each commit took the evaluation of its own
 * number, else the differences to that, as counts (2d for d >= 0, -2d - 1 below).
 */
export function bytesOfEvaluations(first: number, evaluations: readonly number[]): Uint8Array | null {
  if (evaluations.every((evaluation, i) => evaluation === first + i)) return null
  const writer = new ByteWriter(2 * evaluations.length)
  evaluations.forEach((evaluation, i) => {
    const difference = evaluation - (first + i)
    writer.count(difference >= 0 ? 2 * difference : -2 * difference - 1)
  })
  return writer.finish()
}

export function evaluationsOfBytes(
  first: number,
  count: number,
  bytes: Column | undefined,
  what: string,
): number[] {
  if (!(bytes instanceof Uint8Array)) return Array.from({ length: count }, (_, i) => first + i)
  return decode(what, () => {
    const reader = new ByteReader(bytes, 'evaluations')
    const evaluations = Array.from({ length: count }, (_, i) => {
      const coded = reader.count()
      return first + i + (coded % 2 === 0 ? coded / 2 : -(coded + 1) / 2)
    })
    reader.end()
    return evaluations
  })
}

// --------------------------------------------------------------------------------- births and mail

function bytesOfIds(ids: readonly number[]): Uint8Array {
  const writer = new ByteWriter(8 * ids.length + 1).count(ids.length)
  for (const id of ids) writer.count(id)
  return writer.finish()
}
function readIds(reader: ByteReader): number[] {
  const length = reader.count()
  if (length > limits.populationMost) reader.malformed(`found ${length} parents`)
  return Array.from({ length }, () => reader.count())
}

export function columnsOfBirth(row: BirthRow): Column[] {
  return [row.id, bytesOfIds(row.parents), row.origin, row.atCommit, row.genome]
}
export function birthOf(columns: readonly Column[]): BirthRow {
  return decode(`birth of individual ${columns[0]}`, () => {
    const reader = new ByteReader(bytesAt(columns, 1), 'parents')
    const parents = readIds(reader)
    reader.end()
    return {
      id: numberAt(columns, 0),
      parents,
      origin: textAt(columns, 2),
      atCommit: numberAt(columns, 3),
      genome: Uint8Array.from(bytesAt(columns, 4)),
    }
  })
}

const origins: readonly Origin[] = ['founder', 'crossed', 'mutated', 'crossed-mutated', 'copied']

/** Kinds of a part's value, in the order of their numbers in the bytes. */
const parts = [
  { name: 'Float64Array', make: (buffer: ArrayBuffer): PartValue => new Float64Array(buffer) },
  { name: 'Int32Array', make: (buffer: ArrayBuffer): PartValue => new Int32Array(buffer) },
  { name: 'Uint8Array', make: (buffer: ArrayBuffer): PartValue => new Uint8Array(buffer) },
] as const

function writeArray(writer: ByteWriter, value: PartValue): void {
  const kind = parts.findIndex(({ name }) => name === value.constructor.name)
  check(kind >= 0, 'a part of a genome is a Float64Array, an Int32Array or a Uint8Array')
  writer.u8(kind).count(value.byteLength)
  writer.bytes(new Uint8Array(value.buffer, value.byteOffset, value.byteLength))
}
function readArray(reader: ByteReader): PartValue {
  const part = parts[reader.u8()] ?? reader.malformed('found an unknown kind of array')
  const length = reader.count()
  const bytes = reader.bytes(length)
  const memory = new ArrayBuffer(length)
  new Uint8Array(memory).set(bytes)
  return part.make(memory)
}
function readDoubles(reader: ByteReader): Float64Array {
  const value = readArray(reader)
  return value instanceof Float64Array ? value : reader.malformed('found another kind of array than doubles')
}

function writeIndividual(writer: ByteWriter, individual: Individual): void {
  writer.count(individual.id).bytes(bytesOfIds(individual.parents))
  writer.u8(origins.indexOf(individual.origin)).count(individual.bornAtCommit)
  writer.count(individual.replicates).count(individual.failedSimulations).count(individual.age)
  writer.count(individual.blocks.length)
  for (const block of individual.blocks) {
    writer.count(block.island).count(block.evaluation)
    writer.count(block.firstReplicate).count(block.replicates).count(block.failedSimulations)
  }
  writeArray(writer, individual.values)
  writeArray(writer, individual.score)
  const genome = Object.entries(individual.genome)
  writer.count(genome.length)
  for (const [name, value] of genome) {
    writer.text(name)
    writeArray(writer, value)
  }
}
function readBlocks(reader: ByteReader): Block[] {
  const length = reader.count()
  if (length > limits.replicatesMost) reader.malformed(`found ${length} blocks`)
  return Array.from({ length }, () => ({
    island: reader.count(),
    evaluation: reader.count(),
    firstReplicate: reader.count(),
    replicates: reader.count(),
    failedSimulations: reader.count(),
  }))
}
function readIndividual(reader: ByteReader): Individual {
  const id = reader.count()
  const parents = readIds(reader)
  const origin = origins[reader.u8()] ?? reader.malformed('found an unknown origin')
  const bornAtCommit = reader.count()
  const replicates = reader.count()
  const failedSimulations = reader.count()
  const age = reader.count()
  const blocks = readBlocks(reader)
  const values = readDoubles(reader)
  const score = readDoubles(reader)
  const named = reader.count()
  const genome: { [part: string]: PartValue } = {}
  for (let i = 0; i < named; i++) {
    const name = reader.text()
    // Not an assignment: a part named __proto__ would be no part then.
    Object.defineProperty(genome, name, {
      value: readArray(reader),
      enumerable: true,
      writable: true,
      configurable: true,
    })
  }
  const whole: Genome = genome
  return {
    id,
    genome: whole,
    parents,
    origin,
    bornAtCommit,
    blocks,
    values,
    replicates,
    failedSimulations,
    score,
    age,
  }
}

/** Individuals by value: what their island does with them later does not reach the copy. */
export function bytesOfIndividuals(individuals: readonly Individual[]): Uint8Array {
  const writer = new ByteWriter(1024).count(individuals.length)
  for (const individual of individuals) writeIndividual(writer, individual)
  return writer.finish()
}
export function individualsOfBytes(bytes: Uint8Array): Individual[] {
  const reader = new ByteReader(bytes, 'emigrants')
  const length = reader.count()
  if (length > limits.emigrantsMost) reader.malformed(`found ${length} emigrants`)
  const individuals = Array.from({ length }, () => readIndividual(reader))
  reader.end()
  return individuals
}

export function columnsOfMail(row: MailRow): Column[] {
  return [row.island, row.epoch, row.atCommit, row.ended ? 1 : 0, bytesOfIndividuals(row.emigrants)]
}
export function mailOf(columns: readonly Column[]): MailRow {
  return decode(`mail of island ${columns[0]}, epoch ${columns[1]}`, () => ({
    island: numberAt(columns, 0),
    epoch: numberAt(columns, 1),
    atCommit: numberAt(columns, 2),
    ended: numberAt(columns, 3) === 1,
    emigrants: individualsOfBytes(bytesAt(columns, 4)),
  }))
}

// ------------------------------------------------------------------------------------------- events

/** JSON keeps every finite number exactly, except that -0 becomes 0; others would become null unseen. */
function textOfData(data: unknown): string | null {
  const text = JSON.stringify(data, (_key, value: unknown) => {
    check(typeof value !== 'number' || Number.isFinite(value), 'numbers in the data of an event are finite')
    return value
  })
  return text === undefined ? null : text
}

export function columnsOfEvent(sequence: number, row: EventRow): Column[] {
  const { kind, island, atCommit, epoch, changesSearch, sentence, data } = row
  return [sequence, kind, island, atCommit, epoch, changesSearch ? 1 : 0, sentence, textOfData(data)]
}
export function eventOf(columns: readonly Column[]): EventRow & { readonly sequence: number } {
  return decode(`event ${columns[0]}`, () => {
    const data = columns[7]
    return {
      sequence: numberAt(columns, 0),
      kind: textAt(columns, 1),
      island: numberAt(columns, 2),
      atCommit: numberAt(columns, 3),
      epoch: numberAt(columns, 4),
      changesSearch: numberAt(columns, 5) === 1,
      sentence: textAt(columns, 6),
      data: typeof data === 'string' ? (JSON.parse(data) as unknown) : undefined,
    }
  })
}
