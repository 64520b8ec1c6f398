// A witness beside the database: one line that tells the last append that was durable. The database alone cannot
// know that its end is missing (an older copy put back, a write-ahead log deleted); this line can.
//
//   append 0000000000000123 arrivals 0000000000012345 at 2026-12-01T09:00:00.000Z head <64 hex> check <16 hex>
//
// It is overwritten in place after every append, without waiting for the disk: after a loss of power it may tell
// an older append, never a newer one than the database was made to keep. `check` is the start of the SHA-256 of
// the line before it; a line that fails it says nothing.

import { createHash } from 'node:crypto'
import { closeSync, openSync, readFileSync, writeSync } from 'node:fs'
import { fromHex, hex } from '../../shared/digests.js'
import type { Totals } from './reader.js'

/** What the witness tells. */
export type Said = Pick<Totals, 'appends' | 'arrivals' | 'head' | 'lastMs'>

const pattern = /^append (\d{16}) arrivals (\d{16}) at (\S+) head ([0-9a-f]{64}) check ([0-9a-f]{16})\n$/

function lineOf({ appends, arrivals, head, lastMs }: Said): string {
  const digits = (value: number) => String(value).padStart(16, '0')
  const date = new Date(lastMs)
  const time = Number.isNaN(date.getTime()) ? new Date(0).toISOString() : date.toISOString()
  const said = `append ${digits(appends)} arrivals ${digits(arrivals)} at ${time} head ${hex(head)} `
  return `${said}check ${checkOf(said)}\n`
}
function checkOf(said: string): string {
  return createHash('sha256').update(said).digest('hex').slice(0, 16)
}

/** What the witness says: undefined when there is none, 'unreadable' when its line does not hold. */
export function readWitness(path: string): Said | 'unreadable' | undefined {
  let line: string
  try {
    line = readFileSync(path, 'latin1')
  } catch {
    return undefined
  }
  const match = pattern.exec(line)
  const head = fromHex(match?.[4] ?? '')
  if (!match || !head || checkOf(line.slice(0, line.indexOf('check '))) !== match[5]) return 'unreadable'
  return {
    appends: Number(match[1]),
    arrivals: Number(match[2]),
    lastMs: Date.parse(match[3]!),
    head,
  }
}

/** The writing side. Trouble with it never stops a search: an old witness is only a worse one. */
export class Witness {
  readonly #path: string
  #file: number | undefined

  constructor(path: string) {
    this.#path = path
  }

  say(totals: Said): void {
    const line = Buffer.from(lineOf(totals), 'latin1')
    try {
      this.#file ??= openForUpdate(this.#path)
      writeSync(this.#file, line, 0, line.length, 0)
    } catch {
      this.close()
    }
  }

  close(): void {
    if (this.#file === undefined) return
    const file = this.#file
    this.#file = undefined
    try {
      closeSync(file)
    } catch {
      // Nothing depends on it.
    }
  }
}

/** Opens for writing in place, and makes the file when it is missing. */
function openForUpdate(path: string): number {
  try {
    return openSync(path, 'r+')
  } catch {
    return openSync(path, 'w+')
  }
}
