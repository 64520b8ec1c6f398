// The journal of a record in a shared folder: files of appends, one coordinator a file, each synced before anything
// is acknowledged.
//
//   base-000000000000-<16 hex>.db           a whole database up to that append, with the start of its head
//   journal-000000000007-000000000412.log   epoch 7, from append 412 on; first a line of JSON, then entries.ts
//
// The line names the append that this epoch goes on from. Of earlier epochs only what lies before that is valid.

import {
  closeSync,
  fdatasyncSync,
  fsyncSync,
  ftruncateSync,
  openSync,
  readdirSync,
  readFileSync,
  rmSync,
  writeSync,
} from 'node:fs'
import { join } from 'node:path'
import { z } from 'zod'
import { check } from '../../../shared/check.js'
import { hex } from '../../../shared/digests.js'
import { fileTrouble } from '../files.js'
import { type Entry, entriesIn, frameOf } from './entries.js'

const digits = 12
const numbered = (number: number): string => String(number).padStart(digits, '0')
const pattern = /^journal-(\d{12})-(\d{12})\.log$/
/** A file that has grown beyond this is followed by another, so that old ones can be removed whole. */
const segmentBytesMost = 16 * 2 ** 20

/** Where a history stands: an append and the chain's head after it. */
export interface Point {
  readonly sequence: number
  /** Hexadecimal. */
  readonly head: string
}

const openingSchema = z.object({
  format: z.literal(1),
  epoch: z.number().int().positive(),
  continues: z.object({ sequence: z.number().int().nonnegative(), head: z.string() }),
})
type Opening = z.infer<typeof openingSchema>

interface SegmentFile {
  readonly path: string
  readonly epoch: number
  readonly first: number
}

/** Writes appends. A failed write may be tried again: it starts where the last whole one ended. */
export class SegmentWriter {
  readonly #folder: string
  readonly #epoch: number
  /** After the last append that was written, by us or before us. */
  #at: Point
  #file: number | undefined
  #path = ''
  /** Where the last entry begins and ends. */
  #start = 0
  #end = 0

  constructor(folder: string, epoch: number, continues: Point) {
    this.#folder = folder
    this.#epoch = epoch
    this.#at = continues
    this.#open()
  }

