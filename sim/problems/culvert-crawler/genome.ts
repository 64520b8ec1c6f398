// What is evolved: a flexible truss between a lower and an upper chain of nodes, and how it is driven. Column i has
// a lower and an upper node; bay i lies between columns i and i + 1. Five places for struts belong to a column:
//
//      upper i ---- upper chord ---- upper i+1        post:     lower i   to upper i
//         |  \                    /     |             rising:   lower i   to upper i+1
//       post   falling     rising     (post of i+1)   falling:  upper i   to lower i+1
//         |  /                    \     |
//      lower i ---- lower chord ---- lower i+1        (the last column uses its post only)

import { choice, integer, layout, real } from '../../../shared/encodings.js'
import type { GenomeOf } from '../../../shared/genome.js'
import { numbers } from './numbers.js'

export const baysMost = 8
export const columnsMost = baysMost + 1
export const groups = 4

export const places = ['post', 'lower chord', 'upper chord', 'rising', 'falling'] as const
export const placesPerColumn = places.length
const post = 0
const rising = 3
const falling = 4

/** Kinds of strut; the first three are rubber of a stiffness class. */
export const kinds = ['soft', 'firm', 'hard', 'actuator', 'none'] as const
export const actuator = kinds.indexOf('actuator')
export const none = kinds.indexOf('none')
export const feet = ['bare', 'skid', 'pad', 'pad-reversed'] as const

export const crawlerGenome = {
  bays: integer({ low: 2, high: baysMost }),
  bayLength: real({ length: baysMost, low: 0.03, high: 0.08, unit: 'm' }),
  height: real({ length: columnsMost, low: 0.03, high: 0.08, unit: 'm' }),
  struts: layout({ size: [columnsMost, placesPerColumn], options: kinds }),
  group: layout({
    size: [columnsMost, placesPerColumn],
    options: ['group 1', 'group 2', 'group 3', 'group 4'],
  }),
  foot: choice({ length: columnsMost, options: feet }),
  amplitude: real({ length: groups, low: 0, high: numbers.strainMost, unit: 'strain' }),
  phase: real({ length: groups, low: 0, high: 1, unit: 'turn' }),
  frequency: real({ low: 0.4, high: 2.5, scale: 'log', unit: 'Hz' }),
} as const

export type CrawlerGenome = GenomeOf<typeof crawlerGenome>

/**
 * A truss that holds its shape: posts and chords are always there, and a bay has at least one diagonal. Missing
 * ones become soft struts. Pure and idempotent.
 */
export function repairCrawler(genome: CrawlerGenome): CrawlerGenome {
  const struts = Int32Array.from(genome.struts)
  for (let first = 0; first < struts.length; first += placesPerColumn) {
    for (let place = post; place < rising; place++) {
      if (struts[first + place] === none) struts[first + place] = 0
    }
    if (struts[first + rising] === none && struts[first + falling] === none) struts[first + rising] = 0
  }
  return { ...genome, struts }
}
