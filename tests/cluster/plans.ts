// Plans drawn from a number: every method, order, topology and rule of replicates meets every other sooner or later.
// Each is about 500 evaluations; its calm ending is worked out once.

import { methods } from '../../coordinator/evolution/methods/index.js'
import { topologies } from '../../coordinator/evolution/migration.js'
import type { CommitOrder, IslandPlan, SearchPlan, Topology } from '../../coordinator/evolution/plan.js'
import { firstControl } from '../../shared/ids.js'
import { type Stream, stream } from '../../shared/streams.js'
import { fixtureProblem, islandPlan } from '../fixture.js'
import { calm, type Ending, World } from './world.js'

const evaluations = 500
const reductions = ['mean', 'median', 'worst', { quantile: 0.3 }] as const
const combinations = ['mean', 'sum', 'worst'] as const
const controlMethods = ['drift', 'random-sampling']
const searchMethods = methods.map(({ name }) => name).filter((name) => !controlMethods.includes(name))

function pick<Item>(draw: Stream, from: readonly Item[]): Item {
  return from[draw.below(from.length)]!
}

function drawnIsland(
  draw: Stream,
  number: number,
  method: string,
  orders: readonly CommitOrder[],
): IslandPlan {
  return islandPlan(number, {
    method,
    population: 2 + draw.below(14),
    lookahead: 1 + draw.below(16),
    share: 1 + draw.below(10),
    order: pick(draw, orders),
  })
}

/** Without 'arrival' among the orders the plan has one digest. */
export function drawnPlan(
  variant: number,
  orders: readonly CommitOrder[] = ['proposal', 'cost'],
): SearchPlan {
  const draw = stream(variant, 'weather', 7)
  const islands = Array.from({ length: 1 + draw.below(6) }, (_, at) =>
    drawnIsland(draw, at + 1, pick(draw, searchMethods), orders),
  )
  const controls = controlMethods
    .filter(() => draw.chance(1, 4))
    .map((method, at) => drawnIsland(draw, firstControl + at, method, orders))
  const cases = draw.chance(1, 4) ? ['idle', 'full speed'] : []
  const first = 1 + draw.below(3)
  const fitting = (Object.keys(topologies) as Topology[]).filter(
    (topology) => topologies[topology].misfit(islands.length) === undefined,
  )
  const migrates = fitting.length > 0 && draw.chance(7, 8)
  const target = draw.chance(1, 6) ? { target: 0.2 } : {}
  const stagnation = draw.chance(1, 6) ? { stagnationRounds: 4 + draw.below(12) } : {}
  return {
    name: `drawn ${variant}`,
    seed: variant,
    semantics: 1,
    problem: {
      ...fixtureProblem,
      cases,
      objectives: fixtureProblem.objectives.map((objective) => ({
        ...objective,
        reduce: pick(draw, reductions),
        overCases: pick(draw, combinations),
      })),
    },
    islands,
    controls,
    ...(migrates
      ? {
          migration: {
            everyRounds: 1 + draw.below(12),
            emigrants: 1 + draw.below(3),
            topology: pick(draw, fitting),
            lag: 1 + draw.below(3),
            leave: pick(draw, ['best', 'random'] as const),
            arrive: pick(draw, ['worst', 'random', 'if-better'] as const),
          },
        }
      : {}),
    replicates: { first, topUp: draw.below(3), most: first + draw.below(6), shared: draw.chance(1, 2) },
    budget: {
      simulations: Math.floor((evaluations * first * Math.max(1, cases.length)) / (1 + controls.length)),
      ...target,
      ...stagnation,
    },
    confirm: { fraction: pick(draw, [0, 0.02, 0.1]) },
    genomes: pick(draw, ['all', 'survivors', 'none'] as const),
  }
}

const endings = new Map<number, Ending>()

/** How the drawn plan of this number ends on a calm day. */
export function calmEnding(variant: number): Ending {
  const ending = endings.get(variant) ?? new World(drawnPlan(variant), 1, calm).run(0)
  endings.set(variant, ending)
  return ending
}
