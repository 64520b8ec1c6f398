import { createHash } from 'node:crypto'
import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { chain, emptyChain, equalBytes, fromHex, hex, resultDigest, sha256 } from './digests.js'

describe('digests', () => {
  // Source: FIPS 180-4 example values, "abc" and the empty message (NIST, 2015; from memory).
  test('SHA-256 has the published values', () => {
    expect(hex(sha256(new TextEncoder().encode('abc')))).toBe(
      'ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad',
    )
    expect(hex(sha256(new Uint8Array()))).toBe(
      'e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855',
    )
  })

  test('a chain is the hash of the previous digest and the entry, for every length', () => {
    fc.assert(
      fc.property(
        fc.uint8Array({ minLength: 32, maxLength: 32 }),
        fc.uint8Array({ maxLength: 9000, size: 'max' }),
        (previous, entry) => {
          const expected = createHash('sha256').update(previous).update(entry).digest('hex')
          expect(hex(chain(previous, entry))).toBe(expected)
        },
      ),
      { seed: 1203 },
    )
    expect(() => chain(new Uint8Array(31), new Uint8Array())).toThrow('promise')
  })

  test('a step of a chain leaves the beginning and earlier digests alone', () => {
    const first = chain(emptyChain, Uint8Array.of(1))
    const kept = hex(first)
    chain(first, Uint8Array.of(2))
    expect(hex(first)).toBe(kept)
    expect(hex(emptyChain)).toBe('00'.repeat(32))
  })

  test('every number, its place and every failure enters the digest of a result; -0 does not', () => {
    const digest = (values: number[], failures: { simulation: number; reason: string }[] = []): string =>
      hex(resultDigest({ values: Float64Array.from(values), failures }))
    const failed = [{ simulation: 0, reason: 'buckled' }]
    const all = [
      digest([]),
      digest([0]),
      digest([1, 2]),
      digest([2, 1]),
      digest([1, 2, 0]),
      digest([0], failed),
      digest([0], [{ simulation: 1, reason: 'buckled' }]),
      digest([0], [{ simulation: 0, reason: 'broke' }]),
      digest([0], [...failed, ...failed]),
    ]
    expect(new Set(all).size).toBe(all.length)
    expect(digest([-0])).toBe(digest([0]))
    expect(() => digest([NaN])).toThrow('promise')
    expect(() => digest([Infinity])).toThrow('promise')
  })

  test('the digest of a result stays what records hold', () => {
    const result = { values: Float64Array.of(1.5, -2, 0), failures: [{ simulation: 2, reason: 'NaN in x' }] }
    const bytes = createHash('sha256')
      .update(Uint8Array.of(3))
      .update(new Uint8Array(result.values.buffer))
      .update(Uint8Array.of(1, 2, 8))
      .update('NaN in x')
    expect(hex(resultDigest(result))).toBe(bytes.digest('hex'))
  })

  test('hexadecimal reads back', () => {
    fc.assert(
      fc.property(fc.uint8Array(), (bytes) => {
        expect(fromHex(hex(bytes))).toEqual(bytes)
      }),
      { seed: 1204 },
    )
    expect(fromHex('0')).toBeUndefined()
    expect(fromHex('0G')).toBeUndefined()
    expect(equalBytes(Uint8Array.of(1, 2), Uint8Array.of(1, 2))).toBe(true)
    expect(equalBytes(Uint8Array.of(1, 2), Uint8Array.of(1, 3))).toBe(false)
    expect(equalBytes(Uint8Array.of(1, 2), Uint8Array.of(1))).toBe(false)
  })
})
