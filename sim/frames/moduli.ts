// Plane elasticity: the stiffness of a sheet as six numbers, and what engineers call them. Voigt notation with the
// engineering shear strain; s = C e, (s11, s22, s12), (e11, e22, 2 e12). Units are those of C: N/m for lattices of
// springs (a sheet of unit depth), Pa for walls of given thickness.

import { cos, sin } from '../../shared/detmath/trigonometry.js'

export interface PlaneStiffness {
  readonly c11: number
  readonly c22: number
  readonly c12: number
  readonly c66: number
  readonly c16: number
  readonly c26: number
}

export interface Moduli {
  readonly e1: number
  readonly e2: number
  /** -e2/e1 when pulled along 1. */
  readonly nu12: number
  /** -e1/e2 when pulled along 2. */
  readonly nu21: number
  readonly g12: number
}

/** Compliance, row by row (s11 s12 s16; s12 s22 s26; s16 s26 s66). Infinite or NaN where the sheet has no stiffness. */
export function complianceOf({ c11, c22, c12, c66, c16, c26 }: PlaneStiffness): Float64Array {
  const a = c22 * c66 - c26 * c26
  const b = c16 * c26 - c12 * c66
  const c = c12 * c26 - c16 * c22
  const det = c11 * a + c12 * b + c16 * c
  const d = c11 * c66 - c16 * c16
  const e = c12 * c16 - c11 * c26
  const f = c11 * c22 - c12 * c12
  return Float64Array.of(a, b, c, b, d, e, c, e, f).map((entry) => entry / det)
}

/**
 * Young's moduli, Poisson's ratios and shear modulus in the axes of C. Of a sheet without shear stiffness the other four
 * are still finite: they are then those of the normal strains alone.
 */
export function moduliOf(stiffness: PlaneStiffness): Moduli {
  const { c11, c22, c12, c66, c16, c26 } = stiffness
  const coupled = c16 !== 0 || c26 !== 0
  if (!coupled) {
    const det = c11 * c22 - c12 * c12
    return { e1: det / c22, e2: det / c11, nu12: c12 / c22, nu21: c12 / c11, g12: c66 }
  }
  const s = complianceOf(stiffness)
  return { e1: 1 / s[0]!, e2: 1 / s[4]!, nu12: -s[1]! / s[0]!, nu21: -s[1]! / s[4]!, g12: 1 / s[8]! }
}

/** The same sheet in axes turned by `radians` against the old ones. */
export function turned({ c11, c22, c12, c66, c16, c26 }: PlaneStiffness, radians: number): PlaneStiffness {
  const c = cos(radians)
  const s = sin(radians)
  // Strains in the old axes of unit strains in the new ones (columns): e = T e', C' = T^T C T.
  const t = [
    [c * c, s * s, -c * s],
    [s * s, c * c, c * s],
    [2 * c * s, -2 * c * s, c * c - s * s],
  ]
  const old = [
    [c11, c12, c16],
    [c12, c22, c26],
    [c16, c26, c66],
  ]
  const entry = (i: number, j: number) => {
    let sum = 0
    for (let p = 0; p < 3; p++) for (let q = 0; q < 3; q++) sum += t[p]![i]! * old[p]![q]! * t[q]![j]!
    return sum
  }
  return {
    c11: entry(0, 0),
    c22: entry(1, 1),
    c12: entry(0, 1),
    c66: entry(2, 2),
    c16: entry(0, 2),
    c26: entry(1, 2),
  }
}

/** The isotropic sheet that is nearest to this one (Frobenius norm of the tensors), and how far it is. */
export interface NearestIsotropic {
  readonly bulk: number
  readonly shear: number
  /** (K - G) / (K + G), in (-1, 1): the two-dimensional Poisson's ratio. */
  readonly poisson: number
  /** |C - C_iso| / |C|: 0 for an isotropic sheet, below 1 for any. */
  readonly anisotropy: number
}

/**
 * Projection onto isotropic tensors: 2K = C_iijj / 2, 4G = C_ijij - C_iijj / 2 (M. Moakher and A. N. Norris, The closest
 * elastic tensor of arbitrary symmetry to an elasticity tensor of lower symmetry, 2006; from memory, here in the plane).
 */
export function nearestIsotropic({ c11, c22, c12, c66, c16, c26 }: PlaneStiffness): NearestIsotropic {
  const bulk = (c11 + c22 + 2 * c12) / 4
  const shear = (c11 + c22 - 2 * c12 + 4 * c66) / 8
  const squared = c11 * c11 + c22 * c22 + 2 * c12 * c12 + 4 * c66 * c66 + 4 * c16 * c16 + 4 * c26 * c26
  // |C_iso|^2 = (2K)^2 + 2 (2G)^2: eigenvalue 2K once, 2G twice.
  const isotropic = 4 * bulk * bulk + 8 * shear * shear
  return {
    bulk,
    shear,
    poisson: (bulk - shear) / (bulk + shear),
    anisotropy: Math.sqrt(Math.max(0, squared - isotropic) / squared),
  }
}
