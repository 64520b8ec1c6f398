// What a stiffness matrix (Voigt's order, engineering shear; homogenise.ts) says about a material: Young's modulus and
// Poisson's ratios along any axis, shear modulus, bulk modulus, anisotropy. Also for materials that do not resist some
// strain at all (mechanisms): moduli become 0, and a ratio that is not determined is undefined, never a wrong number.
// Formulas: Nye, Physical properties of crystals, 1957 (from memory).

import { refuse } from '../../shared/refusals.js'
import { factorise } from './semidefinite.js'

export type Stiffness = readonly (readonly number[])[]

const pairsByDimension: readonly (readonly (readonly [number, number])[])[] = [
  [[0, 0]],
  [
    [0, 0],
    [1, 1],
    [0, 1],
  ],
  [
    [0, 0],
    [1, 1],
    [2, 2],
    [1, 2],
    [0, 2],
    [0, 1],
  ],
]

/** The axes behind each place of Voigt's order. */
export function voigtPairs(dimensions: number): readonly (readonly [number, number])[] {
  return pairsByDimension[dimensions - 1]!
}

/** A direct stiffness below this part of the largest is rounding. */
const negligible = 1e-12

function dimensionsOf(stiffness: Stiffness): number {
  const dimensions = [1, 3, 6].indexOf(stiffness.length) + 1
  if (dimensions > 0 && stiffness.every((row) => row.length === stiffness.length)) return dimensions
  throw refuse('impossible-value', {
    detail: `found ${stiffness.length} rows, expected a square matrix of 1, 3 or 6.`,
    where: { field: 'stiffness' },
  })
}

export interface Uniaxial {
  /** Young's modulus along the axis, in the units of the stiffness. */
  readonly modulus: number
  /**
   * Poisson's ratios towards the axes in order, the axis itself left out: minus lateral strain over axial strain, all
   * other stresses zero. Undefined where nothing determines the lateral strain.
   */
  readonly poisson: readonly (number | undefined)[]
}

/** Pull along one axis of the matrix (0, 1, 2), everything else free. */
export function uniaxial(stiffness: Stiffness, axis: number): Uniaxial {
  const dimensions = dimensionsOf(stiffness)
  const others = stiffness.map((_, i) => i).filter((i) => i !== axis)
  const largest = stiffness.reduce((most, row, i) => Math.max(most, row[i]!), 0)
  const kept = others.filter((i) => stiffness[i]![i]! > negligible * largest)
  const block = (of: readonly number[]) =>
    Float64Array.from(of.flatMap((i) => of.map((j) => stiffness[i]![j]!)))
  const solver = factorise(block(kept), kept.length)
  const strains = solver.solve(kept.map((i) => -stiffness[i]![axis]!))
  let modulus = stiffness[axis]![axis]!
  for (const [k, i] of kept.entries()) modulus += stiffness[axis]![i]! * strains[k]!
  const poisson = others
    .filter((i) => i < dimensions)
    .map((i) => {
      const k = kept.indexOf(i)
      if (k < 0) return undefined
      // Determined only when holding this strain takes something away that the others cannot give.
      const without = kept.filter((j) => j !== i)
      if (factorise(block(without), without.length).rank === solver.rank) return undefined
      return -strains[k]! + 0
    })
  return { modulus: modulus > negligible * largest ? modulus : 0, poisson }
}

/**
 * The same material in axes turned by a rotation matrix, row by row the new axes in the old ones:
 * C'_ijkl = sum of r_ia r_jb r_kc r_ld C_abcd.
 */
export function turnedStiffness(stiffness: Stiffness, rows: readonly (readonly number[])[]): number[][] {
  const pairs = voigtPairs(dimensionsOf(stiffness))
  // A unit strain in the new axes, seen in the old ones: e_ab = sum of r_ia r_jb e'_ij, where a unit of engineering
  // shear is half a unit of e'_ij and of e'_ji each.
  const old = pairs.map(([i, j]) =>
    pairs.map(([a, b]) => {
      const strain = (rows[i]![a]! * rows[j]![b]! + rows[j]![a]! * rows[i]![b]!) / 2
      return a === b ? strain : 2 * strain
    }),
  )
  return pairs.map((_, v) =>
    pairs.map((_, w) => {
      let sum = 0
      for (const [p, row] of stiffness.entries()) {
        for (const [q, c] of row.entries()) sum += old[v]![p]! * c * old[w]![q]!
      }
      return sum
    }),
  )
}

export interface PlaneConstants {
  readonly C11: number
  readonly C22: number
  readonly C12: number
  readonly C66: number
  readonly E1: number
  readonly E2: number
  /** Pull along 1, answer along 2. */
  readonly nu12: number | undefined
  readonly nu21: number | undefined
  /** Shear modulus with all other stresses zero. */
  readonly G12: number
  /** Mean stress over change of area, both strains equal: (C11 + C22 + 2 C12) / 4. */
  readonly areaModulus: number
  /** 2 C66 / (C11 - C12), 1 for isotropic sheets; undefined when C11 = C12. */
  readonly zener: number | undefined
}

/** The constants of a sheet, N/m, from its 3 x 3 stiffness. */
export function planeConstants(stiffness: Stiffness): PlaneConstants {
  if (dimensionsOf(stiffness) !== 2) {
    throw refuse('impossible-value', {
      detail: `found ${stiffness.length} rows, expected the 3 of a sheet.`,
      where: { field: 'stiffness' },
    })
  }
  const [C11, C12] = stiffness[0]! as [number, number]
  const C22 = stiffness[1]![1]!
  const C66 = stiffness[2]![2]!
  const one = uniaxial(stiffness, 0)
  const two = uniaxial(stiffness, 1)
  return {
    C11,
    C22,
    C12,
    C66,
    E1: one.modulus,
    E2: two.modulus,
    nu12: one.poisson[0],
    nu21: two.poisson[0],
    G12: uniaxial(stiffness, 2).modulus,
    areaModulus: (C11 + C22 + 2 * C12) / 4,
    zener: C11 === C12 ? undefined : (2 * C66) / (C11 - C12),
  }
}

/** Rotation of the axes of a sheet by an angle whose cosine and sine are given. */
export function planeRotation(cosine: number, sine: number): number[][] {
  return [
    [cosine, sine],
    [-sine, cosine],
  ]
}
