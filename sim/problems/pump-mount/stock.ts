// Classes of strut, rows of the workshop's stock. Rubber struts are moulded in one piece with their joints; bows are
// half circles bent of spring-steel strip, pulled and pushed along the chord between their ends.

import { mouldedWalls, springStrips, stockRow } from '../../../shared/making/stock.js'
import type { StockRow } from '../../../shared/making/types.js'
import { numbers } from './numbers.js'

export interface StrutClass {
  readonly name: string
  readonly kind: 'rubber' | 'bow'
  readonly row: StockRow
}

const rubber = (shoreA: number): StrutClass => ({
  name: `rubber ${shoreA} A`,
  kind: 'rubber',
  row: stockRow(mouldedWalls, `moulded silicone wall 2 mm, ${shoreA} A`),
})
const bow = (thickness: string): StrutClass => ({
  name: `bow ${thickness} mm`,
  kind: 'bow',
  row: stockRow(springStrips, `spring-steel strip 10 x ${thickness} mm`),
})

/** From soft to stiff: 2.9, 4.6 and 9.8 kN/m for rubber over 15 mm; 4.0, 7.0 and 16.6 kN/m for bows over 15 mm. */
export const strutClasses: readonly StrutClass[] = [
  rubber(20),
  rubber(30),
  rubber(50),

  bow('0.25'),
  bow('0.3'),
  bow('0.4'),
]

export interface StrutMake {
  readonly stiffnessNpm: number
  readonly massKg: number
  /** c / k of an ordinary compound. */
  readonly relaxationSeconds: number
  /** Largest |change of length| that it bears again and again, m. */
  readonly travelMostM: number
  /** What is cut: the wall's length, or the strip of a half circle. */
  readonly cutM: number
}

/**
 * A strut of `lengthM` between its joints. Rubber: E A / L. A half circle of strip, radius R = L / 2, pinned at its
 * ends and loaded along its chord: its ends come together by (pi / 2) F R^3 / (E I), so k = 2 E I / (pi R^3); the
 * largest bending moment is F R, at the crown (Castigliano's theorem; Young and Budynas, Roark's formulas for stress and
 * strain, 2002, from memory).
 */
export function makeOf({ kind, row }: StrutClass, lengthM: number): StrutMake {
  const { material, areaM2, wallM, widthM = 1 } = row
  const { relaxationSeconds } = material
  if (kind === 'rubber') {
    const area = areaM2 * numbers.depthM
    return {
      stiffnessNpm: (material.youngPa * area) / lengthM,
      massKg: material.densityKgpm3 * area * lengthM,
      relaxationSeconds,
      travelMostM: material.strainMost * lengthM,
      cutM: lengthM,
    }
  }
  const radius = lengthM / 2
  const bendingNm2 = (material.youngPa * widthM * wallM * wallM * wallM) / 12
  const stiffnessNpm = (2 * bendingNm2) / (Math.PI * radius * radius * radius)
  // Stress of a strip under a moment M: 6 M / (width thickness^2).
  const forceMostN = ((material.stressMostPa ?? 0) * widthM * wallM * wallM) / (6 * radius)
  const cutM = Math.PI * radius
  return {
    stiffnessNpm,
    massKg: material.densityKgpm3 * areaM2 * cutM,
    relaxationSeconds,
    travelMostM: forceMostN / stiffnessNpm,
    cutM,
  }
}
