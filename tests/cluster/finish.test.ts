// Promise: however a search is made to end or to go on, by a target, by standing still, by hours or by a changed
// budget, it does the same whatever the order in which results come in, after any crash, and again from its journal.
// To repeat one storm: SKERRY_SEED=123 npx vitest run tests/cluster/finish.test.ts

import { describe, expect, it } from 'vitest'
import { replayRecord } from '../../coordinator/engine/recover.js'
import { targetReached } from '../../coordinator/engine/targets.js'
import type { WorldFact } from '../../coordinator/engine/world-facts.js'
import type { Island } from '../../coordinator/evolution/island.js'
import { topologies } from '../../coordinator/evolution/migration.js'
import type { SearchPlan, Topology } from '../../coordinator/evolution/plan.js'
import { quotasOf, Search } from '../../coordinator/evolution/search.js'
import { hex } from '../../shared/digests.js'
import { firstControl } from '../../shared/ids.js'
import { fixtureResults, gateOf } from '../drive-search.js'
import { fixtureTools, islandPlan, mixedPlan } from '../fixture.js'
import { calm, type Ending, type Order, stormOf, World } from './world.js'

const seeds = process.env.SKERRY_SEED
  ? [Number(process.env.SKERRY_SEED)]
  : Array.from({ length: 8 }, (_, at) => at + 1)
/** In metres: what the first objective is to fall to. Some of these searches reach it, none at once. */
const target = 0.12
const repeat = (seed: number) => `repeat with SKERRY_SEED=${seed} npx vitest run tests/cluster/finish.test.ts`

const control = islandPlan(firstControl, { method: 'drift', lookahead: 8 })
const smallPlan = (changes: Partial<SearchPlan> = {}) =>
  mixedPlan({ budget: { simulations: 500 }, controls: [control], ...changes })

/** The journal leads to where the engine stands, from the start and from the newest snapshots. */
function assertReplays({ disk, digest }: Ending, plan: SearchPlan, what: string): void {
  for (const fromStart of [true, false]) {
    const { search } = replayRecord(fixtureTools(plan), disk, { fromStart })
    expect(hex(search.digest()), `${fromStart ? 'from the start' : 'from snapshots'}, ${what}`).toBe(digest)
  }
}

/** The same ending in every storm. */
function assertOneEnding(plan: SearchPlan, ...orders: readonly Order[]): Ending {
  const reference = new World(plan, 1, calm, ...orders).run(0)
  expect(reference.status).toBe('finished')
  assertReplays(reference, plan, 'calm')
  for (const seed of seeds) {
    const ending = new World(plan, seed, stormOf(seed), ...orders).run(4_000)
    expect(ending.status, repeat(seed)).toBe('finished')
    expect(ending.digest, repeat(seed)).toBe(reference.digest)
    assertReplays(ending, plan, repeat(seed))
  }
  return reference
}

const usedUp = (island: Island, plan: SearchPlan): boolean =>
  island.counters.committedSimulations > island.quota - plan.replicates.first - 2

