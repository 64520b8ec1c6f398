// Equilibrium of a framework: one linear solve, or Newton's method at large displacements. Unknowns that are held have
// given values; the others find theirs. No clock, no randomness: the same bits everywhere.

import { type AddBlock, addIntoEnvelope, assemble, blockSize, firstColumns } from './assemble.js'
import type { Framework } from './build.js'
import { type Envelope, envelope, factorise, type Inertia, solveFactorised } from './envelope.js'

export interface Situation {
  readonly framework: Framework
  /** 1 where the unknown is held; fixed once the situation is made. */
  readonly held: Uint8Array
  readonly equations: Equations
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

/** Which equation belongs to which unknown, and room to solve them. */
interface Equations {
  readonly equation: Int32Array
  readonly matrix: Envelope
  readonly add: AddBlock
  readonly rest: Float64Array
  readonly forces: Float64Array
}

/** A framework at rest with these unknowns held. */
export function situationOf(framework: Framework, heldUnknowns: readonly number[]): Situation {
  const held = new Uint8Array(framework.unknownCount)
  for (const i of heldUnknowns) held[i] = 1
  const u = new Float64Array(framework.unknownCount)
  const loads = new Float64Array(framework.unknownCount)
  return { framework, held, equations: equationsOf(framework, held), u, loads }
}

function equationsOf(framework: Framework, held: Uint8Array): Equations {
  const equation = new Int32Array(framework.unknownCount).fill(-1)
  let size = 0
  for (let i = 0; i < equation.length; i++) if (!held[i]) equation[i] = size++
  const matrix = envelope(firstColumns(framework, equation, size))
  return {
    equation,
    matrix,
    add: addIntoEnvelope(matrix, equation),
    rest: new Float64Array(size),
    forces: new Float64Array(equation.length),
  }
}

/** Tangent at the present state, factorised; `rest` becomes the correction that balances loads and increments. */
function correct({ framework, u, loads, held, equations }: Situation, increments?: Float64Array): Inertia {
  const { equation, matrix, rest, forces, add } = equations
  matrix.values.fill(0)
  forces.fill(0)
  rest.fill(0)
  const alsoMoved: AddBlock = (unknowns, block) => {
    add(unknowns, block)
    for (let i = 0; i < blockSize; i++) {
      const row = unknowns[i]! < 0 ? -1 : equation[unknowns[i]!]!
      if (row < 0) continue
      for (let j = 0; j < blockSize; j++) {
        const other = unknowns[j]!
        if (other >= 0 && held[other])
          rest[row] = rest[row]! - block[blockSize * i + j]! * increments![other]!
      }
    }
  }
  assemble(framework, u, forces, increments ? alsoMoved : add)
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
  const { equation, rest } = situation.equations
  const undeformed = new Float64Array(situation.u.length)
  const { lost } = correct({ ...situation, u: undeformed }, given)
  if (lost >= 0) return { reason: `the framework can move freely (unknown ${equation.indexOf(lost)})` }
  return undeformed.map((_, i) => (equation[i]! >= 0 ? rest[equation[i]!]! : (given?.[i] ?? 0)))
}

const iterationsMost = 30
/**
 * Corrections below this (relative to the framework's size; rad) end the iteration: it converges quadratically, so that
 * after one of 1e-7 what is left is at round-off.
 */
const correctionLeast = 1e-7
/** A correction this large (relative to its size; rad) has left the path. */
const correctionMost = 1

/**
 * Moves the held unknowns by `increments` (none when absent) and finds equilibrium with the loads by Newton's method,
 * changing `u` in place. On failure `u` is as it was, and the reason says what happened.
 */
export function equilibrate(situation: Situation, increments?: Float64Array): Balance | NoBalance {
  const { framework, u, held, equations } = situation
  const { isDisplacement, sizeM } = framework
  const before = Float64Array.from(u)
  const fail = (reason: string): NoBalance => {
    u.set(before)
    return { reason }
  }
  for (let iteration = 1; iteration <= iterationsMost; iteration++) {
    const moved = iteration === 1 ? increments : undefined
    const inertia = correct(situation, moved)
    if (inertia.lost >= 0) return fail('the framework has lost its stiffness')
    let largest = 0
    for (let i = 0; i < u.length; i++) {
      const row = equations.equation[i]!
      const change = row >= 0 ? equations.rest[row]! : held[i] && moved ? moved[i]! : 0
      u[i] = u[i]! + change
      if (row >= 0) largest = Math.max(largest, Math.abs(change) / (isDisplacement[i] ? sizeM : 1))
    }
    if (!(largest < correctionMost)) return fail('no equilibrium near by')
    if (largest < correctionLeast && iteration > 1) {
      return { iterations: iteration, unstable: inertia.negative }
    }
  }
  return fail('no equilibrium found')
}

/** Unstable directions of the present state among the unknowns that are not held; infinite where stiffness is lost. */
export function unstableDirections(situation: Situation): number {
  const { negative, lost } = correct(situation)
  return lost >= 0 ? Number.POSITIVE_INFINITY : negative
}

/** Forces that the bars exert on the unknowns at the present state: reactions where they are held (N, N m). */
export function forcesOf({ framework, u }: Situation): Float64Array {
  const forces = new Float64Array(framework.unknownCount)
  assemble(framework, u, forces)
  return forces
}
