// Crossover by exchange: every gene of the child is the gene of one of its parents at the same place. Fits every
// encoding.

import type { PartValue } from '../../../shared/genome.js'
import type { Stream } from '../../../shared/streams.js'
import { numberSetting } from '../settings.js'
import { gapsOf } from './gaps.js'
import { type Crossover, type CrossoverRow, everyEncoding } from './rows.js'

export const uniformCrossover: CrossoverRow = {
  name: 'uniform',
  title: 'Uniform crossover',
  summary: 'each gene comes from the second parent with the same chance, independently',
  source: 'Syswerda, Uniform crossover in genetic algorithms, 1989',
  encodings: everyEncoding,
  settings: {
    exchange: {
      kind: 'number',
      default: 0.5,
      low: 0,
      high: 1,
      help: 'chance that a gene comes from the second parent',
    },
  },
  build: (_encoding, settings) => {
    const exchange = numberSetting(settings, 'exchange')
    return exchange === 0.5 ? exchangeByCoins : exchangeByGaps(gapsOf(exchange))
  },
}

/** One bit of a word a gene: 32 fair coins a draw. */
function exchangeByCoins(a: PartValue, b: PartValue, stream: Stream): PartValue {
  const child = a.slice()
  let coins = 0
  for (let i = 0; i < child.length; i++) {
    if ((i & 31) === 0) coins = stream.word()
    if ((coins >>> (i & 31)) & 1) child[i] = b[i]!
  }
  return child
}

function exchangeByGaps(gap: (stream: Stream) => number): Crossover {
  return (a, b, stream) => {
    const child = a.slice()
    for (let i = gap(stream); i < child.length; i += 1 + gap(stream)) child[i] = b[i]!
    return child
  }
}

export const onePointCrossover: CrossoverRow = {
  name: 'one-point',
  title: 'One-point crossover',
  summary: 'genes before a random cut come from the first parent, the others from the second',
  source:
    'Holland, Adaptation in natural and artificial systems, 1975: crossover of two strings at one point',
  encodings: everyEncoding,
  settings: {},
  build: () => (a, b, stream) => {
    if (a.length < 2) return eitherOf(a, b, stream)
    const child = a.slice()
    // Each parent gives at least one gene.
    for (let i = 1 + stream.below(a.length - 1); i < child.length; i++) child[i] = b[i]!
    return child
  },
}

export const twoPointCrossover: CrossoverRow = {
  name: 'two-point',
  title: 'Two-point crossover',
  summary:
    'a random stretch comes from the second parent; the genes count as a ring, so no place is favoured',
  source:
    'De Jong, An analysis of the behavior of a class of genetic adaptive systems, 1975: strings as rings',
  encodings: everyEncoding,
  settings: {},
  build: () => (a, b, stream) => {
    if (a.length < 2) return eitherOf(a, b, stream)
    const child = a.slice()
    const start = stream.below(a.length)
    // Two different cuts of the ring: each parent gives at least one gene.
    const length = 1 + stream.below(a.length - 1)
    for (let k = 0; k < length; k++) {
      const i = (start + k) % a.length
      child[i] = b[i]!
    }
    return child
  },
}

/** A single gene cannot be cut: it comes from either parent. */
function eitherOf(a: PartValue, b: PartValue, stream: Stream): PartValue {
  return stream.chance(1, 2) ? b : a
}

export const noCrossover: CrossoverRow = {
  name: 'none',
  title: 'No crossover',
  summary: 'the part of the first parent, unchanged',
  source: 'common practice, no source',
  encodings: everyEncoding,
  settings: {},
  build: () => (a) => a,
}
