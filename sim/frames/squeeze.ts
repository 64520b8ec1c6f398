// A periodic framework squeezed or pulled along one axis at finite strain, free to change across it: Newton's method
// over the cell's unknowns and its mean strains together, in small steps. The cell repeats itself at every strain;
// patterns longer than one cell are not seen.

import type { Framework } from './build.js'
import {
  type Balance,
  equilibrate,
  forcesOf,
  type NoBalance,
  type Situation,
  situationOf,
  unstableDirections,
} from './equilibrium.js'

export interface Squeezed {
  readonly situation: Situation
  /** Mean strains along the axis, across it, and tensor shear. */
  readonly along: number
  readonly across: number
  readonly shear: number
  /** Force along the axis over the undeformed area it acts on (nominal stress). */
  readonly stress: number
  /** Most unstable directions met on the way. */
  readonly unstable: number
}
export interface SqueezeFault extends NoBalance {
  /** Strain that was reached. */
  readonly along: number
}

export interface SqueezeOptions {
  /** Axis 0 is x, 1 is y. */
  readonly axis: 0 | 1
  /** Wanted strain along the axis; negative squeezes. */
  readonly strain: number
  /** Equal steps; halved up to 4 times where needed. */
  readonly steps: number
  /** Mean shear stays 0, as between plates that do not slide; free otherwise. */
  readonly holdShear?: boolean
  /**
   * Goes through stable states only, or ends with a fault. Held shear counts as free here: rows of cells may lean over
   * in turn, to the left and to the right, although the plates stay.
   */
  readonly stableOnly?: boolean
  /** Called after every step. */
  readonly each?: (state: Squeezed) => void
}

const halvingsMost = 4

/** Squeezes from rest. The framework must be periodic. */
export function squeeze(
  framework: Framework,
  { axis, strain, steps, holdShear = false, stableOnly = false, each }: SqueezeOptions,
): Squeezed | SqueezeFault {
  const m = framework.meanStrain
  const held = m + axis
  const first = framework.nodeUnknown[0]!
  const heldAlways = [first, first + 1, held]
  const situation = situationOf(framework, holdShear ? [...heldAlways, m + 2] : heldAlways)
  const leaning = { ...situationOf(framework, heldAlways), u: situation.u }
  const increments = new Float64Array(framework.unknownCount)
  let unstable = 0
  const read = (): Squeezed => ({
    situation,
    along: situation.u[held]!,
    across: situation.u[m + 1 - axis]!,
    shear: situation.u[m + 2]!,
    stress: forcesOf(situation)[held]! / framework.cellAreaM2,
    unstable,
  })
  for (let step = 1; step <= steps; step++) {
    const balance = moveTo(situation, increments, held, (strain * step) / steps, stableOnly)
    if ('reason' in balance) return { reason: balance.reason, along: situation.u[held]! }
    unstable = Math.max(unstable, balance.unstable)
    if (holdShear && stableOnly && unstableDirections(leaning) > 0) {
      return { reason: 'rows of cells lean over', along: situation.u[held]! }
    }
    each?.(read())
  }
  return read()
}

/**
 * One step, in smaller ones where there is no equilibrium near by, or no stable one: large steps can miss the branch that
 * bends gently aside.
 */
function moveTo(
  situation: Situation,
  increments: Float64Array,
  held: number,
  target: number,
  stableOnly: boolean,
): Balance | NoBalance {
  const { u } = situation
  let halvings = 0
  let pieces = 1
  let unstable = 0
  for (;;) {
    const before = Float64Array.from(u)
    increments[held] = (target - u[held]!) / pieces
    let balance = equilibrate(situation, increments)
    if (!('reason' in balance) && stableOnly && balance.unstable > 0) {
      u.set(before)
      balance = { reason: 'the framework snaps through' }
    }
    if ('reason' in balance) {
      if (++halvings > halvingsMost) return balance
      pieces *= 2
      continue
    }
    unstable = Math.max(unstable, balance.unstable)
    if (--pieces === 0) return { ...balance, unstable }
  }
}
