// One digest of many numbers, the same on every machine: 8 bytes a number, least significant first. What has no meaning
// is taken away before: the sign of zero, and the bits of what is no number (processor families disagree about them).

import { hex, sha256 } from '../../shared/digests.js'

/** Hex SHA-256 of the numbers, in order. */
export function digestOf(numbers: ArrayLike<number>): string {
  const bytes = new Uint8Array(8 * numbers.length)
  const view = new DataView(bytes.buffer)
  for (let i = 0; i < numbers.length; i++) {
    const value = numbers[i]!
    if (Number.isNaN(value)) view.setBigUint64(8 * i, 0x7ff8_0000_0000_0000n, true)
    else view.setFloat64(8 * i, value + 0, true)
  }
  return hex(sha256(bytes))
}
