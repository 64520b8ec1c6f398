// Single bits of the database turned over, one at a time.

import { cpSync, readFileSync, rmSync, writeFileSync } from 'node:fs'
import { isDeepStrictEqual } from 'node:util'
import { expect, test } from 'vitest'
import { readRecord, recordFolder } from '../../coordinator/record/index.js'
import { Refusal } from '../../shared/refusals.js'
import { stream } from '../../shared/streams.js'
import { contentOf, madeUpSearch, openAt, temporaryFolder } from './record-fixture.js'

const batches = 12
const evaluations = batches * 4

// Source of the method: single-bit flips in copies; a chain of digests and the database's own checks together
// must leave no flip that changes what is read. (Common practice, no source.)
test('100 single-bit flips: refused, or found by the check, or nothing that is read has changed', () => {
  const source = temporaryFolder()
  const record = openAt(source.folder)
  for (const append of madeUpSearch(31, { batches, perBatch: 4, islands: 3 })) record.journal.append(append)
  record.close()
  const whole = readRecord(source.folder)
  const content = contentOf(whole.reader, 3, evaluations)
  whole.close()
  const { database } = recordFolder(source.folder)
  const bytes = readFileSync(database)
  const draw = stream(20261201, 'spare', 41, 0, 0)
  const { folder, remove } = temporaryFolder()
  cpSync(source.folder, folder, { recursive: true })
  const target = recordFolder(folder).database
  const counts = { found: 0, harmless: 0 }
  try {
    for (let flip = 0; flip < 100; flip++) {
      const [at, bit] = [draw.below(bytes.length), draw.below(8)]
      bytes[at]! ^= 1 << bit
      for (const end of ['-wal', '-shm']) rmSync(target + end, { force: true })
      writeFileSync(target, bytes)
      bytes[at]! ^= 1 << bit
      counts[verdictOf(folder, content, `bit ${bit} of byte ${at}`)] += 1
    }
  } finally {
    remove()
    source.remove()
  }
  // Most of a record is data: most flips must be found, and free space makes some harmless.
  expect(counts.found).toBeGreaterThan(15)
  expect(counts.found + counts.harmless).toBe(100)
})

function verdictOf(folder: string, content: unknown, what: string): 'found' | 'harmless' {
  try {
    const record = readRecord(folder)
    try {
      if (!record.verify().intact) return 'found'
      expect(isDeepStrictEqual(contentOf(record.reader, 3, evaluations), content), what).toBe(true)
      return 'harmless'
    } finally {
      record.close()
    }
  } catch (error) {
    if (!(error instanceof Refusal)) throw error
    return 'found'
  }
}