  /** On the disk when it returns. @throws Refusal */
  write(entry: Entry): void {
    const { sequence } = entry.header
    // The same number again: the transaction that followed the first try failed, and this entry takes its place.
    const again = sequence === this.#at.sequence && this.#start > 0
    check(again || sequence === this.#at.sequence + 1, 'appends are written in order')
    if (!again && this.#end > segmentBytesMost) this.#open()
    const file = this.#file
    check(file !== undefined, 'a journal file is open')
    const start = again ? this.#start : this.#end
    const frame = frameOf(entry)
    try {
      ftruncateSync(file, start)
      writeAll(file, frame, start)
      fdatasyncSync(file)
    } catch (error) {
      throw fileTrouble(error, this.#path)
    }
    this.#start = start
    this.#end = start + frame.length
    this.#at = { sequence, head: hex(entry.head) }
  }

  close(): void {
    if (this.#file !== undefined) closeSync(this.#file)
    this.#file = undefined
  }

  #open(): void {
    this.close()
    const continues = this.#at
    this.#path = join(
      this.#folder,
      `journal-${numbered(this.#epoch)}-${numbered(continues.sequence + 1)}.log`,
    )
    const line = Buffer.from(`${JSON.stringify({ format: 1, epoch: this.#epoch, continues })}\n`, 'utf8')
    try {
      const file = openSync(this.#path, 'w')
      writeAll(file, line, 0)
      fsyncSync(file)
      syncFolder(this.#folder)
      this.#file = file
      this.#start = 0
      this.#end = line.length
    } catch (error) {
      throw fileTrouble(error, this.#path)
    }
  }
}

function writeAll(file: number, bytes: Uint8Array, position: number): void {
  for (let done = 0; done < bytes.length; )
    done += writeSync(file, bytes, done, bytes.length - done, position + done)
}

export function syncFolder(folder: string): void {
  const file = openSync(folder, 'r')
  try {
    fsyncSync(file)
  } finally {
    closeSync(file)
  }
}

// ------------------------------------------------------------------------------------------- reading

function segmentFiles(folder: string): SegmentFile[] {
  return readdirSync(folder)
    .flatMap((name): SegmentFile[] => {
      const match = pattern.exec(name)
      return match ? [{ path: join(folder, name), epoch: Number(match[1]), first: Number(match[2]) }] : []
    })
    .sort((a, b) => a.epoch - b.epoch || a.first - b.first)
}

function openingOf(bytes: Uint8Array): { opening: Opening; start: number } | undefined {
  const newline = bytes.indexOf(0x0a)
  if (newline < 0) return undefined
  try {
    const text = Buffer.from(bytes.subarray(0, newline)).toString('utf8')
    return { opening: openingSchema.parse(JSON.parse(text)), start: newline + 1 }
  } catch {
    return undefined
  }
}

/**
 * The valid appends after `from`, in order. Of each epoch what the next one left out is passed over; the history ends
 * at the first append that is missing.
 */
export function* appendsAfter(folder: string, from: number): Iterable<Entry> {
  const files = segmentFiles(folder)
  // Per epoch: where the later ones took over.
  const mostOf = new Map<number, number>()
  let most = Number.POSITIVE_INFINITY
  for (const epoch of [...new Set(files.map((file) => file.epoch))].sort((a, b) => b - a)) {
    mostOf.set(epoch, most)
    const first = files.find((file) => file.epoch === epoch)
    const read = first && openingOf(readFileSync(first.path))
    // A file whose first line is not whole was never written to.
    if (read) most = Math.min(most, read.opening.continues.sequence)
  }
  let last = from
  for (const file of files) {
    const bytes = readFileSync(file.path)
    const read = openingOf(bytes)
    if (!read) continue
    for (const entry of entriesIn(bytes, read.start).entries) {
      const { sequence } = entry.header
      if (sequence <= last || sequence > mostOf.get(file.epoch)!) continue
      if (sequence > last + 1) return
      yield entry
      last = sequence
    }
  }
}

/** Removes journal files that hold nothing after `sequence`; the newest file of all stays. */
export function forgetSegments(folder: string, sequence: number): void {
  const files = segmentFiles(folder)
  for (const [i, file] of files.entries()) {
    const next = files[i + 1]
    if (next && next.first <= sequence + 1 && file.first <= sequence) rmSync(file.path, { force: true })
  }
}

export function segmentBytes(folder: string): number {
  return segmentFiles(folder).reduce((sum, { path }) => sum + readFileSync(path).length, 0)
}

// --------------------------------------------------------------------------------------------- bases

const basePattern = /^base-(\d{12})-([0-9a-f]{16})\.db$/
const headDigits = 16

export interface Base {
  readonly path: string
  readonly sequence: number
  /** The first digits of its head. */
  readonly headStart: string
}

/** The newest whole database, undefined when there is none. */
export function newestBase(folder: string): Base | undefined {
  const found = readdirSync(folder)
    .flatMap((name): Base[] => {
      const match = basePattern.exec(name)
      return match ? [{ path: join(folder, name), sequence: Number(match[1]), headStart: match[2]! }] : []
    })
    .sort((a, b) => b.sequence - a.sequence)
  return found[0]
}

export function basePath(folder: string, { sequence, head }: Point): string {
  return join(folder, `base-${numbered(sequence)}-${head.slice(0, headDigits)}.db`)
}

/** Removes bases older than this one. */
export function forgetBases(folder: string, sequence: number): void {
  for (const name of readdirSync(folder)) {
    const match = basePattern.exec(name)
    if (match && Number(match[1]) < sequence) rmSync(join(folder, name), { force: true })
  }
}
