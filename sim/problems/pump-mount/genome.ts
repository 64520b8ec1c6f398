// What is evolved: which struts of a grid are there and of what. The grid has `columns` by `levels` joints; those of
// level 0 stand on the pump's base plate, those of the top level carry the sensor's foot plate. Four places for struts
// belong to every joint above the base plate:
//
//        left ------- joint            upright: from the joint below
//                   / | \              leftward, rightward: from the joints below on either side
//        below left   |   below right  level: from the joint to the left; not on the top level, where the plate is

import { choice, layout, real } from '../../../shared/encodings.js'
import type { GenomeOf } from '../../../shared/genome.js'
import { strutClasses } from './stock.js'

export const columns = 5
export const levels = 4
export const places = ['upright', 'leftward', 'rightward', 'level'] as const
export const placesPerJoint = places.length
const upright = 0
const leftward = 1
const rightward = 2
const level = 3

const middle = (columns - 1) / 2

/** Option 0; option i is strutClasses[i - 1]. */
export const none = 0

/** Damping of the rubber, as a factor on that of ordinary silicone. */
export const compounds = { springy: 0.5, ordinary: 1, damping: 2, 'high-damping': 4 } as const
export const compoundNames = Object.keys(compounds) as readonly (keyof typeof compounds)[]

export const mountGenome = {
  struts: layout({
    size: [levels - 1, columns, placesPerJoint],
    options: ['none', ...strutClasses.map((row) => row.name)],
  }),
  compound: choice({ length: 1, options: compoundNames }),
  cellWidth: real({ low: 0.014, high: 0.026, unit: 'm' }),
  cellHeight: real({ low: 0.014, high: 0.026, unit: 'm' }),
} as const

export type MountGenome = GenomeOf<typeof mountGenome>

/** Joint number: level by level from the base, left to right. */
export const jointAt = (row: number, column: number): number => row * columns + column
/** Slot of a joint's place; rows from 1. */
export const slotAt = (row: number, column: number, place: number): number =>
  ((row - 1) * columns + column) * placesPerJoint + place

/** The joint at the other end of a place, or -1 outside the grid. */
export function otherEnd(row: number, column: number, place: number): number {
  const beside =
    place === level || place === leftward ? column - 1 : place === rightward ? column + 1 : column
  if (beside < 0 || beside >= columns) return -1
  return place === level ? jointAt(row, beside) : jointAt(row - 1, beside)
}

/**
 * A mount that holds together and carries: every joint hangs on at least two joints that are held already, taken level
 * by level and from left to right, and both ends and the middle of the top level are held. So the struts alone form a rigid framework
 * (each joint adds two bars to what stands; Henneberg's first step, from memory). Joints that hang on fewer go, with
 * their struts; below the ends and the middle of the top level what is missing is put in, of the class that is most frequent. Pure
 * and idempotent.
 */
export function repairMount(genome: MountGenome): MountGenome {
  const struts = Int32Array.from(genome.struts)
  const filler = mostFrequent(struts)
  clearOutside(struts)
  for (let column = 0; column < columns; column++) struts[slotAt(levels - 1, column, level)] = none
  for (const column of [0, middle, columns - 1]) hold(struts, levels - 1, column, filler)
  const held = heldJoints(struts)
  for (let row = 1; row < levels; row++) {
    for (let column = 0; column < columns; column++) {
      for (let place = 0; place < placesPerJoint; place++) {
        const other = otherEnd(row, column, place)
        if (other < 0) continue
        if (!held[jointAt(row, column)] || !held[other]) struts[slotAt(row, column, place)] = none
      }
    }
  }
  return { ...genome, struts }
}

function clearOutside(struts: Int32Array): void {
  for (let row = 1; row < levels; row++) {
    for (let column = 0; column < columns; column++) {
      for (let place = 0; place < placesPerJoint; place++) {
        if (otherEnd(row, column, place) < 0) struts[slotAt(row, column, place)] = none
      }
    }
  }
}

/** The class most struts have; of equals the first. Where there is none at all the stiffest rubber. */
function mostFrequent(struts: Int32Array): number {
  const counts = new Int32Array(strutClasses.length + 1)
  for (const option of struts) if (option !== none) counts[option]!++
  let best = 1 + strutClasses.findLastIndex(({ kind }) => kind === 'rubber')
  for (let option = 1; option < counts.length; option++) if (counts[option]! > counts[best]!) best = option
  return best
}

/** Puts in an upright and an inward strut below a joint that is not held, and holds the joints they stand on. */
function hold(struts: Int32Array, row: number, column: number, filler: number): void {
  if (heldJoints(struts)[jointAt(row, column)]) return
  for (const place of [upright, column < columns - 1 ? rightward : leftward]) {
    const slot = slotAt(row, column, place)
    if (struts[slot] === none) struts[slot] = filler
    hold(struts, row - 1, otherEnd(row, column, place) % columns, filler)
  }
}

/** 1 for every joint that is held. */
export function heldJoints(struts: Int32Array): Uint8Array {
  const held = new Uint8Array(levels * columns).fill(1, 0, columns)
  for (let row = 1; row < levels; row++) {
    for (let column = 0; column < columns; column++) {
      let count = 0
      for (let place = 0; place < placesPerJoint; place++) {
        const other = otherEnd(row, column, place)
        if (other >= 0 && held[other] && struts[slotAt(row, column, place)] !== none) count++
      }
      held[jointAt(row, column)] = count >= 2 ? 1 : 0
    }
  }
  return held
}
