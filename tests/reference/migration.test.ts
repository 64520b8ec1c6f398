// Migration against theory: how fast one best individual spreads, and what migration adds to selection. Numbers are
// exact (graph distances, an absorbing Markov chain, normal integrals), recomputed here where that is short.
// Seeds were chosen beforehand: 23000 and on; bands are four standard errors.

import { describe, expect, test } from 'vitest'
import { searchTools } from '../../coordinator/evolution/build.js'
import { columnsOf } from '../../coordinator/evolution/estimate.js'
import type { Island } from '../../coordinator/evolution/island.js'
import { topologies, torusShape } from '../../coordinator/evolution/migration.js'
import type { IslandPlan, MigrationPlan, SearchPlan, Topology } from '../../coordinator/evolution/plan.js'
import { idOf } from '../../shared/ids.js'
import type { EvaluationResult } from '../../shared/result.js'
import { stream } from '../../shared/streams.js'
import { drivenSearch, gateOf } from '../drive-search.js'
import { islandPlan, mixedPlan } from '../fixture.js'
import { chiSquare, estimateOf } from './drive.js'

// How many islands a single best individual has reached after 0, 1, 2, ... migrations, when the best is sent each
// time and always taken in. Takeover bounds for rings and any graph: Rudolph, Takeover time in parallel populations
// with migration (2006); growth curves: Alba and Luque, Growth curves and takeover time in distributed
// evolutionary algorithms (2004). Counts are those of the graphs, exact.
const spreads: readonly (readonly [Topology, number, readonly number[]])[] = [
  ['ring', 5, [1, 2, 3, 4, 5]],
  ['ring', 8, [1, 2, 3, 4, 5, 6, 7, 8]],
  ['two-way-ring', 8, [1, 3, 5, 7, 8]],
  ['two-way-ring', 9, [1, 3, 5, 7, 9]],
  ['torus-4', 16, [1, 5, 11, 15, 16]],
  ['torus-4', 25, [1, 5, 13, 21, 25]],
  ['torus-4', 64, [1, 5, 13, 25, 39, 51, 59, 63, 64]],
  ['torus-8', 25, [1, 9, 25]],
  ['torus-8', 64, [1, 9, 25, 49, 64]],
  ['complete', 2, [1, 2]],
  ['complete', 12, [1, 12]],
]

/** Islands reached after each migration, from the table of sources alone. */
function spreadBySources(topology: Topology, islands: number, from: number): number[] {
  const { sources } = topologies[topology]
  let reached = new Set([from])
  const counts = [1]
  for (let epoch = 1; reached.size < islands; epoch++) {
    const next = new Set(reached)
    for (let position = 0; position < islands; position++) {
      if (sources(islands, position, epoch, 23_000).some((source) => reached.has(source))) next.add(position)
    }
    reached = next
    counts.push(reached.size)
  }
  return counts
}

function planOf(
  islands: number,
  migration: MigrationPlan,
  island: Partial<IslandPlan>,
  budget: SearchPlan['budget'],
): SearchPlan {
  return mixedPlan({
    seed: 23_000,
    islands: Array.from({ length: islands }, (_, at) => islandPlan(at + 1, { ...island, share: 1 })),
    controls: [],
    migration,
    replicates: { first: 1, topUp: 0, most: 1, shared: true },
    budget,
  })
}

const equalCosts = (plan: SearchPlan) =>
  searchTools(plan, { expectedCost: () => 1, repair: (genome) => genome })

/** A result that says this of the first objective and nothing of the others. */
function resultWith(plan: SearchPlan, error: number): EvaluationResult {
  const values = new Float64Array(columnsOf(plan.problem))
  values[0] = error
  return { values, failures: [] }
}

