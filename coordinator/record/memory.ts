// A record in memory, for simulated clusters, tests and benchmarks of the engine alone. MemoryDisk is the medium
// that survives its openings; with `losing` it forgets what was not synced when it crashes, in part or torn.
//
// The same contract suite runs over this and over the real record. Digests of arrivals are computed again when
// asked for, snapshots and mail are kept as bytes, both as there.

import { createHash } from 'node:crypto'
import { Deserializer, Serializer } from 'node:v8'
import { check } from '../../shared/check.js'
import { emptyChain, equalBytes } from '../../shared/digests.js'
import { type Refusal, type RefusalCode, refuse } from '../../shared/refusals.js'
import type { Stream } from '../../shared/streams.js'
import type { Append, Journal } from '../engine/ports.js'
import { MemoryStore } from './memory-store.js'
import type { StoredReader } from './reader.js'
import { checkArrival } from './rows.js'

export interface MemoryDiskOptions {
  /** Decides what a crash leaves. Appends are durable only after sync(), or at once with `syncs`. */
  readonly losing?: { readonly stream: Stream; readonly syncs: 'every-append' | 'when-told' }
}

export interface MemoryRecord {
  readonly journal: Journal
  readonly reader: StoredReader
  readonly epoch: number
  close(): void
}

/** One append on the simulated disk: valid while its checksum holds. */
interface LogEntry {
  readonly bytes: Uint8Array
  readonly checksum: Uint8Array
}

export class MemoryDisk {
  readonly #losing: MemoryDiskOptions['losing']
  #log: LogEntry[] = []
  #synced = 0
  #store = new MemoryStore()
  #epoch = 0
  #holder = 0
  /** Set to make every append refuse, as a full or broken disk does; nothing is written then. */
  trouble: RefusalCode | undefined

  constructor(options: MemoryDiskOptions = {}) {
    this.#losing = options.losing
  }

  /** Opens for writing. @throws Refusal 'record-in-use' unless it is free or taken by force. */
  open({ force = false }: { readonly force?: boolean } = {}): MemoryRecord {
    if (this.#holder !== 0 && !force) throw refuse('record-in-use', { detail: `opening ${this.#holder}` })
    this.#epoch += 1
    this.#holder = this.#epoch
    const epoch = this.#epoch
    let broken: Refusal | undefined
    const append = (rows: Append): void => {
      if (broken) throw broken
      if (this.#holder !== epoch) {
        throw refuse('record-fenced', { detail: `opening ${this.#holder} holds it now` })
      }
      if (this.trouble) {
        const refusal = refuse(this.trouble, { detail: 'made on purpose' })
        if (this.trouble === 'disk-error') broken = refusal
        throw refusal
      }
      this.#append(rows)
    }
    const close = (): void => {
      if (this.#holder === epoch) this.#holder = 0
    }
    return { journal: { append }, reader: this.#store, epoch, close }
  }

  #append(rows: Append): void {
    if (Object.values(rows).every((list: readonly unknown[]) => list.length === 0)) return
    rows.arrivals.forEach(checkArrival)
    this.#store.checkAppend(rows)
    if (this.#losing) {
      const bytes = toBytes(rows)
      this.#log.push({ bytes, checksum: checksumOf(bytes) })
      if (this.#losing.syncs === 'every-append') this.#synced = this.#log.length
    }
    this.#store.apply(rows)
  }

  /** Everything appended so far survives every crash from now on. */
  sync(): void {
    this.#synced = this.#log.length
  }

  /** Damages the state of a stored snapshot. */
  damageSnapshot(island: number, commit: number): void {
    this.#store.damageSnapshot(island, commit)
  }

  /**
   * The machine stops. Of the appends that were not synced the stream lets some first ones survive; the next may
   * be on the disk in part. Then the disk is read again up to the first entry whose checksum does not hold.
   * Openings of before are void. Returns how many appends were lost.
   */
  crash(): number {
    const losing = this.#losing
    check(losing !== undefined, 'a disk that loses nothing is not crashed')
    const before = this.#log.length
    const unsynced = before - this.#synced
    const surviving = this.#synced + (unsynced > 0 ? losing.stream.below(unsynced + 1) : 0)
    const torn = this.#log[surviving]
    this.#log.length = surviving
    if (torn && losing.stream.chance(1, 2)) this.#log.push(tear(torn, losing.stream))
    this.#holder = 0
    this.#epoch += 1
    this.#recover()
    return before - this.#log.length
  }

  #recover(): void {
    this.#store = new MemoryStore()
    const firstTorn = this.#log.findIndex(({ bytes, checksum }) => !equalBytes(checksumOf(bytes), checksum))
    if (firstTorn >= 0) this.#log.length = firstTorn
    for (const { bytes } of this.#log) this.#store.apply(fromBytes(bytes))
    this.#synced = this.#log.length
  }
}

/** Only the first part reached the disk, the rest reads as zeros. */
function tear({ bytes, checksum }: LogEntry, stream: Stream): LogEntry {
  const torn = new Uint8Array(bytes.length)
  torn.set(bytes.subarray(0, stream.below(bytes.length)))
  return { bytes: torn, checksum }
}

function checksumOf(bytes: Uint8Array): Uint8Array {
  return createHash('sha256').update(bytes).digest()
}

function toBytes(rows: Append): Uint8Array {
  const serializer = new Serializer()
  serializer.writeHeader()
  // Lazy digests are no data: they follow from the results.
  serializer.writeValue({ ...rows, arrivals: rows.arrivals.map((row) => ({ ...row, digest: emptyChain })) })
  return serializer.releaseBuffer()
}
function fromBytes(bytes: Uint8Array): Append {
  const deserializer = new Deserializer(bytes)
  deserializer.readHeader()
  return deserializer.readValue() as Append
}
