// Promise: islands added, paused and continued while a search runs, and budgets changed while others crash, enter at
// stated points: the record leads to the same digest from its start, whatever was killed meanwhile.

import { describe, expect, it } from 'vitest'
import type { Engine } from '../../coordinator/engine/engine.js'
import { replayRecord } from '../../coordinator/engine/recover.js'
import { hex } from '../../shared/digests.js'
import { fixtureTools, islandPlan, mixedPlan } from '../fixture.js'
import { calm, stormOf, World } from './world.js'

const plan = mixedPlan({ budget: { simulations: 800 } })
const added = [
  islandPlan(6, { method: 'steady-state', lookahead: 4, share: 6 }),
  islandPlan(7, { method: 'generational', population: 6, lookahead: 6, share: 6 }),
]
const all = [1, 2, 3, 4, 5]

type Give = (engine: Engine) => void

function endsAlike(seed: number, storm: boolean, orders: { readonly [look: number]: Give }): Engine {
  // Crashes would lose an order that was not durable yet, and the next look would give it at another epoch.
  const weather = storm ? { ...stormOf(seed), crashes: 0 } : calm
  const given = Object.entries(orders).map(([look, give]) => ({ kind: 'order', at: Number(look), give }))
  const ending = new World(plan, seed, weather, ...given).run(3_000)
  expect(ending.status, `seed ${seed}`).toBe('finished')
  const again = replayRecord(fixtureTools(plan), ending.disk, { fromStart: true })
  expect(hex(again.search.digest()), `from the start, seed ${seed}`).toBe(ending.digest)
  const onward = replayRecord(fixtureTools(plan), ending.disk)
  expect(hex(onward.search.digest()), `from snapshots, seed ${seed}`).toBe(ending.digest)
  return ending.engine
}

describe('changing who takes part', () => {
  it('adds islands that search and exchange emigrants', () => {
    for (let seed = 1; seed <= 12; seed++) {
      const engine = endsAlike(seed, seed > 1, {
        20: (now) => now.orderMembership('Two more.', [...all, 6, 7], added),
      })
      const newcomer = engine.search.island(6)
      expect(newcomer.counters.commits).toBeGreaterThan(20)
      expect(newcomer.counters.epochsPassed).toBeGreaterThan(1)
      expect(engine.impurities()).toEqual(['islands-changed'])
    }
  })

  it('pauses islands, which then commit nothing, and continues them', () => {
    for (let seed = 1; seed <= 12; seed++) {
      let before = 0
      const engine = endsAlike(seed, seed > 1, {
        15: (now) => now.orderMembership('Without 3.', [1, 2, 4, 5], []),
        60: (now) => {
          before = now.search.island(3).counters.commits
          now.orderMembership('With 3 again.', all, [])
        },
      })
      expect(engine.search.island(3).counters.commits).toBeGreaterThanOrEqual(before)
      expect(engine.search.island(3).paused).toBe(false)
    }
  })

  it('finishes with an island paused for good', () => {
    const engine = endsAlike(3, true, { 10: (now) => now.orderMembership('Without 2.', [1, 3, 4, 5], []) })
    expect(engine.search.island(2).paused).toBe(true)
    expect(engine.search.island(2).counters.committedSimulations).toBeLessThan(engine.search.island(2).quota)
  })

  it('adds, pauses and enlarges the budget in one search', () => {
    for (let seed = 1; seed <= 8; seed++) {
      endsAlike(seed, true, {
        12: (now) => now.orderBudget('More.', 1_000),
        30: (now) => now.orderMembership('Two more.', [...all, 6, 7], added),
        45: (now) => now.orderMembership('Without 1.', [2, 3, 4, 5, 6, 7], []),
        70: (now) => now.orderBudget('Still more.', 1_200),
      })
    }
  })
})