describe('one best individual spreads as the graph says', () => {
  test.each(spreads)('%s of %i islands, by the sources, from every island', (topology, islands, counts) => {
    for (let from = 0; from < islands; from += islands > 30 ? 9 : 1) {
      expect(spreadBySources(topology, islands, from)).toEqual(counts)
    }
    expect(topologies[topology].diameter(islands)).toBe(counts.length - 1)
  })

  test.each([
    ['ring', 6, 1],
    ['ring', 5, 3],
    ['two-way-ring', 8, 1],
    ['two-way-ring', 9, 2],
    ['torus-4', 16, 1],
    ['torus-8', 25, 1],
    ['torus-4', 25, 2],
    ['complete', 7, 2],
  ] as const)('%s of %i islands, a whole search with a lag of %i', (topology, islands, lag) => {
    const counts = spreads.find(([name, count]) => name === topology && count === islands)?.[2]
    const table = counts ?? spreadBySources(topology, islands, 0)
    const firstSeen = spreadInSearch(topology, islands, lag)
    table.forEach((count, migrations) => {
      // Sent at the end of one epoch, taken in `lag` epochs later, sent on at once.
      const epoch = 1 + migrations * lag
      const seen = [...firstSeen.values()].filter((first) => first <= epoch)
      expect(seen.length, `after ${migrations} migrations`).toBe(count)
      const before = [...firstSeen.values()].filter((first) => first < epoch)
      expect(before.length, `before migration ${migrations}`).toBe(
        migrations === 0 ? 0 : table[migrations - 1],
      )
    })
  })

  /** The epoch at whose end each island had the best individual first: island 1's first, better than all others. */
  function spreadInSearch(topology: Topology, islands: number, lag: number): Map<number, number> {
    const epochs = 1 + (islands - 1) * lag
    const migration = { everyRounds: 3, emigrants: 1, topology, lag, leave: 'best', arrive: 'worst' } as const
    const island = { population: 3, lookahead: 2 }
    const plan = planOf(islands, migration, island, { simulations: islands * epochs * 3 * 2 })
    const best = idOf(1, 1)
    const firstSeen = new Map<number, number>()
    const gate = gateOf((_island, { individual }) => resultWith(plan, individual.id === best ? -1 : 1), {
      factsAtEpoch: (one, epoch) => {
        const has = one.members().some(({ id }) => id === best)
        if (has && !firstSeen.has(one.number)) firstSeen.set(one.number, epoch)
      },
    })
    const search = drivenSearch(plan, gate, equalCosts(plan))
    for (const { counters } of search.islands) expect(counters.epochsPassed).toBe(epochs)
    return firstSeen
  }
})

describe('each island pulls from one other, drawn evenly', () => {
  /** Expected migrations until all have it: i of k islands have it, each other one pulls it with chance i/(k-1). */
  function exactPull(islands: number): number {
    const expected = new Array<number>(islands + 1).fill(0)
    for (let has = islands - 1; has >= 1; has--) {
      const others = islands - has
      const p = has / (islands - 1)
      let sum = 1
      let stays = 0
      let ways = 1
      for (let more = 0; more <= others; more++) {
        const chance = ways * p ** more * (1 - p) ** (others - more)
        if (more === 0) stays = chance
        else sum += chance * expected[has + more]!
        ways = (ways * (others - more)) / (more + 1)
      }
      expected[has] = sum / (1 - stays)
    }
    return expected[1]!
  }

  // Random pull is the broadcasting scheme of epidemic algorithms (Demers and others, Epidemic algorithms for
  // replicated database maintenance, 1987, from memory); expectations from the absorbing chain above.
  test.each([
    [8, 4.52623619],
    [16, 6.1403448],
    [32, 7.60791727],
    [64, 8.96372476],
  ])('%i islands: %d migrations until all have the best', (islands, expected) => {
    expect(Math.abs(exactPull(islands) - expected)).toBeLessThan(1e-8)
    const { sources } = topologies.random
    const times: number[] = []
    for (let run = 0; run < 12_000 / islands; run++) {
      let has = new Set([run % islands])
      let migrations = 0
      for (; has.size < islands; migrations++) {
        const next = new Set(has)
        for (let position = 0; position < islands; position++) {
          const [source] = sources(islands, position, migrations + 1, 23_000 + run)
          if (has.has(source!)) next.add(position)
        }
        has = next
      }
      times.push(migrations)
    }
    const { mean, band } = estimateOf(times)
    expect(Math.abs(mean - expected)).toBeLessThan(band)
    expect(band).toBeLessThan(0.1 * expected)
  })

  test('every other island is drawn as often as any, never oneself', () => {
    const islands = 10
    for (const position of [0, 4, 9]) {
      const drawn = new Array<number>(islands).fill(0)
      for (let epoch = 1; epoch <= 9_000; epoch++) {
        const from = topologies.random.sources(islands, position, epoch, 23_001)
        expect(from.length).toBe(1)
        drawn[from[0]!]!++
      }
      expect(drawn[position]).toBe(0)
      drawn.splice(position, 1)
      // 0.9999 quantile of chi-square with 8 degrees of freedom.
      expect(chiSquare(drawn, new Array<number>(9).fill(1 / 9))).toBeLessThan(31.83)
    }
  })
})

