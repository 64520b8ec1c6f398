// Promise: results are committed in a known order. Order 'cost' is held against a cluster of L slots simulated tick
// by tick, which knows nothing of queues or of commits; 'proposal' against plain counting. Also here: where epochs
// end when costs are mixed, and how stale parents are.

import { describe, expect, it } from 'vitest'
import { searchTools } from '../../coordinator/evolution/build.js'
import { columnsOf } from '../../coordinator/evolution/estimate.js'
import type { IslandPlan, SearchPlan } from '../../coordinator/evolution/plan.js'
import type { Ticket } from '../../coordinator/evolution/tickets.js'
import { drivenSearch, fixtureResults, gateOf } from '../drive-search.js'
import { fixtureCost, islandPlan, mixedPlan } from '../fixture.js'
import { estimateOf } from '../reference/drive.js'

interface Job {
  readonly evaluation: number
  readonly cost: number
  readonly founder: boolean
  readonly replicates: number
  /** Expected cost of a first block of this body. */
  readonly bodyCost: number
}
interface Commit extends Job {
  /** Evaluations proposed before this commit. */
  readonly proposedBefore: number
  /** Commits on the island when the individual was proposed. */
  readonly bornAtCommit: number
  readonly costSoFar: number
}
interface History {
  /** In order of proposal. */
  readonly jobs: readonly Job[]
  readonly commits: readonly Commit[]
  /** Island cost when the end of epoch 1, 2, ... was passed. */
  readonly epochs: readonly { readonly cost: number; readonly commits: number }[]
  /** Commits before the last proposal: later the quota is used up. */
  readonly lastProposalAt: number
}

function jobOf({ evaluation, expectedCost, founder, replicates, individual }: Ticket): Job {
  return { evaluation, cost: expectedCost, founder, replicates, bodyCost: fixtureCost(individual.genome) }
}

/** One island alone; costs are drawn per individual with its genome (1 to 10). */
function historyOf(island: Partial<IslandPlan>, changes: Partial<SearchPlan> = {}): History {
  const jobs: Job[] = []
  const commits: Commit[] = []
  const epochs: { cost: number; commits: number }[] = []
  let lastProposalAt = 0
  const plan = mixedPlan({
    islands: [islandPlan(1, island)],
    controls: [],
    replicates: { first: 1, topUp: 0, most: 1, shared: true },
    budget: { simulations: 800 },
    ...changes,
  })
  const gate = gateOf(fixtureResults(plan), {
    released: (_island, tickets) => {
      jobs.push(...tickets.map(jobOf))
      lastProposalAt = commits.length
    },
    committed: ({ counters }, ticket) => {
      commits.push({
        ...jobOf(ticket),
        proposedBefore: jobs.length,
        bornAtCommit: ticket.individual.bornAtCommit,
        costSoFar: counters.costCommitted,
      })
    },
    factsAtEpoch: ({ counters }) =>
      void epochs.push({ cost: counters.costCommitted, commits: counters.commits }),
  })
  drivenSearch(plan, gate)
  return { jobs, commits, epochs, lastProposalAt }
}

/** Births of the first generation and of each after it; nobody begins before all earlier ones are done. */
interface Waves {
  readonly first: number
  readonly later: number
}

/**
 * A cluster of `slots` that works through jobs in their order, tick by tick: a free slot begins the next job at
 * once; a job ends its cost in ticks later. Jobs that end in the same tick are taken in their order.
 */
function simulatedCluster(jobs: readonly Job[], slots: number, { first, later }: Waves): number[] {
  const running: { job: Job; left: number }[] = []
  const finished: number[] = []
  let begun = 0
  const waveOf = ({ evaluation }: Job) => Math.max(0, Math.ceil((evaluation - first) / later))
  const begin = () => {
    while (running.length < slots && begun < jobs.length) {
      const job = jobs[begun]!
      if (running.some((one) => waveOf(one.job) < waveOf(job))) return
      running.push({ job, left: job.cost })
      begun++
    }
  }
  begin()
  while (running.length > 0) {
    for (const one of running) one.left--
    const done = running.filter((one) => one.left === 0).sort((a, b) => a.job.evaluation - b.job.evaluation)
    for (const one of done) {
      finished.push(one.job.evaluation)
      running.splice(running.indexOf(one), 1)
    }
    begin()
  }
  return finished
}

const lookaheads = [1, 2, 3, 7, 16, 40]
const population = 10
/** Steady state and age-fitness-pareto wait once, for their founders; one elite of a generation is not simulated again. */
const wavesOf = {
  'steady-state': { first: population, later: 1e9 },
  'age-fitness-pareto': { first: population, later: 1e9 },
  generational: { first: population, later: population - 1 },
  'nsga-ii': { first: population, later: population },
  'one-plus-lambda': { first: 1, later: population },
} as const satisfies Record<string, Waves>
const steadyWaves = wavesOf['steady-state']
const waitingMethods = Object.keys(wavesOf) as (keyof typeof wavesOf)[]

