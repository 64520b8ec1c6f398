// Promise: with machines that give wrong results, nobody honest is shut out, no wrong best is reported, and where no
// lie entered the digest is that of a calm day; whatever becomes of the fleet, the search comes to its end.
// Sizes: SKERRY_TRUST (searches of the first figure, default 1000; the others in proportion). Seeds are 1, 2, 3, ...
// To repeat one: SKERRY_SEED=123 npx vitest run tests/cluster/trust.test.ts

import { describe, expect, it } from 'vitest'
import type { SearchPlan } from '../../coordinator/evolution/plan.js'
import { hex } from '../../shared/digests.js'
import { Refusal } from '../../shared/refusals.js'
import { stream } from '../../shared/streams.js'
import { fixtureProblem, islandPlan, mixedPlan, simulated } from '../fixture.js'
import { type FleetWeather, otherBits, steady } from './machines.js'
import { calm, type Ending, stormOf, type Weather, World } from './world.js'

const size = Number(process.env.SKERRY_TRUST ?? 1000)
const one = process.env.SKERRY_SEED
const seedsOf = (part: number) =>
  one ? [Number(one)] : Array.from({ length: Math.ceil(size / part) }, (_, at) => at + 1)
const repeat = (seed: number) => `repeat with SKERRY_SEED=${seed} npx vitest run tests/cluster/trust.test.ts`

/** Two small islands that migrate; a search of a few milliseconds. */
const plan = mixedPlan({
  islands: [
    islandPlan(1, { population: 8, lookahead: 8, share: 1 }),
    islandPlan(2, { method: 'generational', population: 8, lookahead: 8, share: 1, order: 'cost' }),
  ],
  controls: [],
  migration: { everyRounds: 4, emigrants: 1, topology: 'ring', lag: 1, leave: 'best', arrive: 'worst' },
  replicates: { first: 1, topUp: 1, most: 3, shared: true },
  budget: { simulations: 120 },
})
const long: SearchPlan = { ...plan, budget: { simulations: 1_400 } }

const inFleet = (fleet: Partial<FleetWeather>, weather: Weather = calm): Weather => ({
  ...weather,
  fleet: { ...steady, ...fleet },
})

function truth(of: SearchPlan, ending: Ending, island: number): readonly number[] {
  const best = ending.engine.search.island(island).best!
  const result = simulated(of, best.genome, 0, best.replicates)
  const onOther = ending.engine.notUsed.pinned === 'x64 B'
  return [...(onOther ? otherBits(result) : result).values]
}

function wrongBests(of: SearchPlan, ending: Ending): string[] {
  return ending.engine.search.islands.flatMap(({ number, best }) =>
    best && [...best.values].join() !== truth(of, ending, number).join() ? [`island ${number}`] : [],
  )
}

const events = ({ disk }: Ending, kind: string) => [...disk.events()].filter((event) => event.kind === kind)
const hostsOut = (ending: Ending) =>
  events(ending, 'host-shut-out').map(({ data }) => (data as { host: string }).host)

/** Who was shut out and is not bad: nobody. */
function innocent(ending: Ending): string[] {
  const bad = new Set(ending.machines!.all.filter(({ isBad }) => isBad).map(({ host }) => host))
  const workers = events(ending, 'worker-shut-out').map(({ data }) => (data as { host: string }).host)
  return [...hostsOut(ending), ...workers].filter((host) => !bad.has(host))
}

