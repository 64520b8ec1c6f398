// Tables, a problem and a good search file for the tests of the reader. A test changes only what it is about.

import { type PlannedSearch, planSearch, readSearchFile } from '../../coordinator/cli/searchfile/read.js'
import type { SearchTables } from '../../coordinator/cli/searchfile/tables.js'
import type { ProblemPlan } from '../../coordinator/evolution/plan.js'

export const tables: SearchTables = {
  semantics: 1,
  methods: [
    {
      name: 'steady-state',
      summary: '',
      settings: {
        tournament: {
          kind: 'integer',
          default: 3,
          low: 1,
          high: 1000,
          help: 'members that compete to be a parent',
        },
        crossoverRate: {
          kind: 'number',
          default: 0.9,
          low: 0,
          high: 1,
          help: 'share of children with two parents',
        },
        replacement: { kind: 'choice', default: 'worst', options: ['worst', 'oldest'], help: 'who leaves' },
      },
      defaultPopulation: 100,
      pace: 'steady',
      objectives: 'one',
    },
    {
      name: 'nsga-ii',
      summary: '',
      settings: {},
      defaultPopulation: 80,
      pace: 'generational',
      objectives: 'any',
    },
    { name: 'drift', summary: '', settings: {}, defaultPopulation: 100, pace: 'steady', objectives: 'any' },
    {
      name: 'random-sampling',
      summary: '',
      settings: {},
      defaultPopulation: 1,
      pace: 'steady',
      objectives: 'any',
    },
  ],
  crossovers: [
    {
      name: 'sbx',
      summary: '',
      encodings: ['real'],
      settings: {
        index: { kind: 'number', default: 15, low: 0, high: 100, help: 'larger stays nearer the parents' },
      },
    },
    { name: 'uniform', summary: '', encodings: ['real', 'choice', 'bits'], settings: {} },
  ],
  mutations: [
    { name: 'gaussian', summary: '', encodings: ['real'], settings: {} },
    { name: 'reset', summary: '', encodings: ['choice'], settings: {} },
  ],
  defaultOperators: (encoding) =>
    encoding.kind === 'real'
      ? { crossover: 'sbx', mutation: 'gaussian' }
      : { crossover: 'uniform', mutation: 'reset' },
}

const distance = { direction: 'maximise', unit: 'm', reduce: 'mean', overCases: 'mean' } as const

export const problem: ProblemPlan = {
  name: 'mount',
  version: '1',
  digest: '00',
  spec: {
    lengths: { kind: 'real', length: 4, low: 0, high: 1, scale: 'linear' },
    material: { kind: 'choice', length: 1, options: ['steel', 'bronze'] },
  },
  objectives: [{ name: 'distance', ...distance }],
  measures: [],
  cases: [],
}

export const twoObjectives: ProblemPlan = {
  ...problem,
  objectives: [...problem.objectives, { name: 'mass', ...distance, direction: 'minimise' }],
}

export const goodFile = `name: mount
problem: ./problem.ts
seed: 7
workersExpected: 8
budget: { simulations: 20000 }
replicates: { first: 4, topUp: 4, most: 16 }
islands:
  - { count: 3, method: steady-state, population: 40, lookahead: 6 }
  - count: 1
    method: steady-state
    population: 40
    lookahead: 6
    settings: { tournament: 5 }
    operators:
      lengths: { crossover: { operator: sbx, settings: { index: 5 } } }
migration: { every: 20 rounds, emigrants: 2, topology: ring, lag: 1 }
control: { kind: drift, budget: same }
`

/** The good file with one piece of text replaced; fails when the piece is not there. */
export function edited(piece: string, by: string): string {
  if (!goodFile.includes(piece)) throw new Error(`the good file has no ${piece}`)
  return goodFile.replace(piece, by)
}

export function plan(text: string, of: ProblemPlan = problem, nowMs?: number): PlannedSearch {
  return planSearch(readSearchFile(text, tables), of, tables, nowMs === undefined ? {} : { nowMs })
}
