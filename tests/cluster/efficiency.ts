// How busy fleets are with searches of several kinds: the settings of each, and what is counted. In virtual time, so
// that nothing depends on the machine that counts.

import { searchTools } from '../../coordinator/evolution/build.js'
import { columnsOf } from '../../coordinator/evolution/estimate.js'
import { methodNamed } from '../../coordinator/evolution/methods/index.js'
import type { CommitOrder, IslandPlan, SearchPlan } from '../../coordinator/evolution/plan.js'
import type { SearchTools } from '../../coordinator/evolution/search.js'
import { defaultSettings } from '../../coordinator/evolution/settings.js'
import { genomeFromBytes } from '../../shared/encodings.js'
import type { Genome } from '../../shared/genome.js'
import type { WorkItem } from '../../shared/result.js'
import { stream } from '../../shared/streams.js'
import { fixtureProblem, islandPlan, simulated } from '../fixture.js'
import { type Accounts, busyShare, type FleetWorld, VirtualFleet } from './virtual-fleet.js'

const second = 1000
/** Of a simulation in all of these. */
const meanMs = 10 * second
/** Whole numbers with room below the mean: expected costs are counted in so many parts of it. */
const costParts = 1000

/** A lognormal number of mean 1 and this coefficient of variation, from a standard normal one. */
function lognormal(cv: number, normal: number): number {
  const variance = Math.log(1 + cv * cv)
  return Math.exp(Math.sqrt(variance) * normal - variance / 2)
}

/** Real over expected time of an evaluation: the same whoever simulates, and however often. */
function spreadOf(seed: number, cv: number, { island, evaluation }: WorkItem): number {
  return lognormal(cv, stream(seed, 'weather', island, evaluation, 22).normal())
}

/** Costs as if drawn anew for every genome: lognormal, inherited by nobody. */
function costOf(seed: number, cv: number, genome: Genome): number {
  const [low, high] = new Uint32Array(Float64Array.from(genome.place!).buffer)
  const drawn = lognormal(cv, stream(seed, 'weather', low!, high!, 23).normal())
  return Math.max(1, Math.round(costParts * drawn))
}

function planOf(seed: number, islands: readonly IslandPlan[], changes: Partial<SearchPlan> = {}): SearchPlan {
  return {
    name: 'efficiency',
    seed,
    semantics: 1,
    problem: fixtureProblem,
    islands,
    controls: [],
    replicates: { first: 1, topUp: 0, most: 1, shared: true },
    // Nobody comes to the end of it: what is measured is a search under way.
    budget: { simulations: 10_000_000 },
    confirm: { fraction: 0 },
    genomes: 'none',
    ...changes,
  }
}

function toolsOf(plan: SearchPlan, expectedCost: (genome: Genome) => number): SearchTools {
  return searchTools(plan, { expectedCost, repair: (genome) => genome })
}

/** Everything is as good as everything else. */
function flat(plan: SearchPlan): FleetWorld['resultOf'] {
  const width = columnsOf(plan.problem)
  return ({ replicates }) => ({ values: new Float64Array(width * replicates), failures: [] })
}

const calmWorld = {
  meanLifeMs: Number.POSITIVE_INFINITY,
  replacedAfterMs: 0,
  answerMs: 0,
  machines: false,
} as const

function measured(world: FleetWorld, warmUpSeconds: number, seconds: number): Accounts {
  const fleet = new VirtualFleet(world)
  fleet.run(warmUpSeconds * second)
  fleet.beginAccounts()
  fleet.run((warmUpSeconds + seconds) * second)
  return fleet.accounts()
}

// ------------------------------------------------------------------------------------------- killed workers

export interface KilledFleet {
  readonly seed: number
  readonly workers: number
  readonly meanLifeSeconds: number
  readonly replacedAfterSeconds: number
  /** Total lookahead over workers. */
  readonly ahead: number
  /** Of the times of simulations. */
  readonly cv: number
  readonly order: CommitOrder
  readonly seconds: number
}

/** Five steady islands on a fleet whose agents are killed; spot checks and bests are confirmed elsewhere. */
export function killedFleet(options: KilledFleet): Accounts {
  const { seed, workers, ahead, cv, order, seconds } = options
  const lookahead = Math.round((ahead * workers) / 5)
  const islands = [1, 2, 3, 4, 5].map((island) => islandPlan(island, { population: 50, lookahead, order }))
  const plan = planOf(seed, islands, {
    migration: { everyRounds: 10, emigrants: 2, topology: 'ring', lag: 1, leave: 'best', arrive: 'worst' },
    confirm: { fraction: 0.02 },
  })
  const world = {
    tools: toolsOf(plan, () => 1),
    seed,
    workers,
    meanLifeMs: options.meanLifeSeconds * second,
    replacedAfterMs: options.replacedAfterSeconds * second,
    answerMs: 20,
    machines: true,
    wallMs: (item: WorkItem) => meanMs * spreadOf(seed, cv, item),
    resultOf: (item: WorkItem) => {
      const genome = genomeFromBytes(plan.problem.spec, item.genome)
      return simulated(plan, genome, item.firstReplicate, item.replicates)
    },
  }
  return measured(world, 120, seconds)
}

