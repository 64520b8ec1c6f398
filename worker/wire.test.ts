import fc from 'fast-check'
import { expect, test } from 'vitest'
import type { WorkItem } from '../shared/result.js'
import { batchLength, packBatch, packDone, type Simulated, unpackDone, unpackItem } from './wire.js'

const bytes = fc.uint8Array({ maxLength: 40 })
const itemArbitrary: fc.Arbitrary<WorkItem> = fc.record({
  island: fc.integer({ min: 1, max: 1000 }),
  evaluation: fc.nat(),
  attempt: fc.integer({ min: 1, max: 9 }),
  individual: fc.nat({ max: 2 ** 52 }),
  firstReplicate: fc.nat(4096),
  replicates: fc.integer({ min: 1, max: 64 }),
  expectedCost: fc.integer({ min: 1, max: 1e9 }),
  genome: bytes,
  purpose: fc.constant('evaluate' as const),
  isolation: fc.constant('shared' as const),
  avoid: fc.constant([]),
})

test('a batch arrives as it was packed', () => {
  fc.assert(
    fc.property(fc.array(itemArbitrary, { maxLength: 20 }), fc.nat(), (list, number) => {
      const message = packBatch(number, list)
      expect(message.batch).toBe(number)
      expect(batchLength(message)).toBe(list.length)
      for (const [i, item] of list.entries()) expect(unpackItem(message, i)).toEqual(item)
    }),
  )
})

test('packing takes copies: the memory that is handed over is never that of an item', () => {
  const genome = Uint8Array.of(1, 2, 3)
  const message = packBatch(1, [{ individual: 1, firstReplicate: 0, replicates: 1, genome } as WorkItem])
  expect(message.genomes.buffer).not.toBe(genome.buffer)
})

test('results arrive as they were packed, each in memory of its own', () => {
  const simulated: fc.Arbitrary<Simulated> = fc.record({
    result: fc.record({
      values: fc.float64Array({ maxLength: 12, noNaN: true }),
      failures: fc.array(fc.record({ simulation: fc.nat(100), reason: fc.string() }), { maxLength: 3 }),
    }),
    digest: fc.uint8Array({ minLength: 32, maxLength: 32 }),
    cpuSeconds: fc.double({ min: 0, max: 1e6, noNaN: true }),
    wallSeconds: fc.double({ min: 0, max: 1e6, noNaN: true }),
  })
  fc.assert(
    fc.property(fc.array(simulated, { maxLength: 20 }), (list) => {
      const message = packDone(3, 5, list)
      const back = unpackDone(message)
      expect(back).toEqual(list)
      for (const { result, digest } of back) {
        expect(result.values.buffer.byteLength).toBe(result.values.byteLength)
        expect(digest.buffer.byteLength).toBe(32)
      }
    }),
  )
})
