// Mutations of bits.

import { check } from '../../../shared/check.js'
import { gapsOf } from './gaps.js'
import { bitsOf, type MutationRow, rateOf } from './rows.js'

export const bitFlipMutation: MutationRow = {
  name: 'bit-flip',
  title: 'Standard bit mutation',
  summary: 'each bit flips independently with chance flips / length; possibly none does',
  source:
    'Muehlenbein, How genetic algorithms really work: mutation and hillclimbing, 1992 (rate 1 / length)',
  encodings: ['bits'],
  settings: {
    flips: {
      kind: 'number',
      default: 1,
      low: 0,
      high: 1e6,
      help: 'expected number of flipped bits in the part',
    },
  },
  build: (encoding, settings) => {
    const gap = gapsOf(rateOf(settings, 'flips', encoding))
    return (value, stream) => {
      let i = gap(stream)
      if (i >= value.length) return value
      const mutant = bitsOf(value).slice()
      for (; i < mutant.length; i += 1 + gap(stream)) mutant[i]! ^= 1
      return mutant
    }
  },
}

export const oneBitMutation: MutationRow = {
  name: 'one-bit',
  title: 'One-bit mutation',
  summary: 'exactly one bit flips, each with the same chance',
  source:
    'Randomized local search, evolutionary algorithms, and the minimum spanning tree problem, 2004 (from memory)',
  encodings: ['bits'],
  settings: {},
  build: (encoding) => {
    check(encoding.kind === 'bits', 'the operator fits bits')
    return (value, stream) => {
      const mutant = bitsOf(value).slice()
      mutant[stream.below(mutant.length)]! ^= 1
      return mutant
    }
  },
}