// ---------------------------------------------------------------------------------------- order of commits

export interface OrderedIslands {
  readonly seed: number
  readonly workers: number
  readonly islands: number
  readonly ahead: number
  readonly cv: number
  readonly seconds: number
}

/** Share of time in which workers are busy with steady islands in `cost` order, expected costs of cv 2. */
export function busyInCostOrder({ seed, workers, islands, ahead, cv, seconds }: OrderedIslands): number {
  const lookahead = Math.round((ahead * workers) / islands)
  const list = Array.from({ length: islands }, (_, at) =>
    islandPlan(at + 1, { population: 20, lookahead, order: 'cost' }),
  )
  const plan = planOf(seed, list)
  const world = {
    ...calmWorld,
    tools: toolsOf(plan, (genome) => costOf(seed, 2, genome)),
    seed,
    workers,
    wallMs: (item: WorkItem) => (meanMs / costParts) * item.expectedCost * spreadOf(seed, cv, item),
    resultOf: flat(plan),
  }
  return busyShare(measured(world, 600, seconds))
}

// ------------------------------------------------------------------------------------------------ migration

export interface MixedIslands {
  readonly seed: number
  readonly migrates: boolean
  /** Times the first island's simulations are dearer than those of the others. */
  readonly dear: number
  readonly seconds: number
}

const mixedWorkers = 40

/** Four islands of age-fitness Pareto and one generational, 40 workers, lookahead 24 each, migration every 20 rounds. */
export function busyWithMixedIslands({ seed, migrates, dear, seconds }: MixedIslands): number {
  const steady = [1, 2, 3, 4].map((island) =>
    islandPlan(island, { method: 'age-fitness-pareto', population: 120, lookahead: 24 }),
  )
  const other = islandPlan(5, { method: 'generational', population: 24, lookahead: 24 })
  const migration = {
    everyRounds: 20,
    emigrants: 2,
    topology: 'ring',
    lag: 1,
    leave: 'best',
    arrive: 'worst',
  } as const
  const plan = planOf(seed, [...steady, other], migrates ? { migration } : {})
  const common = toolsOf(plan, () => 1)
  const tools: SearchTools = {
    plan,
    toolsOf: (island, quota) => {
      const expectedCost = () => (island.island === 1 ? dear : 1)
      return { ...common.toolsOf(island, quota), expectedCost }
    },
  }
  const world = {
    ...calmWorld,
    tools,
    seed,
    workers: mixedWorkers,
    wallMs: (item: WorkItem) => meanMs * (item.island === 1 ? dear : 1) * spreadOf(seed, 0.3, item),
    resultOf: flat(plan),
  }
  return busyShare(measured(world, 1000, seconds))
}

// -------------------------------------------------------------------------------------------------- barrier

export interface Barrier {
  readonly seed: number
  readonly workers: number
  /** Births of a generation. */
  readonly births: number
  readonly generations: number
}

export interface Estimate {
  readonly value: number
  readonly standardError: number
}

/** Busy share of workers that wait for the end of each generation, with exponential times. */
export function busyAtBarrier({ seed, workers, births, generations }: Barrier): Estimate {
  const settings = { ...defaultSettings(methodNamed('generational').settings), elites: 0 }
  const island = islandPlan(1, { method: 'generational', settings, population: births, lookahead: births })
  const plan = planOf(seed, [island], { budget: { simulations: births * (generations + 1) } })
  const spans: { readonly wallMs: number; readonly workMs: number }[] = []
  const wallMs = ({ island: number, evaluation }: WorkItem) =>
    -meanMs * Math.log(1 - stream(seed, 'weather', number, evaluation, 22).uniform())
  let workMs = 0
  const fleet = new VirtualFleet({
    ...calmWorld,
    tools: toolsOf(plan, () => 1),
    seed,
    workers,
    wallMs,
    resultOf: (item) => {
      workMs += wallMs(item)
      return flat(plan)(item)
    },
  })
  const { counters } = fleet.engine.search.island(1)
  let beganMs = 0
  fleet.run(Number.POSITIVE_INFINITY, () => {
    if (counters.commits < births * (spans.length + 1)) return false
    spans.push({ wallMs: fleet.nowMs - beganMs, workMs })
    beganMs = fleet.nowMs
    workMs = 0
    return spans.length > generations
  })
  // The first generation has the first best, which waits to be confirmed.
  return ratio(
    spans.slice(1).map((span) => span.workMs),
    spans.slice(1).map((span) => workers * span.wallMs),
  )
}

/** Of two sums, with the usual error of a ratio (Cochran, Sampling techniques, 1977, 2.11, from memory). */
function ratio(above: readonly number[], below: readonly number[]): Estimate {
  const count = above.length
  const sum = (list: readonly number[]) => list.reduce((a, b) => a + b, 0)
  const value = sum(above) / sum(below)
  const squares = sum(above.map((one, at) => (one - value * below[at]!) ** 2))
  return { value, standardError: Math.sqrt(squares / (count - 1) / count) / (sum(below) / count) }
}
