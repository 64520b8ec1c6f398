// Equilibrium of a framework: one linear solve, or Newton's method at large displacements. Unknowns that are held have
// given values; the others find theirs. No clock, no randomness: the same bits everywhere.

import { adderInto, assemble, firstColumns } from './assemble.js'
import type { Framework } from './build.js'
import { type Envelope, envelope, factorise, solveFactorised } from './envelope.js'

export interface Situation {
  readonly framework: Framework
  /** 1 where the unknown is held. */
  readonly held: Uint8Array
  /** Values of all unknowns: the state. */
  readonly u: Float64Array
  /** Outside loads on the unknowns (N, N m). */
  readonly loads: Float64Array
}

export interface Balance {
  readonly iterations: number
  /** Unstable directions: negative pivots of the last tangent. */
  readonly unstable: number
}
export interface NoBalance {
  readonly reason: string
}

/** A framework at rest with these unknowns held. */
export function situationOf(framework: Framework, heldUnknowns: readonly number[]): Situation {
  const held = new Uint8Array(framework.unknownCount)
  for (const i of heldUnknowns) held[i] = 1
  const u = new Float64Array(framework.unknownCount)
  return { framework, held, u, loads: new Float64Array(framework.unknownCount) }
}

interface Equations {
  readonly equation: Int32Array
  readonly matrix: Envelope
  readonly rest: Float64Array
  readonly forces: Float64Array
}

function equationsOf({ framework, held }: Situation): Equations {
  const equation = new Int32Array(framework.unknownCount).fill(-1)
  let size = 0
  for (let i = 0; i < equation.length; i++) if (!held[i]) equation[i] = size++
  return {
    equation,
    matrix: envelope(firstColumns(framework, equation, size)),
    rest: new Float64Array(size),
    forces: new Float64Array(equation.length),
  }
}

/** Tangent at the present state, factorised; `rest` becomes the correction that balances loads and increments. */
function correct(situation: Situation, equations: Equations, increments?: Float64Array) {
  const { framework, u, loads, held } = situation
  const { equation, matrix, rest, forces } = equations
  matrix.values.fill(0)
  forces.fill(0)
  rest.fill(0)
  const add = adderInto(matrix, equation)
  assemble(
    framework,
    u,
    forces,
    increments
      ? (i, j, value) => {
          add(i, j, value)
          const row = equation[i]!
          if (row >= 0 && held[j]) rest[row] = rest[row]! - value * increments[j]!
        }
      : add,
  )
  for (let i = 0; i < equation.length; i++) {
    const row = equation[i]!
    if (row >= 0) rest[row] = rest[row]! + loads[i]! - forces[i]!
  }
  const inertia = factorise(matrix)
  if (inertia.lost < 0) solveFactorised(matrix, rest)
  return inertia
}

/**
 * Displacements by linear theory (forces and stiffness of the undeformed framework), for the loads and for `given`
 * values of held unknowns. Throws nothing: a framework that can move freely gives the reason.
 */
export function linearResponse(situation: Situation, given?: Float64Array): Float64Array | NoBalance {
  const equations = equationsOf(situation)
  const rest = { ...situation, u: new Float64Array(situation.u.length) }
  const { lost } = correct(rest, equations, given)
  if (lost >= 0) return { reason: `the framework can move freely (unknown ${unknownOf(equations, lost)})` }
  return rest.u.map((_, i) => {
    const row = equations.equation[i]!
    return row >= 0 ? equations.rest[row]! : (given?.[i] ?? 0)
  })
}

function unknownOf({ equation }: Equations, row: number): number {
  return equation.indexOf(row)
}

const iterationsMost = 30
/** Corrections below this (relative to the framework's size; rad) end the iteration, which then is at round-off. */
const correctionLeast = 1e-10
/** A correction this large (relative to its size; rad) has left the path. */
const correctionMost = 1

/**
 * Moves the held unknowns by `increments` (none when absent) and finds equilibrium with the loads by Newton's method,
 * changing `u` in place. On failure `u` is as it was, and the reason says what happened.
 */
export function equilibrate(situation: Situation, increments?: Float64Array): Balance | NoBalance {
  const { framework, u, held } = situation
  const equations = equationsOf(situation)
  const before = Float64Array.from(u)
  const fail = (reason: string): NoBalance => {
    u.set(before)
    return { reason }
  }
  for (let iteration = 1; iteration <= iterationsMost; iteration++) {
    const moved = iteration === 1 ? increments : undefined
    const inertia = correct(situation, equations, moved)
    if (inertia.lost >= 0) return fail('the framework has lost its stiffness')
    let largest = 0
    for (let i = 0; i < u.length; i++) {
      const row = equations.equation[i]!
      const change = row >= 0 ? equations.rest[row]! : held[i] && moved ? moved[i]! : 0
      u[i] = u[i]! + change
      if (row >= 0) largest = Math.max(largest, Math.abs(change) / sizeOf(framework, i))
    }
    if (!(largest < correctionMost)) return fail('no equilibrium near by')
    if (largest < correctionLeast && iteration > 1) {
      return { iterations: iteration, unstable: inertia.negative }
    }
  }
  return fail('no equilibrium found')
}

/** What a correction of unknown i is measured against: the framework's size for displacements, 1 for rotations and strains. */
function sizeOf({ nodeUnknown, meanStrain, sizeM }: Framework, i: number): number {
  if (meanStrain >= 0 && i >= meanStrain) return 1
  let low = 0
  let high = nodeUnknown.length - 1
  while (low < high) {
    const middle = (low + high + 1) >> 1
    if (nodeUnknown[middle]! <= i) low = middle
    else high = middle - 1
  }
  return i - nodeUnknown[low]! < 2 ? sizeM : 1
}

/** Forces that the bars exert on the unknowns at the present state: reactions where they are held (N, N m). */
export function forcesOf({ framework, u }: Situation): Float64Array {
  const forces = new Float64Array(framework.unknownCount)
  assemble(framework, u, forces)
  return forces
}