describe('a target value', () => {
  const targetPlan = (changes: Partial<SearchPlan> = {}) =>
    smallPlan({ budget: { simulations: 4_000, target }, controls: [], ...changes })

  it('ends all islands that migrate with the same epoch, in every storm', () => {
    const ways: readonly (readonly [Topology, number])[] = [
      ['ring', 1],
      ['two-way-ring', 2],
      ['complete', 1],
    ]
    for (const [topology, lag] of ways) {
      const plan = targetPlan({ migration: { ...mixedPlan().migration!, topology, lag, everyRounds: 4 } })
      const { engine } = assertOneEnding(plan)
      const epochs = engine.search.islands.map((island) => island.counters.epochsPassed)
      expect(new Set(epochs).size, `${topology} ${lag}: ${epochs}`).toBe(1)
      // Long enough for the word of it to reach everybody.
      expect(epochs[0]).toBeGreaterThan(topologies[topology].diameter(5)! * lag)
      expect(engine.search.islands.some((island) => usedUp(island, plan))).toBe(false)
      expect(engine.impurities()).toEqual([])
    }
  })

  it('ends an island for itself where the way to the others is not known', () => {
    const plan = targetPlan({ migration: { ...mixedPlan().migration!, topology: 'random', everyRounds: 4 } })
    assertOneEnding(plan)
  })

  it('is met by the best on all its replicates', () => {
    const plan = targetPlan()
    const { engine } = new World(plan, 1, calm).run(0)
    const best = engine.search.islands.map((island) => island.best!)
    expect(
      best.some(({ score, replicates }) => score[0]! <= target && replicates === plan.replicates.most),
    ).toBe(true)
  })

  /**
   * Drives the islands without an engine, one preferred to the others: it goes as far as it can before anybody else
   * moves. Finishes are ordered as the engine orders them.
   */
  function digestWhenFirst(
    plan: SearchPlan,
    preferred: number,
  ): { digest: string; epochs: number[]; ordered: number } {
    const search = new Search(fixtureTools(plan))
    let ordered = 0
    let held = true
    const finishes = new Set<string>()
    const results = fixtureResults(plan)
    const gate = gateOf(
      (island, ticket) => (held && island.number !== preferred ? undefined : results(island, ticket)),
      {
        committed: (island, { individual }) => {
          if (!targetReached(plan, island) || individual !== island.best) return
          const { island: whom, epoch } = search.finishEpochAfterTarget(island)
          ordered++
          for (const one of whom === 0 ? search.islands : [island]) finishes.add(`${one.number} ${epoch}`)
        },
        factsAtEpoch: (island, epoch) => {
          if (finishes.has(`${island.number} ${epoch}`)) island.end()
        },
      },
    )
    for (let look = 0; look < 100_000 && search.islands.some((island) => !island.ended); look++) {
      held = true
      search.advance(search.island(preferred), gate)
      held = false
      // Then one step of the others at most, so that the preferred one is always ahead.
      const one = search.islands[look % search.islands.length]!
      let steps = 0
      search.advance(one, { ...gate, mayCommit: () => one.number === preferred || steps++ === 0 })
    }
    return {
      digest: hex(search.digest()),
      epochs: search.islands.map(({ counters }) => counters.epochsPassed),
      ordered,
    }
  }

  it('ends the same way whoever is ahead of the others', () => {
    for (const topology of ['ring', 'two-way-ring', 'complete'] satisfies Topology[]) {
      const plan = targetPlan({ migration: { ...mixedPlan().migration!, topology, everyRounds: 4 } })
      const ends = plan.islands.map(({ island }) => digestWhenFirst(plan, island))
      expect(ends[0]!.ordered).toBeGreaterThan(0)
      expect(new Set(ends.map(({ digest }) => digest)).size, topology).toBe(1)
    }
  })

  it('ends the same way whoever is ahead, also when islands in between have ended before', () => {
    const plan = targetPlan({
      islands: [
        islandPlan(1, { lookahead: 8, share: 40 }),
        islandPlan(2, { lookahead: 4, share: 1, population: 4 }),
        islandPlan(3, { lookahead: 2, share: 40 }),
        islandPlan(4, { lookahead: 4, share: 1, population: 4 }),
      ],
      migration: { ...mixedPlan().migration!, topology: 'ring', everyRounds: 3 },
    })
    const ends = plan.islands.map(({ island }) => digestWhenFirst(plan, island))
    expect(ends[0]!.ordered).toBeGreaterThan(0)
    expect(new Set(ends.map(({ digest }) => digest)).size).toBe(1)
  })
})

describe('a target when fewer replicates were ordered', () => {
  it('is met on all that the best may still get', () => {
    const plan = smallPlan({ budget: { simulations: 4_000, target }, controls: [] })
    const { engine, disk } = new World(plan, 1, calm, mostReplicates(1, 4)).run(0)
    expect([...disk.events()].map(({ kind }) => kind)).toContain('target-reached')
    expect(engine.search.islands.some((island) => usedUp(island, plan))).toBe(false)
  })
})

describe('standing still', () => {
  it('ends an island after so many rounds without a better best, in every storm', () => {
    const plan = smallPlan({ budget: { simulations: 1_600, stagnationRounds: 8 } })
    const { engine } = assertOneEnding(plan)
    const searching = engine.search.islands.filter((island) => !island.isControl)
    const stagnant = searching.filter((island) => !usedUp(island, plan))
    expect(stagnant.length).toBeGreaterThan(0)
    for (const island of stagnant) {
      const { costCommitted, bestSinceCost } = island.counters
      expect(costCommitted - bestSinceCost).toBeGreaterThanOrEqual(8 * island.tools.island.lookahead)
    }
    // A control goes on for as long as it was given.
    expect(usedUp(engine.search.island(firstControl), plan)).toBe(true)
  })
})

/** Orders as coordinator/main.ts and coordinator/cli/join/changes.ts give them. */
function orderOf(kind: string, at: Order['at'], make: (epoch: number, island: Island) => WorldFact): Order {
  return { kind, at, give: (engine) => engine.orderAtEpoch(kind, `${kind}.`, make) }
}
const finish = (at: number) => orderOf('budget-used', at, (epoch) => ({ fact: 'finish', epoch }))
const budget = (at: Order['at'], simulations: number): Order => ({
  kind: 'budget-changed',
  at,
  give: (engine) => engine.orderBudget(`The budget is ${simulations} simulations from now on.`, simulations),
})
const mostReplicates = (at: Order['at'], most: number) =>
  orderOf('replicates-changed', at, () => ({ fact: 'most-replicates', most }))

/** Orders given in the middle enter where the search happens to be: each storm has its own ending, which replays. */
function endingsOf(plan: SearchPlan, order: (seed: number) => Order): Ending[] {
  return seeds.map((seed) => {
    const ending = new World(plan, seed, stormOf(seed), order(seed)).run(4_000)
    expect(ending.status, repeat(seed)).toBe('finished')
    assertReplays(ending, plan, repeat(seed))
    return ending
  })
}

