import { describe, expect, test } from 'vitest'
import { conditionStream } from './conditions.js'
import { idOf } from './ids.js'
import { philox4x32, purposes, stream } from './streams.js'

describe('streams', () => {
  test('the same name gives the same numbers, whoever else draws in between', () => {
    const alone = stream(7, 'birth', 1, 2, 3)
    const expected = Array.from({ length: 10 }, () => alone.word())
    const again = stream(7, 'birth', 1, 2, 3)
    const other = stream(7, 'birth', 1, 2, 4)
    const found = expected.map(() => {
      other.word()
      return again.word()
    })
    expect(found).toEqual(expected)
  })

  test('a stream is the documented place in the output of Philox4x32-10', () => {
    const seed = 2 ** 52 + 12345
    const key = new Uint32Array(4)
    philox4x32([purposes.emigrants, seed % 2 ** 32, Math.floor(seed / 2 ** 32), 0x534b5259], [0, 0], key)
    const block = new Uint32Array(4)
    const drawn = stream(seed, 'emigrants', 4294967295, 5, 6)
    for (let i = 0; i < 3; i++) {
      philox4x32([i, 4294967295, 5, 6], key.subarray(0, 2), block)
      expect([drawn.word(), drawn.word(), drawn.word(), drawn.word()]).toEqual([...block])
    }
  })

  test('seed, purpose and every id matter', () => {
    const first = [
      stream(1, 'birth'),
      stream(2, 'birth'),
      stream(1 + 2 ** 32, 'birth'),
      stream(1, 'commit'),
      stream(1, 'birth', 1),
      stream(1, 'birth', 0, 1),
      stream(1, 'birth', 0, 0, 1),
    ].map((s) => s.word())
    expect(new Set(first).size).toBe(first.length)
  })

  test('keys kept for one seed are not given to another', () => {
    const before = stream(1, 'birth').word()
    for (let seed = 2; seed < 200; seed++) stream(seed, 'birth').word()
    expect(stream(1, 'birth').word()).toBe(before)
  })

  test('purposes have numbers of their own', () => {
    const numbers = Object.values(purposes)
    expect(new Set(numbers).size).toBe(numbers.length)
  })

  test('ids outside 32 bits, bounds and seeds that cannot be drawn are broken promises', () => {
    expect(() => stream(1, 'birth', 2 ** 32)).toThrow('promise')
    expect(() => stream(1, 'birth', -1)).toThrow('promise')
    expect(() => stream(-1, 'birth')).toThrow('promise')
    expect(() => stream(0.5, 'birth')).toThrow('promise')
    const s = stream(1, 'spare')
    for (const bound of [0, -1, 1.5, 2 ** 32 + 1, NaN]) expect(() => s.below(bound)).toThrow('promise')
    for (const weights of [[], [0, 0], [-1, 2], [NaN], [Infinity]]) {
      expect(() => s.weighted(weights)).toThrow('promise')
    }
  })

  test('rivals share a condition when asked to, and only then', () => {
    const a = idOf(1, 5)
    const b = idOf(2, 9)
    expect(conditionStream(3, true, a, 4).word()).toBe(conditionStream(3, true, b, 4).word())
    expect(conditionStream(3, false, a, 4).word()).not.toBe(conditionStream(3, false, b, 4).word())
    expect(conditionStream(3, true, a, 4).word()).not.toBe(conditionStream(3, true, a, 5).word())
  })

  test('a draw of one weight takes no weight of 0', () => {
    const s = stream(5, 'spare', 77)
    for (let i = 0; i < 1000; i++) expect([1, 3]).toContain(s.weighted([0, 2, 0, 5, 0]))
  })
})