// What migration adds to the mean of a normal population, in standard deviations, with a share rho of emigrants from
// each of delta neighbours; z_q is the normal quantile of 1 - q, phi the density:
//   best leave, random seats   delta phi(z_rho)
//   random leave, worst seats  phi(z_(delta rho))
//   best leave, worst seats    the sum of both
// Cantu-Paz, Migration policies, selection pressure, and parallel evolutionary algorithms (2001) derives such
// intensities; these forms were derived from truncation selection and agree with simulation.
describe('selection intensity that migration adds', () => {
  const phi = (z: number) => Math.exp((-z * z) / 2) / Math.sqrt(2 * Math.PI)
  /** Normal quantiles of 1 - q, recomputed to 40 digits. */
  const quantiles: Readonly<Record<number, number>> = {
    0.01: 2.326347874040841,
    0.05: 1.644853626951472,
    0.1: 1.2815515655446,
    0.2: 0.841621233572914,
  }
  const added = (share: number) => phi(quantiles[share]!)

  /**
   * The same in a population of finite size: Burrows, Expected selection differentials for directional selection
   * (1972, from memory), I - (1 - q) / (2 q (N + 1) I).
   */
  const addedOf = (share: number) => {
    const intensity = added(share) / share
    return share * (intensity - (1 - share) / (2 * share * (population + 1) * intensity))
  }
  const population = 300

  test('the formulas give the tabulated values', () => {
    expect(added(0.05)).toBeCloseTo(0.1031356404, 9)
    // Best leave, worst seats, one neighbour: 0.01, 0.05 and 0.10.
    expect(2 * added(0.01)).toBeCloseTo(0.0533042844, 9)
    expect(2 * added(0.05)).toBeCloseTo(0.2062712808, 9)
    expect(2 * added(0.1)).toBeCloseTo(0.3509966639, 9)
    // Two neighbours, 0.05 and 0.10; four neighbours, 0.05.
    expect(2 * added(0.05) + added(0.1)).toBeCloseTo(0.3817696127, 9)
    expect(2 * added(0.1) + added(0.2)).toBeCloseTo(0.6309585843, 9)
    expect(4 * added(0.05) + added(0.2)).toBeCloseTo(0.6925044819, 9)
  })

  interface How extends Pick<MigrationPlan, 'leave' | 'arrive'> {
    readonly topology: 'ring' | 'two-way-ring' | 'torus-4'
    readonly share: number
  }
  const rows: readonly (readonly [How['leave'], How['arrive'], How['topology'], number, number])[] = [
    ['best', 'worst', 'ring', 1, 0.01],
    ['best', 'worst', 'ring', 1, 0.05],
    ['best', 'if-better', 'ring', 1, 0.1],
    ['best', 'random', 'ring', 1, 0.05],
    ['random', 'worst', 'ring', 1, 0.05],
    ['best', 'worst', 'two-way-ring', 2, 0.05],
    ['best', 'random', 'two-way-ring', 2, 0.1],
    ['random', 'worst', 'two-way-ring', 2, 0.1],
    ['best', 'worst', 'torus-4', 4, 0.05],
  ]
  test.each(rows)(
    '%s leave, seats: %s, %s (%i neighbours), share %d',
    (leave, arrive, topology, neighbours, share) => {
      const gained = neighbours * (leave === 'best' ? addedOf(share) : 0)
      const expected = gained + (arrive === 'random' ? 0 : addedOf(neighbours * share))
      const { mean, band } = estimateOf(gains({ leave, arrive, topology, share }))
      expect(Math.abs(mean - expected)).toBeLessThan(band)
      expect(band).toBeLessThan(0.1 * expected)
    },
  )

  test('random leave, random seats: nothing', () => {
    const { mean, band } = estimateOf(
      gains({ leave: 'random', arrive: 'random', topology: 'ring', share: 0.1 }),
    )
    expect(Math.abs(mean)).toBeLessThan(band)
    expect(band).toBeLessThan(0.02)
  })

  /** By how much the mean of a population grows in one migration through real islands; one number a search. */
  function gains(how: How): number[] {
    return Array.from({ length: 40 }, (_, run) => gainOfSearch(how, 23_100 + run))
  }

  function gainOfSearch({ share, ...how }: How, seed: number): number {
    const islands = { ring: 3, 'two-way-ring': 4, 'torus-4': 9 }[how.topology]
    const lookahead = 100
    // Epoch 1 ends with the founders; all later births fail and take no seat, so epoch 2 ends as it began.
    const migration = {
      ...how,
      everyRounds: population / lookahead,
      emigrants: Math.round(share * population),
      lag: 1,
    }
    const budget = { simulations: islands * 2 * population }
    const plan = { ...planOf(islands, migration, { population, lookahead }, budget), seed }
    const width = columnsOf(plan.problem)
    const failed = { values: new Float64Array(width), failures: [{ simulation: 0, reason: 'a child' }] }
    let gained = 0
    const gate = gateOf(
      ({ number }, { evaluation }) =>
        evaluation > population
          ? failed
          : resultWith(plan, stream(seed, 'spare', number, evaluation).normal()),
      {
        // Scores are minimised: what falls is a gain.
        factsAtEpoch: (island, epoch) => {
          gained += epoch === 1 ? meanScore(island) : -meanScore(island)
        },
      },
    )
    for (const { counters } of drivenSearch(plan, gate, equalCosts(plan)).islands)
      expect(counters.epochsPassed).toBe(2)
    return gained / islands
  }

  const meanScore = (island: Island) => {
    const members = island.members()
    expect(members.length).toBe(population)
    return members.reduce((sum, { score }) => sum + score[0]!, 0) / members.length
  }
})