describe("order 'cost'", () => {
  for (const method of waitingMethods) {
    it.each(lookaheads)(`${method}: commits as a cluster of %i slots finishes`, (lookahead) => {
      for (let seed = 1; seed <= 4; seed++) {
        const { jobs, commits } = historyOf({ method, population, lookahead, order: 'cost' }, { seed })
        expect(commits.length).toBe(800)
        expect(commits.map(({ evaluation }) => evaluation)).toEqual(
          simulatedCluster(jobs, lookahead, wavesOf[method]),
        )
      }
    })
  }

  it('the comparison can fail: one slot more gives another order', () => {
    const { jobs, commits } = historyOf({ population, lookahead: 7, order: 'cost' })
    const order = commits.map(({ evaluation }) => evaluation)
    expect(order).toEqual(simulatedCluster(jobs, 7, steadyWaves))
    expect(order).not.toEqual(simulatedCluster(jobs, 8, steadyWaves))
  })

  it.each([5, 12, 60])('all founders commit before the first child (lookahead %i)', (lookahead) => {
    const { commits } = historyOf({ lookahead, order: 'cost', population: 24 })
    expect(commits.slice(0, 24).every(({ founder }) => founder)).toBe(true)
    expect(commits.slice(24).some(({ founder }) => founder)).toBe(false)
  })

  it('a body that takes ten times longer holds nobody up', () => {
    const lookahead = 8
    const { commits } = historyOf({ method: 'random-sampling', lookahead, order: 'cost' })
    const lagOf = (wanted: number) => {
      const lags = commits.flatMap(({ cost, bornAtCommit }, at) =>
        cost === wanted ? [at - bornAtCommit] : [],
      )
      return lags.reduce((sum, lag) => sum + lag, 0) / lags.length
    }
    // While a slot works for 10 ticks each of the others ends about 10 / 5.5 jobs: the mean cost is 5.5.
    expect(lagOf(10)).toBeGreaterThan(0.8 * (lookahead - 1) * (10 / 5.5))
    expect(lagOf(1)).toBeLessThan(1.6 * (lookahead - 1) * (1 / 5.5))
  })
})

describe("order 'proposal'", () => {
  it.each([...waitingMethods, 'age-fitness-pareto', 'drift', 'random-sampling'])(
    '%s: commits follow the proposals',
    (method) => {
      for (const lookahead of lookaheads) {
        const { jobs, commits } = historyOf({ method, lookahead, order: 'proposal' })
        expect(jobs.map(({ evaluation }) => evaluation)).toEqual(commits.map(({ evaluation }) => evaluation))
        expect(commits.map(({ evaluation }) => evaluation)).toEqual(commits.map((_, at) => at + 1))
      }
    },
  )

  it('never has more than L outstanding, and exactly L while it may propose', () => {
    for (const lookahead of lookaheads) {
      const { commits, lastProposalAt } = historyOf({ lookahead, population: 4 })
      commits.forEach(({ proposedBefore }, at) => {
        expect(proposedBefore - at).toBeLessThanOrEqual(lookahead)
        if (at > 4 && at <= lastProposalAt) expect(proposedBefore - at).toBe(lookahead)
      })
    }
  })
})

// Depolli, Trobec and Filipic, Asynchronous master-slave parallelization of differential evolution for
// multi-objective optimization (2013): how many other results are taken in between an evaluation's dispatch and its
// return has mean W - 1 in steady state, whatever the times are, because each completion adds one to each of the
// W - 1 others in flight. Here W is L, and the sum is exact.
describe('selection lag', () => {
  it.each([2, 5, 12, 30])("is exactly L - 1 in order 'proposal' (L = %i)", (lookahead) => {
    const { commits } = historyOf({ lookahead, population })
    const steady = commits.filter(
      ({ bornAtCommit, founder }) => !founder && bornAtCommit > population + lookahead,
    )
    expect(steady.length).toBeGreaterThan(500)
    for (const one of steady) expect(one.evaluation - 1 - one.bornAtCommit).toBe(lookahead - 1)
  })

  it.each([2, 5, 12, 30])("adds up to L - 1 a commit in order 'cost' (L = %i)", (lookahead) => {
    const { jobs, commits, lastProposalAt } = historyOf({ lookahead, population, order: 'cost' })
    // From the commit at which the window was full of children to the last at which it was refilled.
    const from = population
    const until = lastProposalAt
    const lags = new Map<number, number>()
    const out = new Set(jobs.slice(from, from + lookahead).map(({ evaluation }) => evaluation))
    let proposed = from + lookahead
    for (const { evaluation } of commits.slice(from, until)) {
      expect(out.delete(evaluation)).toBe(true)
      for (const other of out) lags.set(other, (lags.get(other) ?? 0) + 1)
      out.add(jobs[proposed++]!.evaluation)
    }
    const sum = [...lags.values()].reduce((a, b) => a + b, 0)
    expect(sum).toBe((lookahead - 1) * (until - from))
    // The mean over those that have come back; what is still out at the end is all that is missing.
    const back = commits.slice(from, until).filter(({ evaluation }) => evaluation > from)
    const mean = back.reduce((total, { evaluation }) => total + (lags.get(evaluation) ?? 0), 0) / back.length
    expect(Math.abs(mean - (lookahead - 1))).toBeLessThan((lookahead * lookahead) / 300 + 0.2)
    // The island counts the same: commits between an individual's birth and its own commit.
    for (const one of back.filter(({ founder }) => !founder)) {
      const own = commits.indexOf(one) - one.bornAtCommit
      if (one.bornAtCommit > from) expect(own).toBe(lags.get(one.evaluation) ?? 0)
    }
  })
})

