// The running hash of an island. Entries are hashed in blocks of sixteen, so that a commit costs little more than
// one compression: a block's digest is sha256(digest before it, its entries); the digest in the middle of a block is
// the same over the entries so far, and is worked out when it is asked for. Equal entries, equal digests, whenever
// anybody asks.

import { check } from '../../shared/check.js'
import { chain, digestBytes, emptyChain } from '../../shared/digests.js'

const entriesPerBlock = 16

/** Structured-cloneable. */
export interface RunningDigestState {
  readonly block: Uint8Array
  readonly pending: Uint8Array
  readonly entries: number
}

export class RunningDigest {
  #block: Uint8Array
  #pending: Uint8Array
  #length: number
  #entries: number
  #digest: Uint8Array | undefined

  constructor(state?: RunningDigestState) {
    this.#block = state?.block ?? emptyChain
    check(this.#block.length === digestBytes, 'a block ends in a digest')
    this.#length = state?.pending.length ?? 0
    this.#pending = new Uint8Array(Math.max(2048, 2 * this.#length))
    if (state) this.#pending.set(state.pending)
    this.#entries = state?.entries ?? 0
  }

  /** Takes the bytes in; they may be overwritten afterwards. */
  add(entry: Uint8Array): void {
    const length = this.#length + entry.length
    if (length > this.#pending.length) {
      const larger = new Uint8Array(2 * length)
      larger.set(this.#pending.subarray(0, this.#length))
      this.#pending = larger
    }
    this.#pending.set(entry, this.#length)
    this.#length = length
    this.#digest = undefined
    if (++this.#entries < entriesPerBlock) return
    this.#block = chain(this.#block, this.#pending.subarray(0, length))
    this.#length = 0
    this.#entries = 0
    this.#digest = this.#block
  }

  /** 32 bytes over everything so far. */
  get digest(): Uint8Array {
    if (this.#entries === 0) return this.#block
    this.#digest ??= chain(this.#block, this.#pending.subarray(0, this.#length))
    return this.#digest
  }

  save(): RunningDigestState {
    return { block: this.#block, pending: this.#pending.slice(0, this.#length), entries: this.#entries }
  }
}