describe('how many islands a topology takes', () => {
  test('at least two', () => {
    for (const name of ['ring', 'two-way-ring', 'complete', 'random'] as const) {
      expect(topologies[name].misfit(1)).toBe('migration needs at least 2 islands')
      for (const islands of [2, 3, 7, 1_000]) expect(topologies[name].misfit(islands)).toBeUndefined()
    }
  })

  test('a torus needs rows and columns, and takes the shape nearest to a square', () => {
    for (const name of ['torus-4', 'torus-8'] as const) {
      for (const islands of [1, 2, 3, 5, 7, 11, 13, 997]) {
        expect(topologies[name].misfit(islands)).toBe(
          `a torus needs rows times columns islands, both at least 2; ${islands} cannot be split so`,
        )
      }
      for (const islands of [4, 6, 8, 9, 12, 16, 1_000])
        expect(topologies[name].misfit(islands)).toBeUndefined()
    }
    expect([4, 6, 12, 16, 24, 26].map(torusShape)).toEqual([
      [2, 2],
      [2, 3],
      [3, 4],
      [4, 4],
      [4, 6],
      [2, 13],
    ])
  })

  test('sources are others, each once, in order, and on a fixed graph every link goes both ways except on a ring', () => {
    for (const [name, row] of Object.entries(topologies)) {
      for (const islands of [2, 3, 4, 6, 9, 12, 16]) {
        if (row.misfit(islands)) continue
        const all = Array.from({ length: islands }, (_, position) =>
          row.sources(islands, position, 1, 23_002),
        )
        all.forEach((sources, position) => {
          expect(sources.length).toBeGreaterThan(0)
          expect(sources).toEqual([...new Set(sources)].sort((a, b) => a - b))
          expect(sources).not.toContain(position)
          expect(sources.every((source) => source >= 0 && source < islands)).toBe(true)
          if (name === 'ring' || name === 'random') return
          for (const source of sources) expect(all[source]).toContain(position)
        })
      }
    }
  })
})
