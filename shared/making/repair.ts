// Helpers for a problem's `repair`: they bring numbers of a genome to what can be bought and made. Pure and
// idempotent, as repair must be: a number that is fine stays as it is, to the bit.

import { check } from '../check.js'
import type { StockRow } from './types.js'

/** The number of `sizes` nearest to `value`; of two equally near ones the smaller. */
export function nearest(value: number, sizes: readonly number[]): number {
  check(sizes.length > 0, 'there are sizes to choose from')
  let best = sizes[0]!
  for (const size of sizes) {
    const gain = Math.abs(best - value) - Math.abs(size - value)
    if (gain > 0 || (gain === 0 && size < best)) best = size
  }
  return best
}

/** A copy of a genome part with every number at the nearest of `sizes`. */
export function snapped(values: Float64Array, sizes: readonly number[]): Float64Array {
  return values.map((value) => nearest(value, sizes))
}

/** The row whose wall, thickness or diameter is nearest. */
export function nearestRow(wallM: number, rows: readonly StockRow[]): StockRow {
  const size = nearest(
    wallM,
    rows.map((row) => row.wallM),
  )
  return rows.find((row) => row.wallM === size)!
}

/** A copy of a genome part with every number inside `low` to `high`. */
export function clamped(values: Float64Array, low: number, high: number): Float64Array {
  check(low <= high, 'a range runs from low to high')
  return values.map((value) => Math.min(high, Math.max(low, value)))
}

/** A length inside what the row can be cut to. */
export function cutLength(lengthM: number, row: StockRow): number {
  return Math.min(row.lengthMostM, Math.max(row.lengthLeastM, lengthM))
}

/**
 * Walls and gaps that repeat over a pitch: the wall nearest to the wanted one that is at least `wallLeastM` and
 * leaves a gap of at least `gapLeastM`. A pitch without room for both gets the least wall (makeability.ts then
 * names the gap).
 */
export function wallForPitch(wallM: number, pitchM: number, wallLeastM: number, gapLeastM: number): number {
  return Math.max(wallLeastM, Math.min(wallM, pitchM - gapLeastM))
}
