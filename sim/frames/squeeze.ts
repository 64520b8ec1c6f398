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
  /** Equal steps; halved where Newton's method fails, up to 4 times. */
  readonly steps: number
  /** Ends with a fault at the first state that is not stable. */
  readonly stableOnly?: boolean
  /** Called after every step. */
  readonly each?: (state: Squeezed) => void
}

const halvingsMost = 4

/** Squeezes from rest. The framework must be periodic. */
export function squeeze(
  framework: Framework,
  { axis, strain, steps, stableOnly = false, each }: SqueezeOptions,
): Squeezed | SqueezeFault {
  const m = framework.meanStrain
  const held = m + axis
  const first = framework.nodeUnknown[0]!
  const situation = situationOf(framework, [first, first + 1, held])
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
    const balance = moveTo(situation, increments, held, (strain * step) / steps)
    if ('reason' in balance) return { reason: balance.reason, along: situation.u[held]! }
    unstable = Math.max(unstable, balance.unstable)
    if (stableOnly && unstable > 0) {
      return { reason: 'the framework snaps through', along: situation.u[held]! }
    }
    each?.(read())
  }
  return read()
}

function moveTo(
  situation: Situation,
  increments: Float64Array,
  held: number,
  target: number,
): Balance | NoBalance {
  let halvings = 0
  let pieces = 1
  for (;;) {
    const from = situation.u[held]!
    increments[held] = (target - from) / pieces
    const balance = equilibrate(situation, increments)
    if ('reason' in balance) {
      if (++halvings > halvingsMost) return balance
      pieces *= 2
    } else if (--pieces === 0) {
      return balance
    }
  }
}
