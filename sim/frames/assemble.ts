// From bars to equations: forces of all bars and hinges on the unknowns, and the tangent stiffness, at any state.

import { type BarState, barState, moveBar } from './bar.js'
import type { Bar, Framework } from './build.js'
import type { Envelope } from './envelope.js'

/**
 * Where the stiffness of a bar or hinge goes: called once for each with the nine unknowns that it couples (ax, ay, turn a,
 * bx, by, turn b, three mean strains; -1 where there is none) and the 9 x 9 block, row by row. Both are used again.
 */
export type AddBlock = (unknowns: Int32Array, block: Float64Array) => void

/** Unknowns of a block. */
export const blockSize = 9

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
const names = new Int32Array(blockSize)
const block = new Float64Array(blockSize * blockSize)

/**
 * Adds the forces that the unknowns `u` call for to `forces` (the gradient of the elastic energy: N, N m, and N m for
 * mean strains), and hands the tangent stiffness to `add`, bar by bar.
 */
export function assemble(
  framework: Framework,
  u: ArrayLike<number>,
  forces: Float64Array,
  add?: AddBlock,
): void {
  const { bars, hinges, meanStrain } = framework
  for (const bar of bars) {
    moveBar(bar, placeBar(bar, meanStrain, u), state)
    addForces(bar, meanStrain, forces)
    if (add) {
      fillBlock(bar, meanStrain)
      add(names, block)
    }
  }
  for (const { unknowns, stiffnessNmprad: k } of hinges) {
    const [p, q] = unknowns
    const moment = k * (u[p]! - u[q]!)
    forces[p] = forces[p]! + moment
    forces[q] = forces[q]! - moment
    if (add) {
      names.fill(-1)
      names[0] = p
      names[1] = q
      block[0] = block[blockSize + 1] = k
      block[1] = block[blockSize] = -k
      add(names, block)
    }
  }
}

/** As a full matrix, row by row. */
export function addInto(matrix: Float64Array, size: number): AddBlock {
  return (unknowns, values) => {
    for (let i = 0; i < blockSize; i++) {
      const row = unknowns[i]!
      if (row < 0) continue
      for (let j = 0; j < blockSize; j++) {
        const column = unknowns[j]!
        if (column < 0) continue
        const at = row * size + column
        matrix[at] = matrix[at]! + values[blockSize * i + j]!
      }
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

/**
 * The bar's 9 x 9 block. Columns of the map from mean strains to the displacement of end b: e11 (rx, 0), e22 (0, ry),
 * e12 (ry, rx).
 */
function fillBlock({ unknowns, shiftM }: Bar, meanStrain: number): void {
  const k = state.tangent
  for (let i = 0; i < 6; i++) {
    names[i] = unknowns[i]!
    for (let j = 0; j < 6; j++) block[blockSize * i + j] = k[6 * i + j]!
  }
  const [rx, ry] = shiftM
  if (meanStrain < 0 || (rx === 0 && ry === 0)) {
    names.fill(-1, 6)
    return
  }
  for (let m = 0; m < 3; m++) names[6 + m] = meanStrain + m
  for (let i = 0; i < 6; i++) {
    const x = k[6 * i + 3]!
    const y = k[6 * i + 4]!
    setBoth(i, 6, x * rx)
    setBoth(i, 7, y * ry)
    setBoth(i, 8, x * ry + y * rx)
  }
  const [xx, xy, yy] = [k[21]!, k[22]!, k[28]!]
  setBoth(6, 6, rx * rx * xx)
  setBoth(6, 7, rx * ry * xy)
  setBoth(6, 8, rx * (ry * xx + rx * xy))
  setBoth(7, 7, ry * ry * yy)
  setBoth(7, 8, ry * (ry * xy + rx * yy))
  setBoth(8, 8, ry * ry * xx + 2 * rx * ry * xy + rx * rx * yy)
}

function setBoth(i: number, j: number, value: number): void {
  block[blockSize * i + j] = value
  block[blockSize * j + i] = value
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

/** Into an envelope; unknowns without equation are left out. */
export function addIntoEnvelope({ base, values }: Envelope, equation: Int32Array): AddBlock {
  const rows = new Int32Array(blockSize)
  return (unknowns, block) => {
    for (let i = 0; i < blockSize; i++) rows[i] = unknowns[i]! < 0 ? -1 : equation[unknowns[i]!]!
    for (let i = 0; i < blockSize; i++) {
      const row = rows[i]!
      if (row < 0) continue
      const at = base[row]!
      for (let j = 0; j < blockSize; j++) {
        const column = rows[j]!
        if (column >= 0 && column <= row)
          values[at + column] = values[at + column]! + block[blockSize * i + j]!
      }
    }
  }
}
