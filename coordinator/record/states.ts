// States of islands as bytes: structured clones in V8's own format, compressed. They are a cache: a state that
// cannot be read (another Node, a torn write) is passed over for an older one.
//
// Typed arrays are written by V8 itself and not as host objects, so that every array that is read has memory of
// its own; otherwise one small array would keep the bytes of the whole snapshot alive.

import { createHash } from 'node:crypto'
import { Deserializer, Serializer } from 'node:v8'
import { deflateRawSync, inflateRawSync } from 'node:zlib'
import { ByteWriter } from '../../shared/bytes.js'
import { equalBytes } from '../../shared/digests.js'
import type { SnapshotRow } from '../engine/ports.js'

/** How many snapshots an island keeps: the newest may turn out damaged. */
export const snapshotsKept = 3

export interface StoredSnapshot {
  readonly island: number
  readonly commit: number
  readonly digest: Uint8Array
  readonly checksum: Uint8Array
  readonly state: Uint8Array
}

export function bytesOfState(state: unknown): Uint8Array {
  const serializer = new Serializer()
  serializer.writeHeader()
  serializer.writeValue(state)
  return deflateRawSync(serializer.releaseBuffer(), { level: 1 })
}

function stateOfBytes(bytes: Uint8Array): unknown {
  const deserializer = new Deserializer(inflateRawSync(bytes))
  deserializer.readHeader()
  return deserializer.readValue() as unknown
}

function checksumOf(island: number, commit: number, digest: Uint8Array, state: Uint8Array): Uint8Array {
  const key = new ByteWriter(48).count(island).count(commit).bytes(digest).finish()
  return createHash('sha256').update(key).update(state).digest()
}

export function storeSnapshot({ island, commit, digest, state }: SnapshotRow): StoredSnapshot {
  const bytes = bytesOfState(state)
  return { island, commit, digest, checksum: checksumOf(island, commit, digest, bytes), state: bytes }
}

/** The snapshot, or undefined when its checksum does not hold or its state cannot be read. */
export function openSnapshot(stored: StoredSnapshot): SnapshotRow | undefined {
  const { island, commit, digest, state } = stored
  if (!equalBytes(checksumOf(island, commit, digest, state), stored.checksum)) return undefined
  try {
    return { island, commit, digest: Uint8Array.from(digest), state: stateOfBytes(state) }
  } catch {
    return undefined
  }
}
