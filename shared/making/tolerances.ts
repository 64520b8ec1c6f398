// How exact parts come out: moulded rubber, machined metal, printed plastic, and hands. All lengths in metres.
//
// ISO 3302-1, Rubber: tolerances for products, moulded rubber (three independent trade tables agree; the standard
// itself was not read). ISO 2768-1, General tolerances, 1989 (several trade tables; the coarse row for the
// smallest sizes deviates in one of them: read the standard before quoting it). Printing: rules of hobby and
// service makers.

import { check } from '../check.js'

export type RubberClass = 'M1' | 'M2' | 'M3' | 'M4'

/** Over the size of the row before, up to `toMm`: +- mm, fixed in the mould and across its closure. */
const mouldedRubber: readonly ({ readonly toMm: number } & {
  readonly [grade in RubberClass]: readonly [fixedMm: number, closureMm: number]
})[] = [
  { toMm: 4, M1: [0.08, 0.1], M2: [0.1, 0.15], M3: [0.25, 0.4], M4: [0.5, 0.5] },
  { toMm: 6.3, M1: [0.1, 0.12], M2: [0.15, 0.2], M3: [0.25, 0.4], M4: [0.5, 0.5] },
  { toMm: 10, M1: [0.1, 0.15], M2: [0.2, 0.2], M3: [0.3, 0.5], M4: [0.7, 0.7] },
  { toMm: 16, M1: [0.15, 0.2], M2: [0.2, 0.25], M3: [0.4, 0.6], M4: [0.8, 0.8] },
  { toMm: 25, M1: [0.2, 0.2], M2: [0.25, 0.35], M3: [0.5, 0.8], M4: [1, 1] },
  { toMm: 40, M1: [0.2, 0.25], M2: [0.35, 0.4], M3: [0.6, 1], M4: [1.3, 1.3] },
  { toMm: 63, M1: [0.25, 0.35], M2: [0.4, 0.5], M3: [0.8, 1.3], M4: [1.6, 1.6] },
  { toMm: 100, M1: [0.35, 0.4], M2: [0.5, 0.7], M3: [1, 1.6], M4: [2, 2] },
  { toMm: 160, M1: [0.4, 0.5], M2: [0.7, 0.8], M3: [1.3, 2], M4: [2.5, 2.5] },
]
/** Beyond 160 mm, as a share of the size. */
const mouldedRubberShare: { readonly [grade in RubberClass]: readonly [fixed: number, closure: number] } = {
  M1: [0.003, 0.004],
  M2: [0.005, 0.007],
  M3: [0.008, 0.013],
  M4: [0.015, 0.015],
}

/**
 * +- m for a dimension of moulded rubber; M3 is the ordinary class. `across`: 'fixed' within one half of the mould,
 * 'closure' over its parting line.
 */
export function mouldedRubberToleranceM(
  sizeM: number,
  grade: RubberClass = 'M3',
  across: 'fixed' | 'closure' = 'fixed',
): number {
  check(sizeM > 0, 'a dimension is positive')
  const column = across === 'fixed' ? 0 : 1
  const row = mouldedRubber.find(({ toMm }) => sizeM * 1000 <= toMm * (1 + 1e-12))
  return row ? row[grade][column] / 1000 : sizeM * mouldedRubberShare[grade][column]
}

export type GeneralClass = 'fine' | 'medium' | 'coarse'

const generalTolerances: readonly ({ readonly toMm: number } & {
  readonly [grade in GeneralClass]: number
})[] = [
  { toMm: 3, fine: 0.05, medium: 0.1, coarse: 0.2 },
  { toMm: 6, fine: 0.05, medium: 0.1, coarse: 0.3 },
  { toMm: 30, fine: 0.1, medium: 0.2, coarse: 0.5 },
  { toMm: 120, fine: 0.15, medium: 0.3, coarse: 0.8 },
  { toMm: 400, fine: 0.2, medium: 0.5, coarse: 1.2 },
  { toMm: 1000, fine: 0.3, medium: 0.8, coarse: 2 },
  { toMm: 2000, fine: 0.5, medium: 1.2, coarse: 3 },
]

/**
 * +- m for a machined or cut length of 0.5 mm to 2 m without a tolerance of its own (ISO 2768-1); nothing outside
 * these sizes, where a tolerance must be written.
 */
export function generalToleranceM(sizeM: number, grade: GeneralClass = 'medium'): number | undefined {
  if (!(sizeM * 1000 >= 0.5)) return undefined
  const row = generalTolerances.find(({ toMm }) => sizeM * 1000 <= toMm * (1 + 1e-12))
  return row ? row[grade] / 1000 : undefined
}

/** +- m for a printed dimension: 0.5 % and at least 0.5 mm; on a calibrated machine 0.2 mm, 0.3 % from 100 mm. */
export function printedToleranceM(sizeM: number, isCalibrated = false): number {
  check(sizeM > 0, 'a dimension is positive')
  if (!isCalibrated) return Math.max(0.0005, 0.005 * sizeM)
  return sizeM < 0.1 ? 0.0002 : 0.003 * sizeM
}

/** Thinnest wall from a nozzle of 0.4 mm: two lines (rule of thumb, from memory). */
export const printedWallLeastM = 0.0008
/** Printed holes come out this much too narrow at most (rules of makers). */
export const printedHoleUndersizeM = 0.0003

/**
 * What hands place without aids: comfortable from 0.5 mm, unrealistic below 0.2 mm. Inferred from Riviere, Rader and
 * Khosla, Characteristics of hand motion of eye surgeons, 1997 (0.05 mm rms under magnification).
 */
export const handPlacementM = 0.0005
