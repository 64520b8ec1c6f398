// Natural frequencies and mode shapes of a lattice: K v = w^2 M v, solved as the symmetric problem of the mass-scaled
// stiffness M^-1/2 K M^-1/2 with ml-matrix (Householder and QL; only + - * / and square root, so the same bits
// everywhere). Source of the method: e.g. Meirovitch, Fundamentals of vibrations, 2001 (from memory).
//
// Zero modes are the motions that nothing resists: rigid motions that the pins allow, and mechanisms.

import { EigenvalueDecomposition, Matrix } from 'ml-matrix'
import type { LatticeSpec } from '../lattice/spec.js'
import { type LinearModel, linearModel, part } from './linear-model.js'
import { countRigid } from './rigid-motions.js'

/**
 * w^2 of at most this part of the largest is zero: a mode a million times slower than the fastest. Rounding leaves
 * about 1e-16 times the number of coordinates.
 */
export const zeroModeBelow = 1e-12

export interface Mode {
  /** Angular frequency, rad/s; 0 for a zero mode. */
  readonly radps: number
  /** Growth rate, 1/s, where the state is unstable (radps is 0 then); else 0. */
  readonly growthPerSecond: number
  /** Damping ratio by the mode's own part of the damping, v'Cv / (2 w v'Mv); 0 for a zero mode. */
  readonly dampingRatio: number
  /**
   * All coordinates, node by node, x first; v'Mv = 1 kg m^2 for v in m. The largest component (the first of equals)
   * is positive.
   */
  readonly shape: Float64Array
}

export interface Modes {
  /** From the slowest to the fastest; unstable ones first. */
  readonly modes: readonly Mode[]
  readonly zeroModes: number
  /** Rigid motions that pins and paths allow: 3 of a free body in the plane, 6 in space. */
  readonly rigidModes: number
  /** Zero modes that are no rigid motions. */
  readonly mechanisms: number
  /** Modes in which the state given is unstable (buckled). */
  readonly unstableModes: number
}

/** Natural frequencies, shapes, damping ratios and mechanisms of a lattice about the positions of its description. */
export function naturalModes(spec: LatticeSpec | LinearModel): Modes {
  const model = 'stiffness' in spec ? spec : linearModel(spec)
  const { free, massKg, dimensions, size, stiffness } = model
  const rigidModes = countRigid(model, free)
  if (free.length === 0) return { modes: [], zeroModes: 0, rigidModes, mechanisms: 0, unstableModes: 0 }
  const perRootKg = free.map((coordinate) => 1 / Math.sqrt(massKg[Math.floor(coordinate / dimensions)]!))
  const scaled = Matrix.from1DArray(free.length, free.length, part(stiffness, size, free, free))
  for (let i = 0; i < free.length; i++) {
    for (let j = 0; j < free.length; j++) {
      scaled.set(i, j, scaled.get(i, j) * perRootKg[i]! * perRootKg[j]!)
    }
  }
  const { realEigenvalues: squares, eigenvectorMatrix: vectors } = new EigenvalueDecomposition(scaled, {
    assumeSymmetric: true,
  })
  const largest = squares.reduce((most, square) => Math.max(most, Math.abs(square)), 0)
  const order = squares.map((_, i) => i).sort((a, b) => squares[a]! - squares[b]! || a - b)
  const modes = order.map((column) => {
    const shape = new Float64Array(size)
    for (const [i, coordinate] of free.entries()) shape[coordinate] = vectors.get(i, column) * perRootKg[i]!
    return modeOf(model, squares[column]!, zeroModeBelow * largest, upright(shape))
  })
  const zeroModes = modes.filter((mode) => mode.radps === 0 && mode.growthPerSecond === 0).length
  return {
    modes,
    zeroModes,
    rigidModes,
    mechanisms: Math.max(0, zeroModes - rigidModes),
    unstableModes: modes.filter((mode) => mode.growthPerSecond > 0).length,
  }
}

function modeOf({ size, damping }: LinearModel, square: number, zero: number, shape: Float64Array): Mode {
  if (Math.abs(square) <= zero) return { radps: 0, growthPerSecond: 0, dampingRatio: 0, shape }
  if (square < 0) return { radps: 0, growthPerSecond: Math.sqrt(-square), dampingRatio: 0, shape }
  const radps = Math.sqrt(square)
  let damped = 0
  for (let i = 0; i < size; i++) {
    if (shape[i] === 0) continue
    for (let j = 0; j < size; j++) damped += shape[i]! * damping[i * size + j]! * shape[j]!
  }
  return { radps, growthPerSecond: 0, dampingRatio: damped / (2 * radps), shape }
}

/** Turned so that the largest component is positive. */
function upright(shape: Float64Array): Float64Array {
  let at = 0
  for (let i = 1; i < shape.length; i++) if (Math.abs(shape[i]!) > Math.abs(shape[at]!)) at = i
  return shape[at]! < 0 ? shape.map((x) => -x + 0) : shape
}
