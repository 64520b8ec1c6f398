// The chain over everything the record promises to keep: one head a transaction, computed from the head before
// it and from every row the transaction added (schema.ts tells the rule). An append names the keys of its rows
// in `contents`, so that anyone can find them again and compute the same head.

import { createHash } from 'node:crypto'
import { ByteReader, ByteWriter } from '../../shared/bytes.js'
import { type ChainedTable, chained, chainedTables } from './schema.js'
import type { Column } from './storage.js'

/** Columns of the rows one append adds, table by table in the order of chainedTables. */
export type AppendedRows = { readonly [table in ChainedTable]: readonly (readonly Column[])[] }

export interface AppendHeader {
  readonly sequence: number
  /** Which coordinator wrote it: the epoch of its hold. */
  readonly epoch: number
  readonly atMs: number
  /** Arrivals in the record after it, and the CPU time they took. */
  readonly arrivals: number
  readonly cpuSeconds: number
  readonly contents: Uint8Array
}

const writer = new ByteWriter(1 << 16)

/**
 * Keys of the rows as counts: per table how many, then each key as differences to the key before it (results:
 * to the last evaluation of the same island), so that a key mostly takes two bytes. Keys are below 2^52.
 */
export function contentsOf(rows: AppendedRows): Uint8Array {
  writer.reset()
  for (const table of chainedTables) {
    const { keys } = chained[table]
    const last = new Map<number, number[]>()
    writer.count(rows[table].length)
    for (const row of rows[table]) {
      const lead = row[0] as number
      const before = last.get(keys === 1 ? 0 : lead) ?? []
      if (keys > 1) writer.count(lead)
      const rest = row.slice(keys === 1 ? 0 : 1, keys) as number[]
      rest.forEach((value, i) => {
        writeDifference(writer, value - (before[i] ?? 0))
      })
      last.set(keys === 1 ? 0 : lead, rest)
    }
  }
  return writer.finish()
}

export type AppendedKeys = { readonly [table in ChainedTable]: readonly (readonly number[])[] }

/** The keys behind `contents`. @throws Refusal 'bytes-malformed' */
export function keysOf(contents: Uint8Array): AppendedKeys {
  const reader = new ByteReader(contents, 'contents of an append')
  const keys: { [table in ChainedTable]?: readonly (readonly number[])[] } = {}
  for (const table of chainedTables) keys[table] = readKeys(reader, chained[table].keys, contents.length)
  reader.end()
  return keys as AppendedKeys
}

function readKeys(reader: ByteReader, keys: number, most: number): number[][] {
  const last = new Map<number, number[]>()
  const length = reader.count()
  if (length > most) reader.malformed(`found ${length} keys`)
  return Array.from({ length }, () => {
    const lead = keys === 1 ? 0 : reader.count()
    const before = last.get(lead) ?? []
    const rest = Array.from(
      { length: Math.max(1, keys - 1) },
      (_, i) => (before[i] ?? 0) + readDifference(reader),
    )
    last.set(lead, rest)
    return keys === 1 ? rest : [lead, ...rest]
  })
}

function writeDifference(to: ByteWriter, difference: number): void {
  to.count(difference >= 0 ? 2 * difference : -2 * difference - 1)
}
function readDifference(from: ByteReader): number {
  const coded = from.count()
  return coded % 2 === 0 ? coded / 2 : -(coded + 1) / 2
}

/** Columns as bytes: for each its kind, then the value. */
function writeColumns(to: ByteWriter, columns: readonly Column[]): void {
  for (const column of columns) {
    if (column === null) to.u8(0)
    else if (typeof column === 'number') to.u8(1).double(column)
    else if (typeof column === 'string') to.u8(2).text(column)
    else to.u8(3).count(column.length).bytes(column)
  }
}

/** The head after an append. */
export function headAfter(previous: Uint8Array, header: AppendHeader, rows: AppendedRows): Uint8Array {
  const { sequence, epoch, atMs, arrivals, cpuSeconds, contents } = header
  writer.reset().count(sequence).count(epoch).double(atMs).count(arrivals).double(cpuSeconds)
  writer.count(contents.length).bytes(contents)
  for (const table of chainedTables) for (const row of rows[table]) writeColumns(writer, row)
  return createHash('sha256').update(previous).update(writer.peek()).digest()
}

/** The head before the first append: what the search is. */
export function genesisOf(meta: readonly (readonly Column[])[]): Uint8Array {
  writer.reset()
  for (const row of meta) writeColumns(writer, row)
  return createHash('sha256').update(writer.peek()).digest()
}

/** Contents of the entry before the first append, which names no rows. */
export function emptyChainContents(): Uint8Array {
  return new Uint8Array(chainedTables.length)
}
