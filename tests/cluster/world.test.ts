// Promise: whatever happens to workers, coordinator and disk, the digest is the one of a calm day, nothing is lost,
// nothing counts twice. Sizes: SKERRY_SEEDS (default 2000), one search of about 500 evaluations a seed.
// To repeat one: SKERRY_SEED=123 npx vitest run tests/cluster/world.test.ts

import { describe, expect, it } from 'vitest'
import type { SearchPlan } from '../../coordinator/evolution/plan.js'
import { firstControl } from '../../shared/ids.js'
import { stream } from '../../shared/streams.js'
import { islandPlan, mixedPlan, simulated } from '../fixture.js'
import { calm, stormOf, World } from './world.js'

const seeds = process.env.SKERRY_SEED
  ? [Number(process.env.SKERRY_SEED)]
  : Array.from({ length: Number(process.env.SKERRY_SEEDS ?? 2000) }, (_, at) => at + 1)

/** A few plans of about 500 evaluations, so that the calm digest is computed once each. */
function planOf(variant: number): SearchPlan {
  const base = mixedPlan({
    budget: { simulations: 700 },
    controls: [islandPlan(firstControl, { method: 'drift', lookahead: 8 })],
  })
  if (variant === 0) return base
  if (variant === 1) {
    return {
      ...base,
      seed: 11,
      migration: { ...base.migration!, topology: 'random', leave: 'random', arrive: 'random', lag: 2 },
    }
  }
  if (variant === 2) return { ...base, seed: 12, replicates: { first: 1, topUp: 1, most: 3, shared: false } }
  return {
    ...base,
    seed: 13,
    migration: { ...base.migration!, topology: 'complete', arrive: 'if-better' },
    controls: [],
  }
}
const plans = [0, 1, 2, 3].map(planOf)
const references = plans.map((plan) => new World(plan, 1, calm).run(0))

const repeat = (seed: number) => `repeat with SKERRY_SEED=${seed} npx vitest run tests/cluster/world.test.ts`

describe('a simulated cluster under one seed', () => {
  it('finishes on a calm day with the whole budget', () => {
    for (const { status, engine } of references) {
      expect(status).toBe('finished')
      expect(engine.counts.corrections + engine.counts.disagreements).toBe(0)
    }
    expect(new Set(references.map(({ digest }) => digest)).size).toBe(plans.length)
  })

  it(`has the calm day's digest after every storm (${seeds.length} seeds)`, () => {
    let crashes = 0
    for (const seed of seeds) {
      const variant = seed % plans.length
      const ending = new World(plans[variant]!, seed, stormOf(seed)).run(4_000)
      crashes += ending.crashes
      expect(ending.status, repeat(seed)).toBe('finished')
      expect(ending.digest, repeat(seed)).toBe(references[variant]!.digest)
      expect(ending.engine.counts.corrections, repeat(seed)).toBe(0)
    }
    // The storms were real ones.
    if (seeds.length > 100) expect(crashes).toBeGreaterThan(seeds.length)
  }, 600_000)

  it('sets aside what kills every worker, always the same, and says that it did', () => {
    const plan = plans[0]!
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
      const plan = plans[seed % plans.length]!
      const draw = stream(seed, 'weather', 9)
      const storm = { ...stormOf(seed), workers: 5 + draw.below(12), liars: 1, lies: 20 + draw.below(900) }
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
    const base = plans[0]!
    const plan = {
      ...base,
      islands: base.islands.map((island) => ({ ...island, order: 'arrival' as const })),
    }
    const digests = new Set(
      seeds.slice(0, 5).map((seed) => new World(plan, seed, stormOf(seed)).run(4_000).digest),
    )
    if (seeds.length > 1) expect(digests.size).toBeGreaterThan(1)
  })
})
