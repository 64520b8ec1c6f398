// What the record may cost on the disk and in memory. Sizes do not depend on how busy the machine is.

import { expect, test } from 'vitest'
import { measureRecord } from '../bench/record-size.js'

test.each([3, 12])(
  'at most 100 bytes plus 8 for each of %i numbers, in batches of 100 and of 50',
  (numbers) => {
    for (const [batch, islands] of [
      [100, 5],
      [50, 10],
    ] as const) {
      const size = measureRecord({ evaluations: 20_000, numbers, batch, islands })
      expect(size.bytesPerEvaluation).toBeLessThanOrEqual(100 + 8 * numbers)
      // A page of the database cannot be fuller than full.
      expect(size.bytesPerEvaluation).toBeGreaterThan(8 * numbers)
    }
  },
)
