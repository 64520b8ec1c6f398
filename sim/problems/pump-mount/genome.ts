// What is evolved: which struts of a grid are there and of what. The grid has `columns` by `levels` joints; those of
// level 0 stand on the pump's base plate, those of the top level carry the sensor's foot plate. A mount is its own mirror
// image: the genome holds the outer columns of one side and the middle one. Four places for struts belong to every joint
// above the base plate:
//
//        joint ------- level          upright: from the joint below
//       /  |  \                       outward, inward: from the joints below on either side; of the middle column,
//      /   |   \                      outward is both
//  outward upright inward             level: to the joint beside it, inward; not on the top level, where the plate is

import { choice, layout, real } from '../../../shared/encodings.js'
import type { GenomeOf } from '../../../shared/genome.js'
import { strutClasses } from './stock.js'

export const columns = 5
export const levels = 4
export const places = ['upright', 'outward', 'inward', 'level'] as const
export type Place = (typeof places)[number]
/** The middle column; the genome holds this and those before it, from the outermost. */
export const middle = (columns - 1) / 2
export const ownColumns = middle + 1

/** Option 0; option i is strutClasses[i - 1]. */
export const none = 0

/** Damping of the rubber, as a factor on that of ordinary silicone. */
export const compounds = { springy: 0.5, ordinary: 1, damping: 2, 'high-damping': 4 } as const
export const compoundNames = Object.keys(compounds) as readonly (keyof typeof compounds)[]

export const mountGenome = {
  struts: layout({
    size: [levels - 1, ownColumns, places.length],
    options: ['none', ...strutClasses.map((row) => row.name)],
  }),
  compound: choice({ length: 1, options: compoundNames }),
  cellWidth: real({ low: 0.014, high: 0.026, unit: 'm' }),
  cellHeight: real({ low: 0.014, high: 0.026, unit: 'm' }),
} as const

export type MountGenome = GenomeOf<typeof mountGenome>

/** Joint number: level by level from the base, left to right. */
export const jointAt = (row: number, column: number): number => row * columns + column
/** Slot of a joint's place, of a joint on either side; rows from 1. */
export const slotAt = (row: number, column: number, place: Place): number =>
  ((row - 1) * ownColumns + Math.min(column, columns - 1 - column)) * places.length + places.indexOf(place)

/** The joints at the other end of a place's struts: none outside the grid, two for the outward struts of the middle. */
export function otherEnds(row: number, column: number, place: Place): readonly number[] {
  const inward = Math.sign(middle - column)
  const below = (to: number) => (to >= 0 && to < columns ? [jointAt(row - 1, to)] : [])
  if (place === 'upright') return below(column)
  if (place === 'outward') {
    return inward === 0 ? [...below(column - 1), ...below(column + 1)] : below(column - inward)
  }
  if (inward === 0) return []
  if (place === 'inward') return below(column + inward)
  return row === levels - 1 ? [] : [jointAt(row, column + inward)]
}

/**
 * A mount that holds together and carries: every joint hangs on at least two joints that are held already, taken level
 * by level and from the middle outward, and both ends and the middle of the top level are held. So the struts alone form
 * a rigid framework (each joint adds two bars to what stands; Henneberg's first step, from memory). Joints that hang on fewer
 * go, with their struts; below the ends and the middle of the top level what is missing is put in, of the class that is
 * most frequent. Pure and idempotent.
 */
export function repairMount(genome: MountGenome): MountGenome {
  const struts = Int32Array.from(genome.struts)
  const filler = mostFrequent(struts)
  const clear = (isIdle: (row: number, column: number, others: readonly number[]) => boolean) => {
    for (let row = 1; row < levels; row++) {
      for (let column = 0; column < ownColumns; column++) {
        for (const place of places) {
          if (isIdle(row, column, otherEnds(row, column, place))) struts[slotAt(row, column, place)] = none
        }
      }
    }
  }
  clear((_row, _column, others) => others.length === 0)
  for (const column of [0, middle]) hold(struts, levels - 1, column, filler)
  const held = heldJoints(struts)
  clear((row, column, others) => !held[jointAt(row, column)] || others.some((other) => !held[other]))
  return { ...genome, struts }
}

/** The class most struts have; of equals the first. Where there is none at all the stiffest rubber. */
function mostFrequent(struts: Int32Array): number {
  const counts = new Int32Array(strutClasses.length + 1)
  for (const option of struts) if (option !== none) counts[option]!++
  let best = 1 + strutClasses.findLastIndex(({ kind }) => kind === 'rubber')
  for (let option = 1; option < counts.length; option++) if (counts[option]! > counts[best]!) best = option
  return best
}

/** Puts in struts below a joint that is not held, upright and toward or from the middle, and holds what they stand on. */
function hold(struts: Int32Array, row: number, column: number, filler: number): void {
  if (heldJoints(struts)[jointAt(row, column)]) return
  for (const place of ['upright', column === middle ? 'outward' : 'inward'] as const) {
    const slot = slotAt(row, column, place)
    if (struts[slot] === none) struts[slot] = filler
    for (const other of otherEnds(row, column, place)) hold(struts, row - 1, other % columns, filler)
  }
}

/** Columns from the middle outward. */
const outward = Array.from({ length: columns }, (_, column) => column).sort(
  (a, b) => Math.abs(a - middle) - Math.abs(b - middle) || a - b,
)

/** 1 for every joint that is held. */
export function heldJoints(struts: Int32Array): Uint8Array {
  const held = new Uint8Array(levels * columns).fill(1, 0, columns)
  for (let row = 1; row < levels; row++) {
    for (const column of outward) {
      let count = 0
      for (const place of places) {
        if (struts[slotAt(row, column, place)] === none) continue
        for (const other of otherEnds(row, column, place)) count += held[other]!
      }
      held[jointAt(row, column)] = count >= 2 ? 1 : 0
    }
  }
  return held
}
