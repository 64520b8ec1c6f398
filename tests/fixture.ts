// One place that builds plans, engines and results for tests of the search itself; a test sets only what it is
// about. The physics here is arithmetic: a noisy sphere with a second objective, costs that differ ten-fold.

import { searchTools } from '../coordinator/evolution/build.js'
import { columnsOf, simulationsPerReplicate } from '../coordinator/evolution/estimate.js'
import { methodNamed } from '../coordinator/evolution/methods/index.js'
import { defaultOperators } from '../coordinator/evolution/operators/index.js'
import type { IslandPlan, ProblemPlan, SearchPlan } from '../coordinator/evolution/plan.js'
import type { SearchTools } from '../coordinator/evolution/search.js'
import { defaultSettings } from '../coordinator/evolution/settings.js'
import { integer, real } from '../shared/encodings.js'
import type { Genome } from '../shared/genome.js'
import { firstControl } from '../shared/ids.js'
import type { EvaluationResult } from '../shared/result.js'
import { stream } from '../shared/streams.js'

export const fixtureSpec = {
  place: real({ length: 3, low: -1, high: 1 }),
  size: integer({ length: 1, low: 1, high: 10 }),
}

export const fixtureProblem: ProblemPlan = {
  name: 'fixture',
  version: '1',
  digest: '0'.repeat(64),
  spec: fixtureSpec,
  objectives: [
    { name: 'error', direction: 'minimise', unit: 'm', reduce: 'mean', overCases: 'mean' },
    { name: 'reach', direction: 'maximise', unit: 'm', reduce: 'median', overCases: 'worst' },
  ],
  measures: [{ name: 'height', low: -1, high: 1, unit: 'm' }],
  cases: [],
}

/** Simulated times differ ten-fold, and the problem says so. */
export const fixtureCost = (genome: Genome): number => genome.size![0]!

export const fixtureTools = (plan: SearchPlan): SearchTools =>
  searchTools(plan, { expectedCost: fixtureCost, repair: (genome) => genome })

/** What a simulation of this genome gives: a pure function of genome, replicate and seed. */
export function simulated(
  plan: SearchPlan,
  genome: Genome,
  firstReplicate: number,
  replicates: number,
): EvaluationResult {
  const width = columnsOf(plan.problem)
  const cases = simulationsPerReplicate(plan.problem)
  const values = new Float64Array(width * replicates * cases)
  const failures: { simulation: number; reason: string }[] = []
  for (let row = 0; row < replicates * cases; row++) {
    const draw = stream(plan.seed, 'condition', 0, row % cases, firstReplicate + Math.floor(row / cases))
    const place = genome.place!
    const squares = Array.from(place).reduce((sum, value) => sum + value * value, 0)
    if (squares > 2.6) {
      failures.push({ simulation: row, reason: 'out of bounds' })
      continue
    }
    values[row * width] = squares + 0.1 * draw.normal()
    values[row * width + 1] = place[0]! + 0.01 * draw.uniform()
    values[row * width + 2] = place[1]!
  }
  return { values, failures }
}

export function islandPlan(island: number, changes: Partial<IslandPlan> = {}): IslandPlan {
  const method = methodNamed(changes.method ?? 'steady-state')
  return {
    island,
    method: method.name,
    settings: defaultSettings(method.settings),
    population: 12,
    lookahead: 6,
    order: 'proposal',
    share: 6,
    operators: defaultOperators(fixtureSpec),
    ...changes,
  }
}

/** Narrow and wide, cheap and dear, generational and steady, unequal shares, both orders, top-ups, controls. */
export function mixedPlan(changes: Partial<SearchPlan> = {}): SearchPlan {
  return {
    name: 'fixture',
    seed: 20261201,
    semantics: 1,
    problem: fixtureProblem,
    islands: [
      islandPlan(1, { method: 'steady-state', lookahead: 3, share: 3 }),
      islandPlan(2, { method: 'generational', population: 10, lookahead: 10, share: 5 }),
      islandPlan(3, { method: 'nsga-ii', population: 8, lookahead: 16, share: 9 }),
      islandPlan(4, { method: 'age-fitness-pareto', order: 'cost', lookahead: 12, share: 6 }),
      islandPlan(5, { method: 'one-plus-lambda', population: 4, lookahead: 4, share: 2, order: 'cost' }),
    ],
    controls: [
      islandPlan(firstControl, { method: 'drift', lookahead: 8 }),
      islandPlan(firstControl + 1, { method: 'random-sampling', lookahead: 8 }),
    ],
    migration: {
      everyRounds: 8,
      emigrants: 2,
      topology: 'two-way-ring',
      lag: 1,
      leave: 'best',
      arrive: 'worst',
    },
    replicates: { first: 2, topUp: 2, most: 6, shared: true },
    budget: { simulations: 600 },
    confirm: { fraction: 0.02 },
    genomes: 'none',
    ...changes,
  }
}
