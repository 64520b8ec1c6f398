import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { ByteReader, ByteWriter } from './bytes.js'
import { Refusal } from './refusals.js'

type Item =
  | { kind: 'u8' | 'u16' | 'u32' | 'count' | 'double'; value: number }
  | { kind: 'text'; value: string }
  | { kind: 'bytes'; value: Uint8Array }

const item: fc.Arbitrary<Item> = fc.oneof(
  fc.record({ kind: fc.constant('u8' as const), value: fc.nat(255) }),
  fc.record({ kind: fc.constant('u16' as const), value: fc.nat(65535) }),
  fc.record({ kind: fc.constant('u32' as const), value: fc.nat(4294967295) }),
  fc.record({ kind: fc.constant('count' as const), value: fc.maxSafeNat() }),
  fc.record({ kind: fc.constant('double' as const), value: fc.double({ noNaN: true }) }),
  fc.record({ kind: fc.constant('text' as const), value: fc.string({ unit: 'binary' }) }),
  fc.record({ kind: fc.constant('bytes' as const), value: fc.uint8Array() }),
)

function write(writer: ByteWriter, entry: Item): void {
  if (entry.kind === 'text') writer.text(entry.value)
  else if (entry.kind === 'bytes') writer.bytes(entry.value)
  else writer[entry.kind](entry.value)
}

describe('bytes', () => {
  test('what is written is read back, whatever the order and however small the first memory', () => {
    fc.assert(
      fc.property(fc.array(item), (items) => {
        const writer = new ByteWriter(1)
        for (const entry of items) write(writer, entry)
        const reader = new ByteReader(writer.finish(), 'test')
        for (const entry of items) {
          const found = entry.kind === 'bytes' ? reader.bytes(entry.value.length) : reader[entry.kind]()
          expect(found).toEqual(Object.is(entry.value, -0) ? 0 : entry.value)
        }
        reader.end()
      }),
      { seed: 1201 },
    )
  })

  test('-0 and 0 have the same bytes, and NaN has none', () => {
    expect(new ByteWriter().double(-0).finish()).toEqual(new Uint8Array(8))
    expect(() => new ByteWriter().double(NaN)).toThrow('promise')
  })

  test('numbers out of range are broken promises', () => {
    const writer = new ByteWriter()
    for (const bad of [-1, 0.5, NaN, Infinity]) {
      expect(() => writer.u8(bad)).toThrow('promise')
      expect(() => writer.u16(bad)).toThrow('promise')
      expect(() => writer.u32(bad)).toThrow('promise')
      expect(() => writer.count(bad)).toThrow('promise')
    }
    expect(() => writer.u8(256)).toThrow('promise')
    expect(() => writer.count(2 ** 53)).toThrow('promise')
  })

  test('layout of the bytes is as documented', () => {
    const written = new ByteWriter().u8(7).u16(0x0102).u32(0x01020304).count(300).text('é').double(1).finish()
    expect([...written]).toEqual([7, 2, 1, 4, 3, 2, 1, 0xac, 2, 2, 0xc3, 0xa9, 0, 0, 0, 0, 0, 0, 0xf0, 0x3f])
  })

  test.each([
    ['too short', [1, 2], (r: ByteReader) => r.u32()],
    ['count with a needless byte', [0x80, 0x00], (r: ByteReader) => r.count()],
    ['count above 2^53 - 1', [255, 255, 255, 255, 255, 255, 255, 127], (r: ByteReader) => r.count()],
    ['endless count', [255, 255, 255, 255, 255, 255, 255, 255, 255, 1], (r: ByteReader) => r.count()],
    ['NaN', [0, 0, 0, 0, 0, 0, 0xf8, 0x7f], (r: ByteReader) => r.double()],
    ['-0', [0, 0, 0, 0, 0, 0, 0, 0x80], (r: ByteReader) => r.double()],
    ['text that is not UTF-8', [1, 0xff], (r: ByteReader) => r.text()],
    ['text longer than the bytes', [200, 1, 65], (r: ByteReader) => r.text()],
    ['bytes left over', [1], (r: ByteReader) => r.end()],
  ])('refuses what no writer gives: %s', (_, memory, read) => {
    const reader = new ByteReader(Uint8Array.from(memory), 'test')
    expect(() => read(reader)).toThrow(Refusal)
  })

  test('random bytes never crash a reader otherwise than by a refusal', () => {
    fc.assert(
      fc.property(fc.uint8Array(), fc.constantFrom('u32', 'count', 'double', 'text'), (memory, kind) => {
        const reader = new ByteReader(memory, 'test')
        try {
          for (;;) reader[kind as 'count']()
        } catch (error) {
          expect(error).toBeInstanceOf(Refusal)
        }
      }),
      { seed: 1202 },
    )
  })
})
