// Mutations of parts whose genes are whole numbers: indices of options, slots, integers.

import { check } from '../../../shared/check.js'
import type { Encoding } from '../../../shared/genome.js'
import type { Stream } from '../../../shared/streams.js'
import { numberSetting } from '../settings.js'
import { gapsOf } from './gaps.js'
import { changesRow, everyEncoding, integersOf, type Mutation, type MutationRow, rateOf } from './rows.js'

/** The values of a gene: `count` of them from `low` on. */
export interface GeneValues {
  readonly low: number
  readonly count: number
}

export function geneValuesOf(encoding: Encoding): GeneValues {
  if (encoding.kind === 'integer') return { low: encoding.low, count: encoding.high - encoding.low + 1 }
  check(encoding.kind === 'choice' || encoding.kind === 'layout', 'the operator fits whole numbers')
  return { low: 0, count: encoding.options.length }
}

/** A value uniformly among those other than `gene`; there must be one. */
export function anotherValue(gene: number, values: GeneValues, stream: Stream): number {
  const drawn = values.low + stream.below(values.count - 1)
  return drawn < gene ? drawn : drawn + 1
}

export const resetMutation: MutationRow = {
  name: 'reset',
  title: 'Random reset',
  summary: 'changed genes get a new value, uniformly among the others',
  source: 'common practice, no source',
  encodings: ['integer', 'choice', 'layout'],
  settings: { changes: changesRow },
  build: (encoding, settings) => {
    const values = geneValuesOf(encoding)
    return changing(gapsOf(rateOf(settings, 'changes', encoding)), (gene, stream) =>
      anotherValue(gene, values, stream),
    )
  },
}

export const creepMutation: MutationRow = {
  name: 'creep',
  title: 'Creep mutation',
  summary: 'changed genes move a few steps up or down, reflected half a step outside the bounds',
  source: 'Davis, Handbook of genetic algorithms, 1991 (creep, from memory); reflection: common practice',
  encodings: ['integer'],
  settings: {
    changes: changesRow,
    step: {
      kind: 'number',
      default: 0.1,
      low: 0,
      high: 1,
      help: 'longest step as a fraction of the range, at least 1; shorter steps are equally likely',
    },
  },
  build: (encoding, settings) => {
    const values = geneValuesOf(encoding)
    const longest = Math.min(
      2 ** 31,
      Math.max(1, Math.round(numberSetting(settings, 'step') * (values.count - 1))),
    )
    return changing(gapsOf(rateOf(settings, 'changes', encoding)), (gene, stream) => {
      const drawn = stream.below(2 * longest)
      const step = drawn < longest ? drawn - longest : drawn - longest + 1
      return values.low + foldIndex(gene - values.low + step, values.count)
    })
  },
}

/**
 * Folds an index into 0 .. count - 1 with mirrors half a step outside: -1 becomes 0, count becomes count - 1.
 * From x to y is then as likely as from y to x, so without selection all values stay equally likely. The price:
 * a step off the end may leave the gene where it was.
 */
export function foldIndex(index: number, count: number): number {
  const period = 2 * count
  const along = ((index % period) + period) % period
  return along < count ? along : period - 1 - along
}

function changing(
  gap: (stream: Stream) => number,
  change: (gene: number, stream: Stream) => number,
): Mutation {
  return (value, stream) => {
    let i = gap(stream)
    if (i >= value.length) return value
    const mutant = integersOf(value).slice()
    for (; i < mutant.length; i += 1 + gap(stream)) mutant[i] = change(mutant[i]!, stream)
    return mutant
  }
}

export const noMutation: MutationRow = {
  name: 'none',
  title: 'No mutation',
  summary: 'the part as it is',
  source: 'common practice, no source',
  encodings: everyEncoding,
  settings: {},
  build: () => (value) => value,
}
