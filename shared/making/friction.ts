// Friction of what the machines touch: ranges, because that is what is known. Rubber's coefficient also falls with
// load (adhesion: Persson, 2016; Maegawa, 2015: abstracts), which Coulomb's law leaves out.

import type { Source } from './types.js'

export interface FrictionRow {
  readonly pair: string
  readonly low: number
  readonly high: number
  readonly source: Source
}

export const frictionRows: readonly FrictionRow[] = [
  {
    pair: 'silicone rubber on smooth solids',
    low: 0.25,
    high: 1,
    source: 'trade pages, weak: 0.25 to 0.75 and more, often about 1 untreated',
  },
  {
    pair: 'medical tapes',
    low: 0.36,
    high: 0.63,
    source: 'a published table of static friction (PMC4808115)',
  },
  {
    pair: 'sandpaper',
    low: 0.73,
    high: 1.17,
    source: 'a published table of static friction (PMC4808115)',
  },
  {
    pair: 'rubber on wet concrete and pipe walls',
    low: 0.3,
    high: 1,
    source: 'trade tables, wide scatter, from memory',
  },
]

/** What rubber feet should be tried over, so that a search does not rely on one number (common practice, no source). */
export const rubberFriction = { low: 0.3, high: 1.2 } as const