describe('island time', () => {
  it.each(['proposal', 'cost'] as const)("epochs end where the sum of costs says (order '%s')", (order) => {
    for (const [lookahead, everyRounds] of [
      [1, 1],
      [3, 2],
      [8, 5],
      [20, 1],
    ] as const) {
      const migration = { ...mixedPlan().migration!, everyRounds }
      const { commits, epochs } = historyOf({ lookahead, order }, { migration })
      const expected: { cost: number; commits: number }[] = []
      let sum = 0
      commits.forEach(({ cost, costSoFar }, at) => {
        sum += cost
        expect(costSoFar).toBe(sum)
        // One dear commit may pass several ends at once.
        while (sum >= (expected.length + 1) * everyRounds * lookahead)
          expected.push({ cost: sum, commits: at + 1 })
      })
      expect(epochs).toEqual(expected)
      expect(epochs.length).toBe(Math.floor(sum / (everyRounds * lookahead)))
    }
  })

  it('a top-up costs its share of the first block', () => {
    const replicates = { first: 4, topUp: 2, most: 8, shared: true }
    const plan = { replicates, budget: { simulations: 2_000 } }
    const { jobs } = historyOf({ lookahead: 6, order: 'cost' }, plan)
    expect(jobs.filter((job) => job.replicates === 2).length).toBeGreaterThan(10)
    for (const job of jobs)
      expect(job.cost).toBe(Math.max(1, Math.round((job.bodyCost * job.replicates) / 4)))
  })
})

// That an asynchronous population first sees what returns first: Scott and De Jong, Understanding simple asynchronous
// evolutionary algorithms (2015, from memory). Nothing is preferred here, so without such a bias the expected share
// of either class stays one half for ever.
describe('a flat landscape with bodies that cost 1 and 10', () => {
  const population = 40
  const lookahead = 40

  /** Share of cheap bodies among the first `lookahead` children committed. */
  function cheapShare(order: 'proposal' | 'cost', seed: number): number {
    const plan = mixedPlan({
      seed,
      islands: [
        islandPlan(1, {
          order,
          population,
          lookahead,
          settings: {
            ...islandPlan(1).settings,
            tournament: 1,
            replace: 'random',
            crossoverChance: 0,
            mutationChance: 0,
          },
        }),
      ],
      controls: [],
      replicates: { first: 1, topUp: 0, most: 1, shared: true },
      budget: { simulations: population + 2 * lookahead },
    })
    const isCheap = (size: number) => size <= 5
    const tools = searchTools(plan, {
      expectedCost: (genome) => (isCheap(genome.size![0]!) ? 1 : 10),
      repair: (genome) => genome,
    })
    const width = columnsOf(plan.problem)
    const cheap: boolean[] = []
    const gate = gateOf(() => ({ values: new Float64Array(width), failures: [] }), {
      committed: (_island, { individual }) => void cheap.push(isCheap(individual.genome.size![0]!)),
    })
    drivenSearch(plan, gate, tools)
    return cheap.slice(population, population + lookahead).filter(Boolean).length / lookahead
  }

  // Seeds chosen beforehand: 31001 and on. Bands of four standard errors.
  const shares = (order: 'proposal' | 'cost') =>
    estimateOf(Array.from({ length: 120 }, (_, run) => cheapShare(order, 31_001 + run)))

  it("order 'proposal' prefers neither", () => {
    const { mean, band } = shares('proposal')
    expect(Math.abs(mean - 0.5)).toBeLessThan(band)
    expect(band).toBeLessThan(0.05)
  })

  it("order 'cost' sees the cheap first, which is why it is asked for by name", () => {
    const { mean, band } = shares('cost')
    expect(mean - band).toBeGreaterThan(0.75)
  })
})
