// Steady answer of a linear model to a harmonic input, in the frequency domain:
//   (K - w^2 M + i w C) u = f   on the free coordinates,  f including -(K + i w C) times the motion of moved ones.
// Solved as one real system of twice the size with ml-matrix (LU with partial pivoting). All amplitudes are complex,
// u(t) = Re(u e^(iwt)). Source: direct frequency response, e.g. Meirovitch, Fundamentals of vibrations, 2001 (from memory).

import { LuDecomposition, Matrix } from 'ml-matrix'
import { atan2 } from '../../shared/detmath/inverse-trigonometry.js'
import { refuse } from '../../shared/refusals.js'
import type { LinearModel } from './linear-model.js'

export interface HarmonicInput {
  /** Amplitudes of forces on all coordinates, N; none when absent. */
  readonly forceN?: ArrayLike<number>
  /** Amplitudes of all coordinates, m, of which those of prescribed nodes count; 0 when absent. */
  readonly motionM?: ArrayLike<number>
}

/** Complex amplitudes of all coordinates, m. */
export interface Harmonic {
  readonly real: Float64Array
  readonly imaginary: Float64Array
}

/** Steady answer at one frequency. Refuses ('impossible-value') an undamped resonance, where there is none. */
export function harmonicResponse(model: LinearModel, frequencyHz: number, input: HarmonicInput): Harmonic {
  const { size, free, moved, massKg, dimensions, stiffness, damping } = model
  const w = 2 * Math.PI * frequencyHz
  const n = free.length
  const system = Matrix.zeros(2 * n, 2 * n)
  const right = Matrix.zeros(2 * n, 1)
  for (const [i, row] of free.entries()) {
    for (const [j, column] of free.entries()) {
      const inertia = row === column ? w * w * massKg[Math.floor(row / dimensions)]! : 0
      const straight = stiffness[row * size + column]! - inertia
      const turned = w * damping[row * size + column]!
      system.set(i, j, straight)
      system.set(n + i, n + j, straight)
      system.set(i, n + j, -turned)
      system.set(n + i, j, turned)
    }
    let real = input.forceN?.[row] ?? 0
    let imaginary = 0
    for (const column of moved) {
      const motion = input.motionM?.[column] ?? 0
      real -= stiffness[row * size + column]! * motion
      imaginary -= w * damping[row * size + column]! * motion
    }
    right.set(i, 0, real)
    right.set(n + i, 0, imaginary)
  }
  const answer = { real: new Float64Array(size), imaginary: new Float64Array(size) }
  for (const column of moved) answer.real[column] = input.motionM?.[column] ?? 0
  if (n === 0) return answer
  const factors = new LuDecomposition(system)
  if (factors.isSingular()) {
    throw refuse('impossible-value', {
      detail: `${frequencyHz} Hz is a resonance without damping, where no steady motion exists.`,
      where: { field: 'frequencyHz' },
    })
  }
  const solution = factors.solve(right)
  for (const [i, coordinate] of free.entries()) {
    answer.real[coordinate] = solution.get(i, 0)
    answer.imaginary[coordinate] = solution.get(n + i, 0)
  }
  return answer
}

/** Size of one coordinate's motion, m. */
export function amplitudeOf({ real, imaginary }: Harmonic, coordinate: number): number {
  const [x, y] = [real[coordinate]!, imaginary[coordinate]!]
  return Math.sqrt(x * x + y * y)
}

/** How far one coordinate's motion is ahead of the input, turns in (-1/2, 1/2]. */
export function phaseTurnsOf({ real, imaginary }: Harmonic, coordinate: number): number {
  return atan2(imaginary[coordinate]!, real[coordinate]!) / (2 * Math.PI)
}
