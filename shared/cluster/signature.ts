// The cluster key: whoever holds it may give agents code to run. The coordinator signs the digest of the pinned bundle;
// an agent with a key runs nothing whose signature does not hold. HMAC-SHA256 (RFC 2104, FIPS 198-1).

import { hmac } from '@noble/hashes/hmac.js'
import { sha256 } from '@noble/hashes/sha2.js'
import { utf8ToBytes } from '@noble/hashes/utils.js'
import { check } from '../check.js'
import { hex } from '../digests.js'

/** A shorter key could be guessed. */
export const keyBytesLeast = 16

/**
 * Signature of a bundle, 64 hexadecimal digits: HMAC-SHA256 of the digest's own 64 lower-case hexadecimal digits under
 * the key.
 */
export function signatureOf(key: Uint8Array, pluginDigest: string): string {
  check(key.length >= keyBytesLeast, 'a cluster key is long enough')
  check(/^[0-9a-f]{64}$/.test(pluginDigest), 'what is signed is a SHA-256 in hexadecimal')
  return hex(hmac(sha256, key, utf8ToBytes(pluginDigest)))
}

/** Compared in a time that does not tell how many characters were right. */
export function isSignatureOf(signature: string, key: Uint8Array, pluginDigest: string): boolean {
  const expected = signatureOf(key, pluginDigest)
  if (signature.length !== expected.length) return false
  let different = 0
  for (let i = 0; i < expected.length; i++) different |= expected.charCodeAt(i) ^ signature.charCodeAt(i)
  return different === 0
}
