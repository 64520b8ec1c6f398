// One bar: forces and tangent stiffness at any displacement, co-rotational (large displacements and rotations of the
// chord, small strain in the bar itself). Local deformations, with the chord's turn alpha taken off:
//   stretch  e = l - L          N = EA/L e
//   bends    t1 = turn a - alpha, t2 = turn b - alpha
//            M1 = EI/(L (1+p)) ((4+p) t1 + (2-p) t2), M2 alike,  p = 12 EI/(kappa G A L^2)
// With r = (-c, -s, 0, c, s, 0) = de/du, z = (s, -c, 0, -s, c, 0) (dalpha/du = z/l), c and s of the chord now:
//   forces   f = N r + M1 b1 + M2 b2,   b1 = (turn a) - z/l, b2 = (turn b) - z/l
//   tangent  K = sum of B^T D B + N z z^T / l + (M1 + M2)/l^2 (r z^T + z r^T)
// At rest this is the stiffness of linear theory, exact for Euler-Bernoulli and Timoshenko bars that carry no load
// between their ends. Source: M. A. Crisfield, Non-linear Finite Element Analysis of Solids and Structures, vol. 1,
// 1991, ch. 7 (from memory); the Timoshenko factors: J. S. Przemieniecki, Theory of Matrix Structural Analysis, 1968
// (from memory).

import { atan2 } from '../../shared/detmath/inverse-trigonometry.js'
import type { Bar } from './build.js'

/** Scratch of one bar: forces on its six unknowns and its tangent stiffness, row by row. */
export interface BarState {
  readonly forces: Float64Array
  readonly tangent: Float64Array
}

export function barState(): BarState {
  return { forces: new Float64Array(6), tangent: new Float64Array(36) }
}

// Their third and sixth entries stay 0.
const r = new Float64Array(6)
const z = new Float64Array(6)
const b1 = new Float64Array(6)
const b2 = new Float64Array(6)

/** Chord of the bar: bend at both ends (rad), stretch (m), and its direction and length now. */
export interface Chord {
  readonly lengthM: number
  readonly stretchM: number
  readonly cosine: number
  readonly sine: number
  readonly bendA: number
  readonly bendB: number
}

/** Deformation of a bar whose six unknowns have these values. */
export function chordOf({ alongM, lengthM: restM }: Bar, u: ArrayLike<number>): Chord {
  const dx = u[3]! - u[0]!
  const dy = u[4]! - u[1]!
  const x = alongM[0] + dx
  const y = alongM[1] + dy
  const lengthM = Math.sqrt(x * x + y * y)
  // l - L as (l^2 - L^2) / (l + L), so that small stretches keep their digits.
  const grown = dx * (2 * alongM[0] + dx) + dy * (2 * alongM[1] + dy)
  const alpha = atan2(alongM[0] * dy - alongM[1] * dx, alongM[0] * x + alongM[1] * y)
  return {
    lengthM,
    stretchM: grown / (lengthM + restM),
    cosine: x / lengthM,
    sine: y / lengthM,
    bendA: u[2]! - alpha,
    bendB: u[5]! - alpha,
  }
}

/** Fills `state` for the bar at these values of its unknowns (m, m, rad, m, m, rad). */
export function moveBar(bar: Bar, u: ArrayLike<number>, state: BarState): void {
  const { lengthM, stretchM, cosine, sine, bendA, bendB } = chordOf(bar, u)
  const k = bar.axialN / bar.lengthM
  const p = bar.shearRatio
  const base = bar.bendingNm2 / (bar.lengthM * (1 + p))
  const near = (4 + p) * base
  const far = (2 - p) * base
  const tension = k * stretchM
  const momentA = near * bendA + far * bendB
  const momentB = far * bendA + near * bendB
  r[0] = -cosine
  r[1] = -sine
  r[3] = cosine
  r[4] = sine
  z[0] = sine
  z[1] = -cosine
  z[3] = -sine
  z[4] = cosine
  const perLength = 1 / lengthM
  for (let i = 0; i < 6; i++) b1[i] = b2[i] = -z[i]! * perLength
  b1[2] = 1
  b2[5] = 1
  const { forces, tangent } = state
  const both = (momentA + momentB) * perLength * perLength
  const string = tension * perLength
  for (let i = 0; i < 6; i++) {
    forces[i] = tension * r[i]! + momentA * b1[i]! + momentB * b2[i]!
    const stretched = k * r[i]!
    const bentA = near * b1[i]! + far * b2[i]!
    const bentB = far * b1[i]! + near * b2[i]!
    for (let j = 0; j < 6; j++) {
      tangent[6 * i + j] =
        stretched * r[j]! +
        bentA * b1[j]! +
        bentB * b2[j]! +
        string * z[i]! * z[j]! +
        both * (r[i]! * z[j]! + z[i]! * r[j]!)
    }
  }
}
