import fc from 'fast-check'
import { expect, test } from 'vitest'
import { Blackbox } from './tail.js'

test('the last words are the newest 64 KB of everything printed, whatever the portions', () => {
  fc.assert(
    fc.property(fc.array(fc.nat(70_000), { maxLength: 12 }), (lengths) => {
      const box = new Blackbox()
      let all = ''
      for (const [i, length] of lengths.entries()) {
        const text = String.fromCharCode(97 + (i % 26)).repeat(length)
        box.print(new TextEncoder().encode(text))
        all = (all + text).slice(-65_536)
      }
      expect(box.lastWords(65_536) === all).toBe(true)
      expect(box.lastWords(10)).toBe(all.slice(-10))
    }),
    { numRuns: 50 },
  )
})

test('the count of printed bytes may pass 2^31', () => {
  const box = new Blackbox()
  const words = new Int32Array(box.memory, 0, 4)
  // As if 2^31 - 10 bytes had been printed; the ring stays in phase because its length divides 2^16.
  words[2] = 2 ** 31 - 10
  box.print(new TextEncoder().encode('x'.repeat(65_536)))
  box.print(new TextEncoder().encode('the end'))
  expect(box.lastWords(7)).toBe('the end')
  expect(box.lastWords(65_536)).toBe(`${'x'.repeat(65_536 - 7)}the end`)
})

test('says which item is running, also to another who sees the same memory', () => {
  const box = new Blackbox()
  const seen = new Blackbox(box.memory)
  expect(seen.running()).toBeUndefined()
  box.begin(7, 0)
  expect(seen.running()).toEqual({ batch: 7, index: 0 })
  box.begin(7, 1)
  expect(seen.running()).toEqual({ batch: 7, index: 1 })
  box.rest()
  expect(seen.running()).toBeUndefined()
})
