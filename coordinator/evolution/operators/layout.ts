// Operators on layouts: they work on boxes of neighbouring slots, since what stands together works together.
// A box: for each axis an edge, uniform from 1 slot to the longest, then a place for it, uniform among those
// inside the lattice. Slots in the middle of a lattice lie in more boxes than its corners.

import { check } from '../../../shared/check.js'
import type { Encoding, LayoutEncoding } from '../../../shared/genome.js'
import type { Stream } from '../../../shared/streams.js'
import { choiceSetting, numberSetting } from '../settings.js'
import type { SettingRow } from '../types.js'
import { anotherValue, geneValuesOf } from './discrete.js'
import { type CrossoverRow, integersOf, type MutationRow } from './rows.js'

function layoutOf(encoding: Encoding): LayoutEncoding {
  check(encoding.kind === 'layout', 'the operator fits layouts')
  return encoding
}

function edgeRow(share: number): SettingRow {
  return {
    kind: 'number',
    default: share,
    low: 0,
    high: 1,
    help: 'longest edge of the box as a fraction of the lattice along that axis, at least 1 slot',
  }
}

/** Draws the slots of a random box, as ascending indices; `share` as in edgeRow. */
export function boxesOf(size: readonly number[], share: number): (stream: Stream) => number[] {
  const longest = size.map((edge) => Math.max(1, Math.floor(share * edge)))
  return (stream) => {
    let slots = [0]
    for (let axis = 0; axis < size.length; axis++) {
      const edge = 1 + stream.below(longest[axis]!)
      const start = stream.below(size[axis]! - edge + 1)
      const longer: number[] = []
      for (const slot of slots) for (let k = 0; k < edge; k++) longer.push(slot * size[axis]! + start + k)
      slots = longer
    }
    return slots
  }
}

export const patchCrossover: CrossoverRow = {
  name: 'patch',
  title: 'Patch exchange',
  summary: 'a random box of slots comes from the second parent',
  source: 'common practice, no source (two-point crossover, on a lattice)',
  encodings: ['layout'],
  settings: { edge: edgeRow(0.5) },
  build: (encoding, settings) => {
    const drawBox = boxesOf(layoutOf(encoding).size, numberSetting(settings, 'edge'))
    return (a, b, stream) => {
      const child = integersOf(a).slice()
      for (const slot of drawBox(stream)) child[slot] = b[slot]!
      return child
    }
  },
}

export const patchResetMutation: MutationRow = {
  name: 'patch-reset',
  title: 'Patch reset',
  summary: 'the slots of a random box get new options',
  source: 'common practice, no source',
  encodings: ['layout'],
  settings: {
    edge: edgeRow(0.25),
    fill: {
      kind: 'choice',
      default: 'one',
      options: ['one', 'each'],
      help: 'one: the whole box gets one option, other than that of one of its slots; each: every slot gets another',
    },
  },
  build: (encoding, settings) => {
    const drawBox = boxesOf(layoutOf(encoding).size, numberSetting(settings, 'edge'))
    const values = geneValuesOf(encoding)
    const each = choiceSetting(settings, 'fill') === 'each'
    return (value, stream) => {
      const mutant = integersOf(value).slice()
      const box = drawBox(stream)
      if (each) {
        for (const slot of box) mutant[slot] = anotherValue(mutant[slot]!, values, stream)
      } else {
        // Measured against a random slot of the box, so that every reset changes something.
        const option = anotherValue(mutant[box[stream.below(box.length)]!]!, values, stream)
        for (const slot of box) mutant[slot] = option
      }
      return mutant
    }
  },
}
