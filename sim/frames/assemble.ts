// From bars to equations: forces of all bars and hinges on the unknowns, and the tangent stiffness, at any state.

import { type BarState, barState, moveBar } from './bar.js'
import type { Bar, Framework } from './build.js'
import type { Envelope } from './envelope.js'

/** Where the stiffness of a pair of unknowns goes; called for every ordered pair (i, j) that a bar couples. */
export type Add = (i: number, j: number, value: number) => void

const placed = new Float64Array(6)

/** Values of the bar's six unknowns; end b carries the mean strain times its shift. */
export function placeBar({ unknowns, shiftM }: Bar, meanStrain: number, u: ArrayLike<number>): Float64Array {
  for (let i = 0; i < 6; i++) placed[i] = unknowns[i]! < 0 ? 0 : u[unknowns[i]!]!
  if (meanStrain >= 0 && (shiftM[0] !== 0 || shiftM[1] !== 0)) {
    const e11 = u[meanStrain]!
    const e22 = u[meanStrain + 1]!
    const e12 = u[meanStrain + 2]!
    placed[3] = placed[3]! + e11 * shiftM[0] + e12 * shiftM[1]
    placed[4] = placed[4]! + e12 * shiftM[0] + e22 * shiftM[1]
  }
  return placed
}

const state: BarState = barState()

/**
 * Adds the forces that the unknowns `u` call for to `forces` (the gradient of the elastic energy: N, N m, and N m for
 * mean strains), and the tangent stiffness through `add`.
 */
export function assemble(framework: Framework, u: ArrayLike<number>, forces: Float64Array, add?: Add): void {
  const { bars, hinges, meanStrain } = framework
  for (const bar of bars) {
    moveBar(bar, placeBar(bar, meanStrain, u), state)
    addForces(bar, meanStrain, forces)
    if (add) addTangent(bar, meanStrain, add)
  }
  for (const { unknowns, stiffnessNmprad: k } of hinges) {
    const [p, q] = unknowns
    const moment = k * (u[p]! - u[q]!)
    forces[p] = forces[p]! + moment
    forces[q] = forces[q]! - moment
    if (add) {
      add(p, p, k)
      add(q, q, k)
      add(p, q, -k)
      add(q, p, -k)
    }
  }
}

function addForces({ unknowns, shiftM }: Bar, meanStrain: number, forces: Float64Array): void {
  const f = state.forces
  for (let i = 0; i < 6; i++) {
    const at = unknowns[i]!
    if (at >= 0) forces[at] = forces[at]! + f[i]!
  }
  const [rx, ry] = shiftM
  if (meanStrain < 0 || (rx === 0 && ry === 0)) return
  forces[meanStrain] = forces[meanStrain]! + f[3]! * rx
  forces[meanStrain + 1] = forces[meanStrain + 1]! + f[4]! * ry
  forces[meanStrain + 2] = forces[meanStrain + 2]! + f[3]! * ry + f[4]! * rx
}

function addTangent({ unknowns, shiftM }: Bar, meanStrain: number, add: Add): void {
  const k = state.tangent
  for (let i = 0; i < 6; i++) {
    if (unknowns[i]! < 0) continue
    for (let j = 0; j < 6; j++) if (unknowns[j]! >= 0) add(unknowns[i]!, unknowns[j]!, k[6 * i + j]!)
  }
  const [rx, ry] = shiftM
  if (meanStrain < 0 || (rx === 0 && ry === 0)) return
  // Columns of the map from mean strains to the displacement of end b: e11 (rx, 0), e22 (0, ry), e12 (ry, rx).
  const ofX = [rx, 0, ry] as const
  const ofY = [0, ry, rx] as const
  for (let m = 0; m < 3; m++) {
    for (let i = 0; i < 6; i++) {
      if (unknowns[i]! < 0) continue
      const value = k[6 * i + 3]! * ofX[m]! + k[6 * i + 4]! * ofY[m]!
      add(unknowns[i]!, meanStrain + m, value)
      add(meanStrain + m, unknowns[i]!, value)
    }
    for (let n = 0; n < 3; n++) {
      const across = k[21]! * ofX[n]! + k[22]! * ofY[n]!
      const up = k[27]! * ofX[n]! + k[28]! * ofY[n]!
      add(meanStrain + m, meanStrain + n, ofX[m]! * across + ofY[m]! * up)
    }
  }
}

/** First column of every row among the unknowns that have an equation (`equation` >= 0), for an envelope. */
export function firstColumns(framework: Framework, equation: Int32Array, size: number): Int32Array {
  const first = Int32Array.from({ length: size }, (_, i) => i)
  const { meanStrain } = framework
  const couple = (group: readonly number[]) => {
    const rows = group.map((i) => (i < 0 ? -1 : equation[i]!)).filter((row) => row >= 0)
    const least = rows.reduce((a, b) => Math.min(a, b), size)
    for (const row of rows) first[row] = Math.min(first[row]!, least)
  }
  for (const bar of framework.bars) couple(bar.unknowns)
  for (const hinge of framework.hinges) couple(hinge.unknowns)
  if (meanStrain >= 0) {
    for (let m = 0; m < 3; m++) if (equation[meanStrain + m]! >= 0) first[equation[meanStrain + m]!] = 0
  }
  return first
}

/** Adds into an envelope; unknowns without equation are left out. */
export function adderInto(matrix: Envelope, equation: Int32Array): Add {
  return (i, j, value) => {
    const row = equation[i]!
    const column = equation[j]!
    if (row < 0 || column < 0 || column > row) return
    const at = matrix.base[row]! + column
    matrix.values[at] = matrix.values[at]! + value
  }
}