describe('with bad machines', () => {
  it(`reports no wrong best in ${size} searches with 1 % bad nodes, and shuts out nobody honest`, () => {
    let lies = 0
    let convicted = 0
    for (const seed of seedsOf(1)) {
      // 100 machines of which one is bad: always, at 10 % or at 1 %; its lies are as often too good as too bad.
      const wrong = [1000, 100, 10][seed % 3]!
      const lie = (['random', 'alike'] as const)[seed % 2]!
      const ending = new World(plan, seed, inFleet({ hosts: 100, threads: 1, bad: 1, wrong, lie })).run(4_000)
      expect(ending.status, repeat(seed)).toBe('finished')
      expect(wrongBests(plan, ending), repeat(seed)).toEqual([])
      expect(innocent(ending), repeat(seed)).toEqual([])
      lies += ending.lies
      convicted += hostsOut(ending).length
    }
    if (!one) expect(lies).toBeGreaterThan(size / 3)
    if (!one) expect(convicted).toBeGreaterThan(0)
  }, 600_000)

  it('convicts a machine that is always wrong within 200 of its results, in 95 % of runs', () => {
    let slow = 0
    const seeds = seedsOf(5)
    for (const seed of seeds) {
      // The hardest lies: never a would-be best, so that only spot checks find them.
      const fleet = { hosts: 5, threads: 1, bad: 1, wrong: 1000, lie: 'slight' } as const
      const ending = new World(long, seed, inFleet(fleet)).run(20_000)
      expect(innocent(ending), repeat(seed)).toEqual([])
      const [bad] = ending.machines!.all.filter(({ isBad }) => isBad)
      if (!hostsOut(ending).includes(bad!.host) || ending.lies > 200) slow++
    }
    // 0.98 to the power of 200 is 0.018: a run in fifty may be longer, one in twenty is allowed.
    expect(slow / seeds.length).toBeLessThanOrEqual(0.05)
  }, 600_000)

  it('has the digest of a calm day wherever no lie was used, in every storm', () => {
    const reference = new World(plan, 1, calm).run(0).digest
    let same = 0
    for (const seed of seedsOf(10)) {
      const draw = stream(seed, 'weather', 12)
      const wrong = [1000, 100, 10][draw.below(3)]!
      const lie = (['random', 'alike', 'slight'] as const)[draw.below(3)]!
      const { fleet = steady, ...storm } = stormOf(seed)
      const bad = { ...fleet, hosts: 5 + draw.below(10), threads: 2, bad: 1, wrong, lie, inTheEnd: 3 }
      const ending = new World(plan, seed, inFleet(bad, storm)).run(4_000)
      expect(ending.status, repeat(seed)).toBe('finished')
      expect(wrongBests(plan, ending), repeat(seed)).toEqual([])
      expect(innocent(ending), repeat(seed)).toEqual([])
      if (ending.liesUsed > 0 || ending.engine.impurities().length > 0) continue
      same++
      expect(ending.digest, repeat(seed)).toBe(reference)
    }
    if (!one) expect(same).toBeGreaterThan(size / 100)
  }, 600_000)

  it('canary: two machines that tell the same lie are believed, and the check above sees it', () => {
    const seeds = Array.from({ length: 20 }, (_, at) => at + 1)
    const seen = seeds.filter((seed) => {
      const fleet = { hosts: 3, threads: 2, bad: 3, wrong: 1000, lie: 'together' } as const
      return wrongBests(plan, new World(plan, seed, inFleet(fleet)).run(4_000)).length > 0
    })
    expect(seen.length).toBeGreaterThan(10)
  })
})

describe('a problem that does not repeat', () => {
  it('is refused by its name, and no machine is blamed', () => {
    for (const seed of seedsOf(50)) {
      // Every machine gives something else each time it is asked.
      const world = new World(plan, seed, inFleet({ hosts: 12, threads: 2, bad: 12, wrong: 1000 }))
      let refused: unknown
      try {
        world.run(4_000)
      } catch (fault) {
        refused = fault
      }
      expect(refused, repeat(seed)).toMatchObject({ code: 'not-deterministic' })
      expect((refused as Refusal).detail, repeat(seed)).toContain(fixtureProblem.name)
      const kinds = [...world.disk.events()].map(({ kind }) => kind)
      expect(kinds, repeat(seed)).not.toContain('host-shut-out')
      expect(kinds, repeat(seed)).not.toContain('worker-shut-out')
    }
  })

  it('now and then is refused as well, when more machines than can be faulty seem to be wrong', () => {
    const seeds = seedsOf(100)
    const refused = seeds.filter((seed) => {
      try {
        new World(long, seed, inFleet({ hosts: 8, threads: 2, bad: 8, wrong: 200 })).run(4_000)
        return false
      } catch (fault) {
        return fault instanceof Refusal && fault.code === 'not-deterministic'
      }
    })
    expect(refused.length).toBe(seeds.length)
  })
})

describe('with two classes of processors', () => {
  it('that give other last bits the search is pinned to one, and no machine is to blame', () => {
    let pinned = 0
    let afterCommits = 0
    for (const seed of seedsOf(10)) {
      const storm = seed % 2 === 0 ? calm : stormOf(seed)
      const fleet = { hosts: 20, threads: 2, minority: 10, otherBits: true, inTheEnd: 20 }
      const ending = new World(long, seed, inFleet(fleet, storm)).run(8_000)
      expect(ending.status, repeat(seed)).toBe('finished')
      expect(innocent(ending), repeat(seed)).toEqual([])
      const { pinned: to } = ending.engine.notUsed
      if (to !== undefined) pinned++
      else continue
      // Before the first commit it changes nothing: the search is the one of that class from the start.
      const changed = [...ending.disk.events()].some(
        ({ kind, changesSearch }) => kind === 'pinned-to-processor' && changesSearch,
      )
      if (changed) afterCommits++
      expect(ending.engine.impurities().includes('pinned-to-processor'), repeat(seed)).toBe(changed)
      expect(wrongBests(long, ending), repeat(seed)).toEqual([])
    }
    if (one) return
    expect(pinned).toBeGreaterThan(size / 20)
    expect(afterCommits).toBeGreaterThan(0)
  }, 600_000)

  it('and a bad machine in either, the bad one is found and nobody else', () => {
    for (const seed of seedsOf(10)) {
      const fleet = { hosts: 20, threads: 2, minority: 20, bad: 1, wrong: 1000, lie: 'random' } as const
      const ending = new World(plan, seed, inFleet(fleet)).run(4_000)
      expect(ending.status, repeat(seed)).toBe('finished')
      expect(innocent(ending), repeat(seed)).toEqual([])
      expect(wrongBests(plan, ending), repeat(seed)).toEqual([])
      expect(ending.engine.notUsed.pinned, repeat(seed)).toBeUndefined()
    }
  }, 600_000)

  it('a problem that is exact on one only is searched on one from the start, and stays pure', () => {
    const problem = { ...fixtureProblem, exactness: 'bits-per-processor' } as const
    const exact = { ...plan, problem }
    const digests = seedsOf(100).map((seed) => {
      const fleet = { hosts: 10, threads: 2, minority: 30, otherBits: true }
      const ending = new World(exact, seed, inFleet(fleet)).run(4_000)
      expect(ending.engine.notUsed.pinned, repeat(seed)).toBe('x64 A')
      expect(ending.engine.impurities(), repeat(seed)).toEqual([])
      return ending.digest
    })
    expect(new Set(digests).size).toBe(1)
  })

  it('of which the pinned one goes away, the other is used after a while', () => {
    const problem = { ...fixtureProblem, exactness: 'bits-per-processor' } as const
    const exact = { ...plan, problem }
    const fleet = { hosts: 10, threads: 2, minority: 30, otherBits: true, onlyOther: true }
    const ending = new World(exact, 1, inFleet(fleet)).run(10)
    expect(ending.status).toBe('finished')
    expect(ending.engine.notUsed.pinned).toBe('x64 B')
    expect(ending.engine.impurities()).toEqual(['pinned-to-processor'])
  })
})

