// The classic test functions as problems: one row each, built by classicProblem(name, size). They are what methods
// are checked on, and the quickest way to try a search. No physics; no conditions, except in noisy-sphere.

import { bits, real } from '../../../shared/encodings.js'
import type { Genome, GenomeSpec } from '../../../shared/genome.js'
import { noMachine } from '../../../shared/making/types.js'
import type { AnyProblem, Direction, Problem } from '../../../shared/problem.js'
import { refuse } from '../../../shared/refusals.js'
import { defineProblem } from '../../problem.js'
import {
  dtlz1,
  dtlz2,
  leadingOnes,
  onemax,
  rastrigin,
  rosenbrock,
  sphere,
  zdt1,
  zdt2,
  zdt3,
  zdt4,
  zdt6,
} from './functions.js'

export interface ClassicRow {
  readonly summary: string
  /** Author, title, year; from memory. */
  readonly source: string
  /** How many bits or numbers unless asked otherwise. */
  readonly size: number
  readonly sizeLeast: number
  readonly genome: (size: number) => GenomeSpec
  readonly direction: Direction
  readonly objectives: readonly string[]
  readonly values: (genome: Genome, condition: unknown) => readonly number[]
  /** Draws what is random; nothing when absent. */
  readonly draw?: Problem['drawCondition']
}

const someBits = (length: number): GenomeSpec => ({ bits: bits({ length }) })
const numbersIn = (low: number, high: number) => (length: number) => ({ x: real({ length, low, high }) })
const bitsOf = (genome: Genome) => genome.bits!
const numbersOf = (genome: Genome) => genome.x!

const zdtSource = 'Zitzler, Deb, Thiele: Comparison of multiobjective evolutionary algorithms, 2000'
const dtlzSource = 'Deb, Thiele, Laumanns, Zitzler: Scalable test problems, 2005'
/** Standard deviation of the noise of noisy-sphere. */
export const noiseSd = 1
/** Objectives of dtlz1 and dtlz2. */
export const dtlzObjectives = 3

const two = { sizeLeast: 2, direction: 'minimise', objectives: ['f1', 'f2'] } as const
const one = { sizeLeast: 1, direction: 'minimise', objectives: ['value'] } as const
const three = { sizeLeast: dtlzObjectives, direction: 'minimise', objectives: ['f1', 'f2', 'f3'] } as const

