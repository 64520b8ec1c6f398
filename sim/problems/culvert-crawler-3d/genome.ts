// What is evolved: a truss of three chains, two on the floor and one above, and how it is driven. Column i has a left, a
// right and an upper node; a bay lies between two columns. Twelve places for struts belong to a column: three within
// it, three chords to the next one, and two diagonals in each of the three faces of the bay.

import { choice, integer, layout, real } from '../../../shared/encodings.js'
import type { GenomeOf } from '../../../shared/genome.js'
import { feet, groups, kinds, none } from '../culvert-crawler/genome.js'
import { numbers } from '../culvert-crawler/numbers.js'

export const baysMost = 6
export const columnsMost = baysMost + 1

/** Offsets of the two nodes from the column's left node; 3 and more lie in the next column. */
export const places = [
  { name: 'cross strut', a: 0, b: 1 },
  { name: 'left post', a: 0, b: 2 },
  { name: 'right post', a: 1, b: 2 },
  { name: 'left chord', a: 0, b: 3 },
  { name: 'right chord', a: 1, b: 4 },
  { name: 'upper chord', a: 2, b: 5 },
  { name: 'floor diagonal to the right', a: 0, b: 4 },
  { name: 'floor diagonal to the left', a: 1, b: 3 },
  { name: 'left rising', a: 0, b: 5 },
  { name: 'left falling', a: 2, b: 3 },
  { name: 'right rising', a: 1, b: 5 },
  { name: 'right falling', a: 2, b: 4 },
] as const
export const placesPerColumn = places.length
/** Places within the column: all that the last one uses. */
export const placesInColumn = 3
/** From here on two diagonals a face. */
const firstDiagonal = 6

export const crawler3dGenome = {
  bays: integer({ low: 2, high: baysMost }),
  bayLength: real({ length: baysMost, low: 0.03, high: 0.08, unit: 'm' }),
  height: real({ length: columnsMost, low: 0.03, high: 0.08, unit: 'm' }),
  width: real({ length: columnsMost, low: 0.03, high: 0.08, unit: 'm' }),
  struts: layout({ size: [columnsMost, placesPerColumn], options: kinds }),
  group: layout({
    size: [columnsMost, placesPerColumn],
    options: ['group 1', 'group 2', 'group 3', 'group 4'],
  }),
  /** Left and right foot of every column. */
  foot: choice({ length: 2 * columnsMost, options: feet }),
  amplitude: real({ length: groups, low: 0, high: numbers.strainMost, unit: 'strain' }),
  phase: real({ length: groups, low: 0, high: 1, unit: 'turn' }),
  frequency: real({ low: 0.4, high: 2.5, scale: 'log', unit: 'Hz' }),
} as const

export type Crawler3dGenome = GenomeOf<typeof crawler3dGenome>

/**
 * A truss that holds its shape: what lies within columns and the chords are always there, and every face of a bay keeps
 * a diagonal (3 n - 6 bars for n joints, Maxwell 1864). Missing ones become soft struts. Pure and idempotent.
 */
export function repairCrawler3d(genome: Crawler3dGenome): Crawler3dGenome {
  const struts = Int32Array.from(genome.struts)
  for (let first = 0; first < struts.length; first += placesPerColumn) {
    for (let place = 0; place < firstDiagonal; place++) {
      if (struts[first + place] === none) struts[first + place] = 0
    }
    for (let place = firstDiagonal; place < placesPerColumn; place += 2) {
      if (struts[first + place] === none && struts[first + place + 1] === none) struts[first + place] = 0
    }
  }
  return { ...genome, struts }
}