describe('whatever becomes of the fleet', () => {
  it('the search ends: with one machine, with two of two classes, with none for a time', () => {
    const reference = new World(plan, 1, calm).run(0).digest
    for (const seed of seedsOf(20)) {
      const fleet = {
        hosts: 1 + (seed % 4),
        threads: 2,
        minority: 50,
        changes: 300,
        inTheEnd: 1 + (seed % 2),
      }
      const ending = new World(plan, seed, inFleet(fleet)).run(400)
      expect(ending.status, repeat(seed)).toBe('finished')
      expect(ending.digest, repeat(seed)).toBe(reference)
      expect(ending.engine.impurities(), repeat(seed)).toEqual([])
    }
  }, 600_000)

  it('two machines that differ in all they do end it as well, and one result in dispute is set aside', () => {
    for (const seed of seedsOf(50)) {
      const fleet = { hosts: 2, threads: 2, bad: 1, wrong: 1000, lie: 'alike', inTheEnd: 1 } as const
      const ending = new World(plan, seed, inFleet(fleet)).run(4_000)
      expect(ending.status, repeat(seed)).toBe('finished')
      expect(innocent(ending), repeat(seed)).toEqual([])
    }
  }, 600_000)

  it('confirms by a process while there is one machine, and by another when there is one', () => {
    const fleet = { hosts: 4, threads: 2, inTheEnd: 4 }
    const ending = new World(plan, 1, inFleet({ ...fleet, oneFirst: true })).run(40)
    expect(ending.status).toBe('finished')
    for (const { best } of ending.engine.search.islands) {
      for (const { island, evaluation } of best!.blocks) {
        const by = ending.disk.confirmations(island, evaluation).map((row) => row.by)
        expect(by, `${island} ${evaluation}`).toContain('host')
      }
    }
    const all = ending.engine.search.islands.flatMap(({ number }) =>
      Array.from({ length: 80 }, (_, at) => ending.disk.confirmations(number, at + 1)).flat(),
    )
    expect(all.some(({ by }) => by === 'process')).toBe(true)
  })
})

describe('stragglers', () => {
  it('that block an island are simulated elsewhere as well, within 2 %, and change nothing', () => {
    const reference = hex(new World(long, 1, calm).run(0).engine.search.digest())
    let hedges = 0
    for (const seed of seedsOf(100)) {
      const ending = new World(long, seed, inFleet({ hosts: 20, threads: 1, slow: 5 })).run(8_000)
      expect(ending.digest, repeat(seed)).toBe(reference)
      const { counts } = ending.engine
      hedges += counts.hedges
      expect(counts.hedges, repeat(seed)).toBeLessThanOrEqual(0.02 * counts.results)
      expect(counts.disagreements, repeat(seed)).toBe(0)
    }
    expect(hedges).toBeGreaterThan(0)
  })
})

describe('budgets', () => {
  it('count spot checks, bests and hedges apart', () => {
    const { counts } = new World(long, 1, inFleet({})).run(0).engine
    expect(counts.spotChecks).toBeGreaterThan(0)
    expect(counts.spotChecks / counts.results).toBeLessThan(0.05)
    expect(counts.bestChecks).toBeGreaterThan(0)
    expect(counts.rechecks).toBe(0)
    // One may still be under way when the search ends.
    expect(counts.spotChecks + counts.bestChecks).toBeGreaterThanOrEqual(counts.confirmations)
    expect(counts.spotChecks + counts.bestChecks).toBeLessThan(counts.confirmations + 20)
  })
})
