// What the record may cost on the disk and in memory. Sizes do not depend on how busy the machine is.

import { statSync } from 'node:fs'
import { expect, test } from 'vitest'
import { readRecord, recordFolder } from '../../coordinator/record/index.js'
import { measureRecord } from '../bench/record-size.js'
import { madeUpSearch, openAt, scratch, temporaryFolder } from './record-fixture.js'

test.each([
  { numbers: 3, batch: 100, islands: 5 },
  { numbers: 12, batch: 50, islands: 10 },
])('at most 100 bytes plus 8 for each number: %o', (shape) => {
  const size = measureRecord({ place: scratch, evaluations: 20_000, ...shape })
  expect(size.bytesPerEvaluation).toBeLessThanOrEqual(100 + 8 * shape.numbers)
  // A page of the database cannot be fuller than full.
  expect(size.bytesPerEvaluation).toBeGreaterThan(8 * shape.numbers)
})

test('the write-ahead log stays small while others read, and while one of them stops in the middle', () => {
  const { folder, remove } = temporaryFolder()
  const record = openAt(folder)
  const looking = readRecord(folder)
  const log = `${recordFolder(folder).database}-wal`
  let written = 0
  let largest = 0
  let reading: Iterator<unknown> | undefined
  for (const append of madeUpSearch(71, { batches: 500, perBatch: 4 })) {
    record.journal.append(append)
    // Every batch changes at least one page of each of eight tables.
    written += 8 * 4096
    reading ??= looking.reader.arrivals(1)[Symbol.iterator]()
    if (written === 400 * 4096) reading.next()
    largest = Math.max(largest, statSync(log).size)
  }
  expect(written).toBeGreaterThan(16_000_000)
  expect(largest).toBeLessThan(8_000_000)
  looking.close()
  record.close()
  remove()
})
