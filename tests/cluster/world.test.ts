// Promise: whatever happens to workers, coordinator and disk, the digest is the one of a calm day, nothing is lost,
// nothing counts twice. Sizes: SKERRY_SEEDS (default 2000), one search of about 500 evaluations a seed.
// To repeat one: SKERRY_SEED=123 npx vitest run tests/cluster/world.test.ts

import { describe, expect, it } from 'vitest'
import { replayRecord } from '../../coordinator/engine/recover.js'
import { topologies } from '../../coordinator/evolution/migration.js'
import type { SearchPlan } from '../../coordinator/evolution/plan.js'
import { hex } from '../../shared/digests.js'
import { firstControl } from '../../shared/ids.js'
import { type Stream, stream } from '../../shared/streams.js'
import { fixtureTools, islandPlan, mixedPlan, simulated } from '../fixture.js'
import { calmEnding, drawnPlan } from './plans.js'
import { calm, type Ending, type Order, stormOf, type Weather, World } from './world.js'

const seeds = process.env.SKERRY_SEED
  ? [Number(process.env.SKERRY_SEED)]
  : Array.from({ length: Number(process.env.SKERRY_SEEDS ?? 2000) }, (_, at) => at + 1)

/** Plans drawn; the calm ending of each is worked out once. */
const plansDrawn = 60
const variantOf = (seed: number) => 1 + (seed % plansDrawn)
/** For what is about people and machines and not about plans: every method, both orders, a control. */
const plan = mixedPlan({
  budget: { simulations: 700 },
  controls: [islandPlan(firstControl, { method: 'drift', lookahead: 8 })],
})

const repeat = (seed: number) => `repeat with SKERRY_SEED=${seed} npx vitest run tests/cluster/world.test.ts`

/** Now and then the search also rests on its way, as --stop-after has it. */
function weatherOf(seed: number, simulations: number): Weather {
  const draw = stream(seed, 'weather', 4)
  const rests = draw.chance(1, 4) ? [1, 2].map((part) => Math.floor((simulations * part) / 3)) : []
  return { ...stormOf(seed), rests }
}

/** The journal leads to where the engine stands, from the start and from the newest snapshots. */
function expectReplay({ disk, digest }: Ending, of: SearchPlan, seed: number): void {
  for (const fromStart of [true, false]) {
    const { search } = replayRecord(fixtureTools(of), disk, { fromStart })
    expect(hex(search.digest()), `${fromStart ? 'from the start' : 'from snapshots'}, ${repeat(seed)}`).toBe(
      digest,
    )
  }
}

/** Budgets up and down, more or fewer replicates, islands paused, continued and added: at looks drawn from the seed. */
function ordersOf(draw: Stream, of: SearchPlan): Order[] {
  const all = of.islands.map(({ island }) => island)
  const added = islandPlan(50, { lookahead: 1 + draw.below(8), share: 1 + draw.below(8) })
  const topology = of.migration && topologies[of.migration.topology]
  // The search file is refused where the topology does not fit those who take part.
  const drawn = all.filter(() => draw.chance(2, 3))
  const some = topology?.misfit(drawn.length + 1) === undefined ? drawn : all.slice(0, 3)
  const simulations = Math.floor((of.budget.simulations * (4 + draw.below(12))) / 8)
  const most = of.replicates.first + draw.below(10)
  const gives: readonly [string, Order['give']][] = [
    ['budget-changed', (engine) => engine.orderBudget('Another budget.', simulations)],
    [
      'replicates-changed',
      (engine) =>
        engine.orderAtEpoch('replicates-changed', 'Others.', () => ({ fact: 'most-replicates', most })),
    ],
    ['islands-changed', (engine) => engine.orderMembership('Some.', [...some, 50], [added])],
  ]
  return gives
    .filter(() => draw.chance(2, 3))
    .map(([kind, give]) => ({ kind, give, at: 1 + draw.below(60) }))
    .sort((a, b) => a.at - b.at)
}

