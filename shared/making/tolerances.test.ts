// Tables of tolerances against the published ones, in mm.

import { describe, expect, test } from 'vitest'
import {
  generalToleranceM,
  handPlacementM,
  mouldedRubberToleranceM,
  printedToleranceM,
  type RubberClass,
} from './tolerances.js'

/** [size, M1 F, M1 C, M2 F, M2 C, M3 F, M3 C, M4] */
type RubberRow = readonly [number, number, number, number, number, number, number, number]

// ISO 3302-1, Rubber: tolerances for products. Three independent trade tables agree (read).
const rubber: readonly RubberRow[] = [
  [4, 0.08, 0.1, 0.1, 0.15, 0.25, 0.4, 0.5],
  [6.3, 0.1, 0.12, 0.15, 0.2, 0.25, 0.4, 0.5],
  [10, 0.1, 0.15, 0.2, 0.2, 0.3, 0.5, 0.7],
  [16, 0.15, 0.2, 0.2, 0.25, 0.4, 0.6, 0.8],
  [25, 0.2, 0.2, 0.25, 0.35, 0.5, 0.8, 1],
  [40, 0.2, 0.25, 0.35, 0.4, 0.6, 1, 1.3],
  [63, 0.25, 0.35, 0.4, 0.5, 0.8, 1.3, 1.6],
  [100, 0.35, 0.4, 0.5, 0.7, 1, 1.6, 2],
  [160, 0.4, 0.5, 0.7, 0.8, 1.3, 2, 2.5],
]
const inMm = (sizeMm: number, grade: RubberClass, across: 'fixed' | 'closure') =>
  1000 * mouldedRubberToleranceM(sizeMm / 1000, grade, across)

describe('moulded rubber', () => {
  test.each(rubber)('up to %d mm', (toMm, m1f, m1c, m2f, m2c, m3f, m3c, m4) => {
    for (const sizeMm of [toMm, toMm - 0.01]) {
      expect(inMm(sizeMm, 'M1', 'fixed')).toBeCloseTo(m1f, 12)
      expect(inMm(sizeMm, 'M1', 'closure')).toBeCloseTo(m1c, 12)
      expect(inMm(sizeMm, 'M2', 'fixed')).toBeCloseTo(m2f, 12)
      expect(inMm(sizeMm, 'M2', 'closure')).toBeCloseTo(m2c, 12)
      expect(inMm(sizeMm, 'M3', 'fixed')).toBeCloseTo(m3f, 12)
      expect(inMm(sizeMm, 'M3', 'closure')).toBeCloseTo(m3c, 12)
      expect(inMm(sizeMm, 'M4', 'fixed')).toBeCloseTo(m4, 12)
    }
  })

  test('"over 4 mm" is the next row, and beyond 160 mm it is a share', () => {
    expect(inMm(4.001, 'M1', 'fixed')).toBeCloseTo(0.1, 12)
    expect(inMm(200, 'M1', 'closure')).toBeCloseTo(0.8, 12)
    expect(inMm(200, 'M2', 'fixed')).toBeCloseTo(1, 12)
    expect(inMm(200, 'M3', 'closure')).toBeCloseTo(2.6, 12)
    expect(inMm(200, 'M4', 'fixed')).toBeCloseTo(3, 12)
  })

  test('a finer class is never coarser, and a larger part never more exact', () => {
    for (const across of ['fixed', 'closure'] as const) {
      let before = [0, 0, 0, 0]
      for (let sizeMm = 1; sizeMm <= 160; sizeMm += 1) {
        const row = (['M1', 'M2', 'M3', 'M4'] as const).map((grade) => inMm(sizeMm, grade, across))
        for (const [i, value] of row.entries()) {
          expect(value).toBeGreaterThanOrEqual(row[i - 1] ?? 0)
          expect(value).toBeGreaterThanOrEqual(before[i]!)
        }
        before = row
      }
    }
  })
})

// ISO 2768-1, General tolerances, 1989: fine, medium, coarse (several trade tables, read).
test.each([
  [2, 0.05, 0.1, 0.2],
  [6, 0.05, 0.1, 0.3],
  [30, 0.1, 0.2, 0.5],
  [120, 0.15, 0.3, 0.8],
  [400, 0.2, 0.5, 1.2],
  [1000, 0.3, 0.8, 2],
  [2000, 0.5, 1.2, 3],
])('general tolerances up to %d mm', (sizeMm, fine, medium, coarse) => {
  expect(1000 * generalToleranceM(sizeMm / 1000, 'fine')!).toBeCloseTo(fine, 12)
  expect(1000 * generalToleranceM(sizeMm / 1000)!).toBeCloseTo(medium, 12)
  expect(1000 * generalToleranceM(sizeMm / 1000, 'coarse')!).toBeCloseTo(coarse, 12)
})

test('outside 0.5 mm to 2 m there is no general tolerance', () => {
  for (const sizeM of [0.0004, 2.01, Number.NaN]) expect(generalToleranceM(sizeM)).toBeUndefined()
})

test('printing is exact to 0.5 mm or 0.5 %, calibrated to 0.2 mm, 0.3 mm at 100 mm', () => {
  // Rules of hobby and service makers (three, read).
  expect(printedToleranceM(0.05)).toBe(0.0005)
  expect(printedToleranceM(0.2)).toBeCloseTo(0.001, 12)
  expect(printedToleranceM(0.05, true)).toBe(0.0002)
  expect(printedToleranceM(0.1, true)).toBeCloseTo(0.0003, 12)
})

test('hands place ten times coarser than an eye surgeon under magnification', () => {
  // Riviere, Rader and Khosla, Characteristics of hand motion of eye surgeons, 1997: 49 micrometres rms (read).
  expect(handPlacementM / 49e-6).toBeGreaterThan(10)
})
