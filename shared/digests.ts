// Digests: SHA-256 (FIPS 180-4) of canonical bytes. One digest a level: result, genome, island, search.
// Comparing two runs means comparing digests, never fields.

import { sha256 as nobleSha256 } from '@noble/hashes/sha2.js'
import { ByteWriter } from './bytes.js'
import { check } from './check.js'
import { genomeBytes } from './encodings.js'
import type { Genome, GenomeSpec } from './genome.js'
import type { EvaluationResult } from './result.js'

export const digestBytes = 32

// Making a hash object costs twice as much as hashing a block: one is kept and set back before each use.
const untouched = nobleSha256.create()
const reused = nobleSha256.create()
const lastDigest = new Uint8Array(digestBytes)

/** SHA-256, 32 bytes, of one or two pieces in a row. */
export function sha256(first: Uint8Array, second?: Uint8Array): Uint8Array {
  untouched._cloneInto(reused)
  reused.update(first)
  if (second !== undefined) reused.update(second)
  reused.digestInto(lastDigest)
  return lastDigest.slice()
}

const hexDigits = Array.from({ length: 256 }, (_, byte) => byte.toString(16).padStart(2, '0'))

/** Lower-case hexadecimal. */
export function hex(bytes: Uint8Array): string {
  let text = ''
  for (const byte of bytes) text += hexDigits[byte]
  return text
}

/** The bytes behind lower-case hexadecimal, or undefined when the text is not that. */
export function fromHex(text: string): Uint8Array | undefined {
  if (!/^(?:[0-9a-f]{2})*$/.test(text)) return undefined
  return Uint8Array.from({ length: text.length / 2 }, (_, i) =>
    Number.parseInt(text.slice(2 * i, 2 * i + 2), 16),
  )
}

/** Equal length and equal bytes. Not for secrets: it stops at the first difference. */
export function equalBytes(a: Uint8Array, b: Uint8Array): boolean {
  if (a.length !== b.length) return false
  for (let i = 0; i < a.length; i++) if (a[i] !== b[i]) return false
  return true
}

const resultWriter = new ByteWriter(4096)

/** Canonical bytes of a result: count of values, values, count of failures, each with simulation and reason. */
export function resultBytes(result: EvaluationResult): Uint8Array {
  return writeResult(result).finish()
}

function writeResult(result: EvaluationResult): ByteWriter {
  const writer = resultWriter.reset().count(result.values.length)
  for (const value of result.values) {
    check(Math.abs(value) < Infinity, 'values of a result are finite')
    writer.double(value)
  }
  writer.count(result.failures.length)
  for (const failure of result.failures) writer.count(failure.simulation).text(failure.reason)
  return writer
}

/** Digest of a result; equal for equal results on every machine (-0 counts as 0). */
export function resultDigest(result: EvaluationResult): Uint8Array {
  return sha256(writeResult(result).peek())
}

/** Digest of a genome under its specification. */
export function genomeDigest(spec: GenomeSpec, genome: Genome): Uint8Array {
  return sha256(genomeBytes(spec, genome))
}

/** Where every chain begins: 32 zero bytes. */
export const emptyChain: Uint8Array = new Uint8Array(digestBytes)

/**
 * The next digest of a chain: sha256(previous, entry). The cost is one compression for an entry of up to 23
 * bytes, two up to 87, three up to 151: short entries pay.
 */
export function chain(previous: Uint8Array, entry: Uint8Array): Uint8Array {
  check(previous.length === digestBytes, 'a chain goes on from a digest')
  return sha256(previous, entry)
}