describe('a simulated cluster under one seed', () => {
  it('finishes every plan on a calm day, with the whole budget where nothing ends it before', () => {
    const variants = [...new Set(seeds.map(variantOf))]
    for (const variant of variants) {
      const drawn = drawnPlan(variant)
      const { status, engine } = calmEnding(variant)
      expect(status, drawn.name).toBe('finished')
      expect(engine.counts.corrections + engine.counts.disagreements).toBe(0)
      if (drawn.budget.target !== undefined || drawn.budget.stagnationRounds !== undefined) continue
      const block = drawn.replicates.first * Math.max(1, drawn.problem.cases.length)
      for (const { quota, counters } of engine.search.islands) {
        expect(counters.committedSimulations, drawn.name).toBeGreaterThan(quota - block)
        expect(counters.committedSimulations, drawn.name).toBeLessThanOrEqual(quota)
      }
    }
    expect(new Set(variants.map((variant) => calmEnding(variant).digest)).size).toBe(variants.length)
  }, 120_000)

  it(`has the calm day's digest after every storm (${seeds.length} seeds)`, () => {
    let crashes = 0
    let fenced = 0
    for (const seed of seeds) {
      const drawn = drawnPlan(variantOf(seed))
      const ending = new World(drawn, seed, weatherOf(seed, drawn.budget.simulations)).run(4_000)
      crashes += ending.crashes
      fenced += ending.fenced
      expect(ending.status, repeat(seed)).toBe('finished')
      expect(ending.digest, repeat(seed)).toBe(calmEnding(variantOf(seed)).digest)
      expect(ending.engine.counts.corrections, repeat(seed)).toBe(0)
      expect(ending.engine.impurities(), repeat(seed)).toEqual([])
      if (seed % 10 === 0) expectReplay(ending, drawn, seed)
    }
    // The storms were real ones.
    if (seeds.length > 100) {
      expect(crashes).toBeGreaterThan(seeds.length)
      expect(fenced).toBeGreaterThan(seeds.length / 10)
    }
  }, 600_000)

  it('finishes in every storm whatever is ordered meanwhile, and the journal leads to the same', () => {
    for (const seed of seeds.slice(0, Math.ceil(seeds.length / 20))) {
      const draw = stream(seed, 'weather', 8)
      const drawn = drawnPlan(1000 + seed, draw.chance(1, 3) ? ['proposal', 'cost', 'arrival'] : undefined)
      const orders = ordersOf(draw, drawn)
      const ending = new World(drawn, seed, stormOf(seed), ...orders).run(4_000)
      expect(ending.status, repeat(seed)).toBe('finished')
      expectReplay(ending, drawn, seed)
    }
  }, 120_000)

  it('sets aside what kills every worker, always the same, and says that it did', () => {
    const poison = { ...calm, poisonSize: 7 }
    const reference = new World(plan, 1, poison).run(0)
    expect(reference.status).toBe('finished')
    expect(reference.engine.counts.setAside).toBeGreaterThan(3)
    expect(reference.engine.impurities()).toEqual(['set-aside'])
    for (const seed of seeds.slice(0, 40)) {
      const ending = new World(plan, seed, { ...stormOf(seed), poisonSize: 7 }).run(4_000)
      expect(ending.digest, repeat(seed)).toBe(reference.digest)
    }
  }, 120_000)

  it('never believes a liar where it matters, and shuts out liars only', () => {
    let convicted = 0
    for (const seed of seeds.slice(0, 300)) {
      const draw = stream(seed, 'weather', 9)
      // Machines of a fleet that lie: trust.test.ts.
      const { fleet: _, ...rest } = stormOf(seed)
      const storm = { ...rest, workers: 5 + draw.below(12), liars: 1, lies: 20 + draw.below(900) }
      const ending = new World(plan, seed, storm).run(4_000)
      expect(ending.status, repeat(seed)).toBe('finished')
      for (const island of ending.engine.search.islands) {
        const best = island.best!
        const truth = simulated(plan, best.genome, 0, best.replicates)
        expect([...best.values], `best of island ${island.number}, ${repeat(seed)}`).toEqual([
          ...truth.values,
        ])
      }
      for (const event of ending.disk.events()) {
        if (event.kind !== 'worker-shut-out') continue
        convicted++
        expect(ending.liars, repeat(seed)).toContain((event.data as { worker: string }).worker)
      }
    }
    if (seeds.length > 100) expect(convicted).toBeGreaterThan(100)
  }, 300_000)

  it('canary: a search that commits on arrival has another digest in another weather', () => {
    const onArrival = {
      ...plan,
      islands: plan.islands.map((island) => ({ ...island, order: 'arrival' as const })),
    }
    const digests = new Set(
      seeds.slice(0, 5).map((seed) => new World(onArrival, seed, stormOf(seed)).run(4_000).digest),
    )
    if (seeds.length > 1) expect(digests.size).toBeGreaterThan(1)
  })
})