export const classics = {
  onemax: {
    ...one,
    summary: 'As many ones as possible.',
    source: 'Mühlenbein: How genetic algorithms really work, 1992 (counting ones)',
    size: 100,
    genome: someBits,
    direction: 'maximise',
    objectives: ['ones'],
    values: (genome) => [onemax(bitsOf(genome))],
  },
  'leading-ones': {
    ...one,
    summary: 'As many ones as possible before the first zero.',
    source: 'Rudolph: Convergence properties of evolutionary algorithms, 1997',
    size: 50,
    genome: someBits,
    direction: 'maximise',
    objectives: ['ones'],
    values: (genome) => [leadingOnes(bitsOf(genome))],
  },
  sphere: {
    ...one,
    summary: 'Sum of squares.',
    source: 'Rechenberg: Evolutionsstrategie, 1973',
    size: 10,
    genome: numbersIn(-5.12, 5.12),
    values: (genome) => [sphere(numbersOf(genome))],
  },
  rastrigin: {
    ...one,
    summary: 'A bowl with a grid of dimples.',
    source: 'Mühlenbein, Schomisch, Born: The parallel genetic algorithm as function optimizer, 1991',
    size: 10,
    genome: numbersIn(-5.12, 5.12),
    values: (genome) => [rastrigin(numbersOf(genome))],
  },
  rosenbrock: {
    ...one,
    summary: 'A long bent valley.',
    source:
      'Rosenbrock: An automatic method for finding the greatest or least value of a function, 1960 (n numbers: common practice)',
    size: 10,
    sizeLeast: 2,
    genome: numbersIn(-2.048, 2.048),
    values: (genome) => [rosenbrock(numbersOf(genome))],
  },
  zdt1: {
    ...two,
    summary: 'Two objectives, convex front.',
    source: zdtSource,
    size: 30,
    genome: numbersIn(0, 1),
    values: (genome) => zdt1(numbersOf(genome)),
  },
  zdt2: {
    ...two,
    summary: 'Two objectives, concave front.',
    source: zdtSource,
    size: 30,
    genome: numbersIn(0, 1),
    values: (genome) => zdt2(numbersOf(genome)),
  },
  zdt3: {
    ...two,
    summary: 'Two objectives, front in five pieces.',
    source: zdtSource,
    size: 30,
    genome: numbersIn(0, 1),
    values: (genome) => zdt3(numbersOf(genome)),
  },
  zdt4: {
    ...two,
    summary: 'Two objectives, many local fronts.',
    source: zdtSource,
    size: 10,
    genome: (size) => ({
      first: real({ low: 0, high: 1 }),
      others: real({ length: size - 1, low: -5, high: 5 }),
    }),
    values: (genome) => zdt4([genome.first![0]!, ...genome.others!]),
  },
  zdt6: {
    ...two,
    summary: 'Two objectives, thin towards the front.',
    source: zdtSource,
    size: 10,
    genome: numbersIn(0, 1),
    values: (genome) => zdt6(numbersOf(genome)),
  },
  dtlz1: {
    ...three,
    summary: 'Three objectives, plane front, many local fronts.',
    source: dtlzSource,
    size: 7,
    genome: numbersIn(0, 1),
    values: (genome) => dtlz1(numbersOf(genome), dtlzObjectives),
  },
  dtlz2: {
    ...three,
    summary: 'Three objectives, spherical front.',
    source: dtlzSource,
    size: 12,
    genome: numbersIn(0, 1),
    values: (genome) => dtlz2(numbersOf(genome), dtlzObjectives),
  },
  'noisy-sphere': {
    ...one,
    summary: 'Sum of squares, measured with normal noise.',
    source: 'Arnold, Beyer: Local performance of the (1+1)-ES in a noisy environment, 2002 (the model)',
    size: 10,
    genome: numbersIn(-5.12, 5.12),
    draw: (stream) => ({ noise: noiseSd * stream.normal() }),
    values: (genome, condition) => [sphere(numbersOf(genome)) + (condition as { noise: number }).noise],
  },
  flat: {
    ...one,
    summary: 'Everybody is equal: whatever changes here is chance or a hidden bias.',
    source: 'Kimura: The neutral theory of molecular evolution, 1983 (the idea)',
    size: 64,
    genome: someBits,
    values: () => [0],
  },
} as const satisfies { readonly [name: string]: ClassicRow }

export type ClassicName = keyof typeof classics

/** A classic test function as a problem; `size` is its number of bits or numbers. */
export function classicProblem(name: ClassicName, size?: number): AnyProblem {
  const row: ClassicRow = classics[name]
  const length = size ?? row.size
  if (!Number.isInteger(length) || length < row.sizeLeast) {
    throw refuse('impossible-value', {
      detail: `found size ${length}, expected a whole number of at least ${row.sizeLeast} for ${name}.`,
      where: { field: 'size' },
    })
  }
  return defineProblem<GenomeSpec, unknown>({
    name,
    version: '1',
    summary: row.summary,
    genome: row.genome(length),
    objectives: Object.fromEntries(row.objectives.map((o) => [o, { direction: row.direction, unit: '1' }])),
    drawCondition: row.draw ?? (() => null),
    simulate: (genome, situations) =>
      situations.map(({ condition }) => {
        const values = row.values(genome, condition)
        return { objectives: Object.fromEntries(row.objectives.map((o, i) => [o, values[i]!])) }
      }),
    use: noMachine,
  })
}
