// The last words of whoever simulates: the newest 64 KB of all that was printed, in memory that outlives its writer.
// A plug-in may print gigabytes; older bytes are overwritten, nothing grows, nothing is sent.
//
// Layout of the shared memory: Int32 [runningItem + 1, batch, bytesPrinted (wraps)], then the ring of bytes.
// The first two words say which item was running when a thread died or hung: the heartbeat of a batch.

import { limits } from '../shared/limits.js'
import { plainText } from '../shared/refusals.js'

const ringBytes = 65_536
const headWords = 4

export class Blackbox {
  readonly memory: SharedArrayBuffer
  private readonly head: Int32Array
  private readonly ring: Uint8Array

  constructor(memory: SharedArrayBuffer = new SharedArrayBuffer(4 * headWords + ringBytes)) {
    this.memory = memory
    this.head = new Int32Array(memory, 0, headWords)
    this.ring = new Uint8Array(memory, 4 * headWords, ringBytes)
  }

  /** Before item `index` of batch `batch` is simulated. */
  begin(batch: number, index: number): void {
    Atomics.store(this.head, 1, batch)
    Atomics.store(this.head, 0, index + 1)
  }
  /** After the last item of a batch. */
  rest(): void {
    Atomics.store(this.head, 0, 0)
  }
  /** The item that is running, or undefined between batches. */
  running(): { readonly batch: number; readonly index: number } | undefined {
    const index = Atomics.load(this.head, 0) - 1
    return index < 0 ? undefined : { batch: Atomics.load(this.head, 1), index }
  }

  /** Keeps printed bytes; only the newest 64 KB of them. */
  print(bytes: Uint8Array): void {
    const kept = bytes.subarray(Math.max(0, bytes.length - ringBytes))
    const printed = Atomics.load(this.head, 2) >>> 0
    const start = (printed + bytes.length - kept.length) % ringBytes
    const first = Math.min(kept.length, ringBytes - start)
    this.ring.set(kept.subarray(0, first), start)
    this.ring.set(kept.subarray(first), 0)
    // Past 2^31 the count only has to stay full and in phase with the ring.
    const total = printed + bytes.length
    Atomics.store(this.head, 2, total < 2 ** 31 ? total : ringBytes + (total % ringBytes))
  }

  /** The newest characters that were printed, at most `most`. */
  lastWords(most: number): string {
    const printed = Atomics.load(this.head, 2) >>> 0
    const end = printed % ringBytes
    const bytes = new Uint8Array(Math.min(printed, ringBytes))
    if (printed <= ringBytes) bytes.set(this.ring.subarray(0, bytes.length))
    else {
      bytes.set(this.ring.subarray(end))
      bytes.set(this.ring.subarray(0, end), ringBytes - end)
    }
    return new TextDecoder().decode(bytes).slice(-most)
  }
}

/** From now on whatever this thread or process prints goes into the black box and nowhere else. */
export function captureOutput(box: Blackbox): void {
  const encoder = new TextEncoder()
  const write = (chunk: string | Uint8Array, ...rest: unknown[]): boolean => {
    // A huge string is cut before it is encoded.
    box.print(typeof chunk === 'string' ? encoder.encode(chunk.slice(-ringBytes)) : chunk)
    const done = rest.at(-1)
    if (typeof done === 'function') queueMicrotask(() => done())
    return true
  }
  process.stdout.write = write
  process.stderr.write = write
}

/** A sentence and what was printed last, in at most limits.lossDetailLength plain characters. */
export function withLastWords(sentence: string, box: Blackbox): string {
  const start = sentence.slice(0, limits.lossDetailLength / 2)
  const printed = box.lastWords(limits.lossDetailLength - start.length - 20).trim()
  return plainText(printed === '' ? start : `${start}; last printed: ${printed}`)
}
