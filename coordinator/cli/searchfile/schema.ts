// The fields of a search file, as zod schemas: one for every field of the top level, so that a mistake in one
// leaves the others checked. The message of every check is what was *expected*; found, place and advice are
// added by explain.ts. What a field means for a running search is a row in changes.ts.

import { z } from 'zod'
import { limits } from '../../../shared/limits.js'
import { topologies } from '../../evolution/migration.js'
import type { Topology } from '../../evolution/plan.js'

const most = limits.seedMost

function whole(low: number, high: number) {
  const upTo = high === most ? ` from ${low}` : ` from ${low} to ${high}`
  const expected = `a whole number${upTo}`
  return z.number(expected).int(expected).min(low, expected).max(high, expected)
}
function above(low: number, unit: string) {
  const expected = `a number above ${low}${unit}`
  return z.number(expected).gt(low, expected)
}
function oneOf<const Names extends readonly [string, ...string[]]>(names: Names) {
  return z.enum(names, { error: `one of ${names.join(', ')}` })
}
/** `20 rounds` as 20. */
const rounds = z
  .string('a number of rounds, such as 20 rounds')
  .regex(/^\d{1,9}(\.\d{1,3})? rounds?$/, 'a number of rounds, such as 20 rounds')
  .transform((text) => Number.parseFloat(text))
  .refine((count) => count > 0, 'more than 0 rounds')

const settingValue = z.union([z.number(), z.string()], 'a number or a word')
const settings = z.record(z.string(), settingValue, 'a map of settings')
const operatorChoice = z.union(
  [
    z.string('the name of an operator'),
    z.strictObject({ operator: z.string('the name of an operator'), settings: settings.default({}) }),
  ],
  'the name of an operator, or a map with operator and settings',
)
const partOperators = z.strictObject(
  { crossover: operatorChoice.optional(), mutation: operatorChoice.optional() },
  'a map with crossover and mutation',
)
const operators = z.record(z.string(), partOperators, 'a map from part of the genome to its operators')

export const orders = ['proposal', 'cost', 'arrival'] as const
const topologyNames = Object.keys(topologies) as [Topology, ...Topology[]]

const islandGroup = z.strictObject(
  {
    count: whole(1, limits.islandsMost).default(1),
    method: z.string('the name of a method'),
    population: whole(1, limits.populationMost).optional(),
    lookahead: whole(1, limits.lookaheadMost),
    order: oneOf(orders).default('proposal'),
    share: whole(1, 1_000_000).optional(),
    settings: settings.default({}),
    operators: operators.default({}),
  },
  'a map that describes a group of islands',
)

const control = z.strictObject(
  {
    kind: oneOf(['drift', 'random-sampling']),
    budget: z.literal('same', 'same').default('same'),
    population: whole(1, limits.populationMost).optional(),
    lookahead: whole(1, limits.lookaheadMost).optional(),
    settings: settings.default({}),
    operators: operators.default({}),
  },
  'a map with kind (drift or random-sampling)',
)

const budget = z.strictObject(
  {
    simulations: whole(1, limits.simulationsMost),
    coreHours: above(0, ' core-hours').optional(),
    until: z
      .string('a date and time with its offset, such as 2026-12-24T18:00:00+01:00')
      .datetime({ offset: true, error: 'a date and time with its offset, such as 2026-12-24T18:00:00+01:00' })
      .optional(),
    target: z.number('a number, in the unit of the first objective').optional(),
    stagnation: rounds.optional(),
  },
  'a map with at least simulations',
)

const replicates = z.strictObject(
  {
    first: whole(1, limits.replicatesMost).default(1),
    topUp: whole(0, limits.replicatesMost).default(0),
    most: whole(1, limits.replicatesMost).optional(),
    conditions: oneOf(['shared', 'own']).default('shared'),
  },
  'a map with first, topUp and most',
)

const migration = z.strictObject(
  {
    every: rounds,
    emigrants: whole(1, limits.emigrantsMost).default(1),
    topology: oneOf(topologyNames).default('ring'),
    lag: whole(1, limits.lagMost).default(1),
    leave: oneOf(['best', 'random']).default('best'),
    arrive: oneOf(['worst', 'random', 'if-better']).default('if-better'),
  },
  'a map with every, emigrants, topology and lag, or the word none',
)

const licences = 'a map from licence (letters, digits, - and _) to how many the site has of it'
const tokens = z
  .record(z.string().regex(/^[A-Za-z][A-Za-z0-9_-]{0,63}$/), whole(0, limits.tokensMost), licences)
  .refine(
    (given) => Object.keys(given).length <= limits.tokenKinds,
    `at most ${limits.tokenKinds} kinds of licences`,
  )
  .default({})

/** Every field of the top level. */
export const fields = {
  name: z
    .string('a name of lower-case letters, digits and -')
    .regex(/^[a-z0-9][a-z0-9-]{0,59}$/, 'a name of lower-case letters, digits and -, at most 60 characters'),
  problem: z
    .string('the path of the problem, such as ./problem.ts, or skerry/problems/NAME')
    .min(1, 'the path of the problem')
    .max(4096, 'a path'),
  seed: whole(0, most),
  workersExpected: whole(1, 1_000_000).optional(),
  budget,
  replicates: replicates.prefault({}),
  islands: z
    .array(islandGroup, 'a list of island groups')
    .min(1, 'at least one group of islands')
    .max(limits.islandsMost, `at most ${limits.islandsMost} groups of islands`),
  migration: z
    .union([z.literal('none'), migration], 'a map with every, emigrants, topology and lag, or the word none')
    .optional(),
  control: z
    .union(
      [z.literal('none'), control, z.array(control).max(8, 'at most 8 controls')],
      'none, a control or a list of controls',
    )
    .default('none'),
  confirm: z
    .strictObject({
      fraction: z
        .number('a fraction from 0 to 1')
        .min(0, 'a fraction from 0 to 1')
        .max(1, 'a fraction from 0 to 1')
        .default(0.02),
    })
    .prefault({}),
  genomes: oneOf(['all', 'survivors', 'none']).default('survivors'),
  tokens,
  cores: whole(1, limits.threadsMost).optional(),
  port: whole(0, 65_535).optional(),
} as const

export type Fields = typeof fields
export type FieldKey = keyof Fields
/** A search file with defaults filled in. */
export type SearchFile = { readonly [Key in FieldKey]: z.output<Fields[Key]> }
export type IslandGroup = z.output<typeof islandGroup>
export type Control = z.output<typeof control>
export type OperatorChoice = z.output<typeof operatorChoice>
export type PartOperators = z.output<typeof partOperators>
