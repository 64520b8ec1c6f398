import { createHmac } from 'node:crypto'
import { expect, test } from 'vitest'
import { isSignatureOf, signatureOf } from './signature.js'

const key = new TextEncoder().encode('a key of the water works, 2026')
const digest = 'ab'.repeat(32)

test('a signature is the HMAC-SHA256 that another implementation gives', () => {
  expect(signatureOf(key, digest)).toBe(createHmac('sha256', key).update(digest).digest('hex'))
})

test('it holds for its key and its digest only', () => {
  const signature = signatureOf(key, digest)
  expect(isSignatureOf(signature, key, digest)).toBe(true)
  expect(isSignatureOf(signature, key, 'ac'.repeat(32))).toBe(false)
  expect(isSignatureOf(signature, new TextEncoder().encode('another key of the works'), digest)).toBe(false)
  expect(isSignatureOf('', key, digest)).toBe(false)
  expect(isSignatureOf(`${signature.slice(0, -1)}${signature.endsWith('0') ? '1' : '0'}`, key, digest)).toBe(
    false,
  )
})

test('a key that could be guessed is not used', () => {
  expect(() => signatureOf(new Uint8Array(15), digest)).toThrow('long enough')
})
