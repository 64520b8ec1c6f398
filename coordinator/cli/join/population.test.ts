// Promise: the statistics of an island are those of its members now, in the objective's own direction and unit.

import { expect, it } from 'vitest'
import { resultDigest } from '../../../shared/digests.js'
import { fixtureTools, mixedPlan, simulated } from '../../../tests/fixture.js'
import { type Gate, Search } from '../../evolution/search.js'
import { populationView } from './population.js'

const gate: Gate = {
  outcome: (_island, ticket) => {
    const result = simulated(mixedPlan(), ticket.individual.genome, ticket.firstReplicate, ticket.replicates)
    return { result, digest: resultDigest(result) }
  },
  nextArrival: () => undefined,
  mayCommit: (island) => island.counters.commits < 40,
  maySend: () => true,
  factWhileWaiting: () => false,
  factsBeforeSending: () => {},
  factsAtEpoch: () => {},
  released: () => {},
  committed: () => {},
  sent: () => {},
}

it('orders quantiles, leaves failures out and knows every part', () => {
  const plan = mixedPlan()
  const search = new Search(fixtureTools(plan))
  search.advanceAll(gate)
  const island = search.island(1)
  const view = populationView(plan, island)
  expect(view.members).toBe(island.members().length)
  expect(view.failed).toBe(island.members().filter(({ failedSimulations }) => failedSimulations > 0).length)
  expect(view.objectives.map(({ name, unit }) => `${name} ${unit}`)).toEqual(['error m', 'reach m'])
  for (const { quantiles } of view.objectives) {
    expect([...quantiles].sort((a, b) => a - b)).toEqual([...quantiles])
    expect(quantiles.every(Number.isFinite)).toBe(true)
  }
  // 'reach' is maximised: its greatest value belongs to the smallest score.
  const least = Math.min(...island.members().map(({ score }) => score[1]!))
  expect(view.objectives[1]?.quantiles[4]).toBeCloseTo(0 - least, 12)
  expect(Object.keys(view.diversity.parts)).toEqual(['place', 'size'])
  expect(view.diversity.mean).toBeGreaterThan(0)
  expect(view.ageCommits?.oldest).toBeGreaterThanOrEqual(view.ageCommits!.median)
})
