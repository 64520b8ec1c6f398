// One append as bytes in a journal file: the columns of every row it added, what the chain says of it, and a checksum.
// Whoever restores a database inserts exactly these columns, and the chain's head tells whether it is the same record.
//
//   u32 length, 16 bytes of SHA-256 over the payload, payload
//
// A frame that is cut off or damaged ends what can be read of its file.

import { createHash } from 'node:crypto'
import { ByteReader, ByteWriter } from '../../../shared/bytes.js'
import { equalBytes } from '../../../shared/digests.js'
import type { AppendedRows, AppendHeader } from '../chain.js'
import { chainedTables } from '../schema.js'
import type { Column } from '../storage.js'

/** Everything one transaction of the journal wrote. */
export interface Entry {
  readonly header: AppendHeader
  readonly head: Uint8Array
  readonly rows: AppendedRows
  /** Columns of `snapshots`: island, number, digest, checksum, state. */
  readonly snapshots: readonly (readonly Column[])[]
}

const checksumBytes = 16
const frameBytes = 4 + checksumBytes
const headBytes = 32
/** Longer than any append can be: a length beyond it is damage. */
const entryBytesMost = 2 ** 30

const writer = new ByteWriter(1 << 16)

export function frameOf(entry: Entry): Uint8Array {
  const { header, head, rows, snapshots } = entry
  writer.reset().count(header.sequence).count(header.epoch).double(header.atMs)
  writer.count(header.arrivals).double(header.cpuSeconds)
  writer.count(header.contents.length).bytes(header.contents).bytes(head)
  for (const table of chainedTables) writeRows(rows[table])
  writeRows(snapshots)
  const payload = writer.peek()
  const frame = new Uint8Array(frameBytes + payload.length)
  new DataView(frame.buffer).setUint32(0, payload.length, true)
  frame.set(checksumOf(payload), 4)
  frame.set(payload, frameBytes)
  return frame
}

function writeRows(rows: readonly (readonly Column[])[]): void {
  writer.count(rows.length)
  for (const row of rows) {
    writer.count(row.length)
    for (const column of row) {
      if (column === null) writer.u8(0)
      else if (typeof column === 'number') writer.u8(1).double(column)
      else if (typeof column === 'string') writer.u8(2).text(column)
      else writer.u8(3).count(column.length).bytes(column)
    }
  }
}

/** The entries of a file's bytes from `start` on, as far as they are whole. `end`: where the last whole one ends. */
export function entriesIn(bytes: Uint8Array, start: number): { entries: Entry[]; end: number } {
  const view = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength)
  const entries: Entry[] = []
  let end = start
  while (end + frameBytes <= bytes.length) {
    const length = view.getUint32(end, true)
    const next = end + frameBytes + length
    if (length > entryBytesMost || next > bytes.length) break
    const payload = bytes.subarray(end + frameBytes, next)
    if (!equalBytes(checksumOf(payload), bytes.subarray(end + 4, end + frameBytes))) break
    entries.push(entryOf(payload))
    end = next
  }
  return { entries, end }
}

function entryOf(payload: Uint8Array): Entry {
  const reader = new ByteReader(payload, 'an entry of the journal')
  const sequence = reader.count()
  const epoch = reader.count()
  const atMs = reader.double()
  const arrivals = reader.count()
  const cpuSeconds = reader.double()
  const contents = reader.bytes(reader.count()).slice()
  const head = reader.bytes(headBytes).slice()
  const rows = Object.fromEntries(chainedTables.map((table) => [table, readRows(reader)])) as unknown
  const snapshots = readRows(reader)
  reader.end()
  const header = { sequence, epoch, atMs, arrivals, cpuSeconds, contents }
  return { header, head, rows: rows as AppendedRows, snapshots }
}

function readRows(reader: ByteReader): Column[][] {
  return Array.from({ length: reader.count() }, () =>
    Array.from({ length: reader.count() }, (): Column => {
      const kind = reader.u8()
      if (kind === 0) return null
      if (kind === 1) return reader.double()
      if (kind === 2) return reader.text()
      return reader.bytes(reader.count()).slice()
    }),
  )
}

function checksumOf(payload: Uint8Array): Uint8Array {
  return createHash('sha256').update(payload).digest().subarray(0, checksumBytes)
}