describe('hours or a date', () => {
  it('ends every island with the first epoch that none has passed, and replays', () => {
    const plan = smallPlan({ budget: { simulations: 4_000 } })
    const endings = endingsOf(plan, (seed) => finish(20 + 7 * seed))
    let early = 0
    for (const { engine } of endings) {
      expect(engine.impurities()).toEqual(['budget-used'])
      const unfinished = engine.search.islands.filter((island) => !island.isControl && !usedUp(island, plan))
      early += unfinished.length
      expect(new Set(unfinished.map((island) => island.counters.epochsPassed)).size).toBeLessThan(2)
    }
    expect(early).toBeGreaterThan(endings.length)
  })
})

describe('a changed budget', () => {
  const plan = smallPlan()
  const assertSpent = ({ engine }: Ending, simulations: number, what: string) => {
    const quotas = quotasOf(plan, simulations)
    for (const island of engine.search.islands) {
      expect(island.quota, `quota of ${island.number}, ${what}`).toBe(quotas.get(island.number))
      expect(usedUp(island, plan), `island ${island.number} spent its quota, ${what}`).toBe(true)
    }
  }

  it('enlarged after the end: the search goes on, the same in every storm', () => {
    const ending = assertOneEnding(plan, budget('the end', 900))
    assertSpent(ending, 900, 'calm')
  })

  it('enlarged in the middle: it replays, and every island that takes it in spends it', () => {
    const quotas = quotasOf(plan, 900)
    let enlarged = 0
    for (const { engine } of endingsOf(plan, (seed) => budget(3 + 4 * seed, 900))) {
      for (const island of engine.search.islands) {
        expect(usedUp(island, plan)).toBe(true)
        if (island.quota === quotas.get(island.number)) enlarged++
      }
    }
    expect(enlarged).toBeGreaterThan(5 * seeds.length)
  })

  it('enlarged in the middle: an island about to end spends its part too', () => {
    const shares = [1, 12]
    const uneven = {
      ...plan,
      controls: [],
      islands: shares.map((share, at) => islandPlan(at + 1, { lookahead: 4, share })),
    }
    for (let look = 32; look <= 46; look++) {
      const { engine } = new World(uneven, 1, calm, budget(look, 900)).run(0)
      for (const island of engine.search.islands) {
        expect(usedUp(island, uneven), `island ${island.number}, ordered at look ${look}`).toBe(true)
        expect(island.quota, `island ${island.number}, ordered at look ${look}`).toBe(
          quotasOf(uneven, 900).get(island.number),
        )
      }
    }
  })

  it('made smaller in the middle: nobody begins more, and it replays', () => {
    const endings = endingsOf(plan, (seed) => budget(3 + seed, 300))
    for (const { engine } of endings) {
      const total = engine.search.islands.reduce(
        (sum, island) => sum + (island.isControl ? 0 : island.counters.committedSimulations),
        0,
      )
      expect(total).toBeLessThanOrEqual(500)
    }
  })

  const reached = smallPlan({ budget: { simulations: 1_200, target } })
  const steady = {
    ...reached,
    islands: [1, 2, 3].map((island) => islandPlan(island, { lookahead: 3 * island, share: island })),
  }

  it('after a target was reached: the search goes on from there', () => {
    const once = new World(steady, 1, calm).run(0)
    const { engine } = assertOneEnding(steady, budget('the end', 2_000))
    expect(engine.impurities()).toEqual(['budget-changed'])
    for (const island of engine.search.islands) {
      const before = once.engine.search.island(island.number).counters.commits
      expect(island.counters.commits).toBeGreaterThan(before)
    }
  })

  it('after a target was reached: it is reached again and ends the search again, also after crashes', () => {
    const again = { ...steady, seed: 3, controls: [], budget: { simulations: 1_500, target } }
    const order = budget('the end', 4_000)
    const reference = new World(again, 1, calm, order).run(0)
    const finishes = [...reference.disk.events()].filter(({ kind }) => kind === 'target-reached')
    expect(new Set(finishes.map(({ epoch }) => epoch)).size).toBeGreaterThan(1)
    const ending = new World(again, 1, { ...stormOf(1), crashes: 60 }, order).run(4_000)
    expect(ending.digest).toBe(reference.digest)
  })

  it('after a target was reached: methods of generations go on too', () => {
    assertOneEnding(reached, budget('the end', 2_000))
  })
})

describe('more replicates for the best', () => {
  it('ordered in the middle: given from then on, and it replays', () => {
    const plan = smallPlan({ budget: { simulations: 1_500 } })
    const endings = endingsOf(plan, (seed) => mostReplicates(3 + 2 * seed, 10))
    const most = endings.flatMap(({ engine }) =>
      engine.search.islands.map(({ best }) => best?.replicates ?? 0),
    )
    expect(Math.max(...most)).toBeGreaterThan(plan.replicates.most)
    expect(Math.max(...most)).toBeLessThanOrEqual(10)
  })

  it('ordered after the end: changes nothing before there is budget for it', () => {
    const plan = smallPlan()
    const before = new World(plan, 1, calm).run(0)
    const after = assertOneEnding(plan, mostReplicates('the end', 10))
    expect(after.digest).toBe(before.digest)
  })
})
