// Fresh sines for the drive of all lanes (../reference/drive.ts): the kernel turns its rotors by recurrence and takes
// these, computed here by detmath, at the steps at which the reference does.

import { cos, sin } from '../../../shared/detmath/trigonometry.js'
import { freshEverySteps, type Lattice } from '../layout.js'
import { phaseAt, turnAt } from '../reference/drive.js'
import { freshAt } from './header.js'
import { type Pen, putWord } from './pen.js'

/** Steps since the start of the drive at which some group of some lane ends its sweep, in order. */
export function sweepEnds(lanes: readonly Lattice[]): number[] {
  const ends = lanes.flatMap(({ sweepSteps }) => Array.from(sweepSteps)).filter((steps) => steps > 0)
  return [...new Set(ends)].sort((a, b) => a - b)
}

/** The first step after `since` that takes fresh sines. */
function nextFresh(since: number, ends: readonly number[]): number {
  const regular = since < 0 ? 0 : (Math.floor(since / freshEverySteps) + 1) * freshEverySteps
  for (const end of ends) if (end > since) return Math.min(end, regular)
  return regular
}

/**
 * Lays the next fresh sines ready; returns how many steps from `step` on may be done before this must be called again.
 */
export function prepareDrive(pen: Pen, step: number, ends: readonly number[]): number {
  const since = step - pen.lanes[0]!.driveStartStep
  const fresh = nextFresh(since, ends)
  putWord(pen, freshAt, fresh)
  writeFresh(pen, fresh)
  return nextFresh(fresh, ends) - 1 - since
}

function writeFresh(pen: Pen, since: number): void {
  const { lanes, places, sizes, variant, engine } = pen
  const width = lanes.length
  const regular = since % freshEverySteps === 0
  // Groups and lanes mostly turn alike.
  let known = Number.NaN
  let s = 0
  let c = 0
  for (let g = 0; g < lanes[0]!.groupCount; g++) {
    const first = (places.groups.first + g * sizes.group) / variant.numberBytes
    const put = (quantity: number, lane: number, value: number) => {
      engine.numbers[first + quantity * width + lane] = value
    }
    for (let lane = 0; lane < width; lane++) {
      const lattice = lanes[lane]!
      const sweep = lattice.sweepSteps[g]!
      const marked = regular || since === sweep
      put(13, lane, marked ? 1 : 0)
      if (!marked) continue
      const phase = phaseAt(lattice, g, since)
      if (phase !== known) {
        known = phase
        s = sin(phase)
        c = cos(phase)
      }
      put(8, lane, s)
      put(9, lane, c)
      const turn = sweep === 0 ? 0 : turnAt(lattice, g, since)
      put(10, lane, sweep === 0 ? lattice.rotation[2 * g]! : sin(turn))
      put(11, lane, sweep === 0 ? lattice.rotation[2 * g + 1]! : cos(turn))
    }
  }
}
