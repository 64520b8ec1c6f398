// Matrices for vibrations and buckling of a framework at rest, full, row by row, over all its unknowns: stiffness,
// consistent and lumped mass, and the geometric stiffness of given axial forces. Shape functions of Timoshenko bars after
// Z. Friedman and J. B. Kosmatka, An improved two-node Timoshenko beam finite element, 1993 (from memory); with p = 0
// they are Hermite's and the matrices those of Euler-Bernoulli. Integrals by Gauss' rule with 4 points, exact here.

import { addInto, assemble } from './assemble.js'
import type { Bar, Framework } from './build.js'

/** Stiffness of the undeformed framework. */
export function stiffnessMatrix(framework: Framework): Float64Array {
  const n = framework.unknownCount
  const matrix = new Float64Array(n * n)
  assemble(framework, new Float64Array(n), new Float64Array(n), addInto(matrix, n))
  return matrix
}

/** Mass matrix that belongs to the bars' own shapes (kg, kg m, kg m^2). */
export function consistentMass(framework: Framework): Float64Array {
  return overBars(framework, (bar, add) => {
    for (const { weight, xi } of points(bar)) {
      const axial = [1 - xi, 0, 0, xi, 0, 0]
      const across = shapeAcross(bar, xi)
      const turning = shapeTurn(bar, xi)
      for (let i = 0; i < 6; i++) {
        for (let j = 0; j < 6; j++) {
          const moved = axial[i]! * axial[j]! + across[i]! * across[j]!
          add(i, j, weight * (bar.massKgpm * moved + bar.rotaryKgm * turning[i]! * turning[j]!))
        }
      }
    }
  })
}

/** Half of every bar's mass at each of its nodes; rotations get none. */
export function lumpedMass(framework: Framework): Float64Array {
  return overBars(framework, (bar, add) => {
    for (const i of [0, 1, 3, 4]) add(i, i, (bar.massKgpm * bar.lengthM) / 2)
  })
}

/**
 * Geometric stiffness of axial forces that vary linearly along each bar; `tensionN(bar)` gives them at its ends a and b
 * (negative: thrust). Buckling: (K + s Kg) x = 0.
 */
export function geometricStiffness(
  framework: Framework,
  tensionN: (bar: number) => readonly [number, number],
): Float64Array {
  return overBars(framework, (bar, add, index) => {
    const [atA, atB] = tensionN(index)
    for (const { weight, xi } of points(bar)) {
      const slope = bar.bendingNm2 > 0 ? slopeAcross(bar, xi) : stringSlope(bar)
      const tension = atA + (atB - atA) * xi
      for (let i = 0; i < 6; i++) {
        for (let j = 0; j < 6; j++) add(i, j, weight * tension * slope[i]! * slope[j]!)
      }
    }
  })
}

type AddLocal = (i: number, j: number, value: number) => void

/** Sums the bars' local matrices (axes along and across the bar) into one, turned into x and y. */
function overBars(
  framework: Framework,
  fill: (bar: Bar, add: AddLocal, index: number) => void,
): Float64Array {
  const n = framework.unknownCount
  const matrix = new Float64Array(n * n)
  const local = new Float64Array(36)
  for (const [index, bar] of framework.bars.entries()) {
    local.fill(0)
    fill(bar, (i, j, value) => (local[6 * i + j] = local[6 * i + j]! + value), index)
    const c = bar.alongM[0] / bar.lengthM
    const s = bar.alongM[1] / bar.lengthM
    const turn = (columns: boolean) => {
      for (let line = 0; line < 6; line++) {
        for (const end of [0, 3]) {
          const p = columns ? 6 * line + end : 6 * end + line
          const q = columns ? p + 1 : p + 6
          const along = local[p]!
          const across = local[q]!
          local[p] = c * along - s * across
          local[q] = s * along + c * across
        }
      }
    }
    turn(true)
    turn(false)
    for (let i = 0; i < 6; i++) {
      for (let j = 0; j < 6; j++) {
        const row = bar.unknowns[i]!
        const column = bar.unknowns[j]!
        if (row >= 0 && column >= 0) matrix[row * n + column] = matrix[row * n + column]! + local[6 * i + j]!
      }
    }
  }
  return matrix
}

/** Gauss' rule with 4 points on (0, length): M. Abramowitz and I. Stegun, Handbook of mathematical functions, 1964, 25.4. */
const inner = Math.sqrt(3 / 7 - (2 / 7) * Math.sqrt(6 / 5))
const outer = Math.sqrt(3 / 7 + (2 / 7) * Math.sqrt(6 / 5))
const innerWeight = (18 + Math.sqrt(30)) / 36
const outerWeight = (18 - Math.sqrt(30)) / 36
const rule = [
  [-outer, outerWeight],
  [-inner, innerWeight],
  [inner, innerWeight],
  [outer, outerWeight],
] as const

function points({ lengthM }: Bar): { weight: number; xi: number }[] {
  return rule.map(([at, weight]) => ({ weight: (weight * lengthM) / 2, xi: (1 + at) / 2 }))
}

/** Displacement across the bar at xi = x / L, for unit values of its six unknowns. */
function shapeAcross({ lengthM, shearRatio: p, bendingNm2 }: Bar, xi: number): readonly number[] {
  if (bendingNm2 === 0) return [0, 1 - xi, 0, 0, xi, 0]
  const f = 1 / (1 + p)
  const x2 = xi * xi
  const x3 = x2 * xi
  return [
    0,
    f * (2 * x3 - 3 * x2 - p * xi + 1 + p),
    lengthM * f * (x3 - (2 + p / 2) * x2 + (1 + p / 2) * xi),
    0,
    -f * (2 * x3 - 3 * x2 - p * xi),
    lengthM * f * (x3 - (1 - p / 2) * x2 - (p / 2) * xi),
  ]
}

/** Its slope. */
function slopeAcross({ lengthM, shearRatio: p }: Bar, xi: number): readonly number[] {
  const f = 1 / (1 + p)
  const x2 = xi * xi
  return [
    0,
    (f * (6 * x2 - 6 * xi - p)) / lengthM,
    f * (3 * x2 - (4 + p) * xi + 1 + p / 2),
    0,
    (-f * (6 * x2 - 6 * xi - p)) / lengthM,
    f * (3 * x2 - (2 - p) * xi - p / 2),
  ]
}

const stringSlope = ({ lengthM }: Bar) => [0, -1 / lengthM, 0, 0, 1 / lengthM, 0]

/** Turn of the cross-section. */
function shapeTurn({ lengthM, shearRatio: p, bendingNm2 }: Bar, xi: number): readonly number[] {
  if (bendingNm2 === 0) return [0, 0, 0, 0, 0, 0]
  const f = 1 / (1 + p)
  const x2 = xi * xi
  const outerTerm = ((6 * f) / lengthM) * (x2 - xi)
  return [0, outerTerm, f * (3 * x2 - (4 + p) * xi + 1 + p), 0, -outerTerm, f * (3 * x2 - (2 - p) * xi)]
}
