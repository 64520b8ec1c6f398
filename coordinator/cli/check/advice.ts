// From measured times to advice: which commit order and how much lookahead keep the expected workers busy, and what
// ordering by cost would do to a population without selection.

import { check } from '../../../shared/check.js'
import { stream } from '../../../shared/streams.js'
import type { CommitOrder } from '../../evolution/plan.js'

/**
 * Share of time that 200 workers are busy, by spread of the real time of an evaluation around the expected (coefficient of
 * variation; rows) and total lookahead over workers (columns). Where the simulation of these rules gave a range,
 * its lower end.
 */
const ratios = [1.25, 1.5, 2, 3, 4] as const
const busyTable: readonly (readonly [spread: number, busy: readonly number[]])[] = [
  [0.1, [0.99, 1, 1, 1, 1]],
  [0.3, [0.62, 0.73, 0.93, 1, 1]],
  [1, [0.2, 0.23, 0.29, 0.41, 0.48]],
]

/** Busy share at a spread, for each of the ratios; between rows on a straight line, beyond them the last row. */
export function busyAt(spread: number): { readonly ratio: number; readonly busy: number }[] {
  const upper = busyTable.findIndex(([row]) => row >= spread)
  const high = busyTable[upper < 0 ? busyTable.length - 1 : upper]!
  const low = busyTable[upper < 0 ? busyTable.length - 1 : Math.max(0, upper - 1)]!
  const along = high[0] === low[0] ? 0 : (spread - low[0]) / (high[0] - low[0])
  return ratios.map((ratio, column) => ({
    ratio,
    busy: low[1][column]! + along * (high[1][column]! - low[1][column]!),
  }))
}

export interface Spread {
  readonly mean: number
  /** Standard deviation over mean. */
  readonly cv: number
}

export function spreadOf(values: readonly number[]): Spread {
  check(values.length > 0, 'a spread is of something')
  const mean = values.reduce((sum, value) => sum + value, 0) / values.length
  const squares = values.reduce((sum, value) => sum + (value - mean) ** 2, 0)
  const deviation = values.length < 2 ? 0 : Math.sqrt(squares / (values.length - 1))
  return { mean, cv: mean > 0 ? deviation / mean : 0 }
}

export interface Recommendation {
  readonly order: CommitOrder
  /** Sum over all islands. */
  readonly lookahead: number
  /** Share of time the workers would be busy; undefined for arrival, which never waits. */
  readonly busy: number | undefined
  readonly because: string
}

const busyEnough = 0.9
/** Below this, even at the largest ratio, order arrival is worth losing repeatability. */
const busyBearable = 0.6

/**
 * The order that repeats from the search file alone and still keeps the workers busy: proposal, else cost, else arrival. `times` is
 * the spread of real time between machines, `aroundCost` that of time divided by expected cost.
 */
export function recommend(times: Spread, aroundCost: Spread, workers: number): Recommendation {
  const inOrder = (
    order: CommitOrder,
    spread: Spread,
    least: number,
    because: string,
  ): Recommendation | undefined => {
    const rows = busyAt(spread.cv)
    const enough = rows.find(({ busy }) => busy >= busyEnough) ?? rows.findLast(({ busy }) => busy >= least)
    return enough && { order, lookahead: Math.ceil(enough.ratio * workers), busy: enough.busy, because }
  }
  const alike =
    times.cv <= 0.2
      ? 'machines take about the same time'
      : 'a lookahead of that width absorbs the spread of times'
  const foretold = 'times differ between machines, but expectedCost foretells them'
  const bearable =
    'times differ between machines; order arrival would idle less, but not repeat from the search file'
  const costIsBetter = aroundCost.cv < times.cv / 2
  return (
    inOrder('proposal', times, busyEnough, alike) ??
    inOrder('cost', aroundCost, busyEnough, foretold) ??
    inOrder(
      costIsBetter ? 'cost' : 'proposal',
      costIsBetter ? aroundCost : times,
      busyBearable,
      bearable,
    ) ?? {
      order: 'arrival',
      lookahead: Math.ceil(1.5 * workers),
      busy: undefined,
      because:
        'times differ widely and expectedCost does not foretell them; such a search can be re-derived from its journal, not repeated from its file',
    }
  )
}

export interface DriftExpectation {
  /** Cost of a dear body over that of a cheap one. */
  readonly ratio: number
  readonly lookahead: number
  readonly population: number
  readonly fromCommit: number
  readonly toCommit: number
  /** Share of cheap bodies among those commits, where half of the founders are cheap and nothing is selected. */
  readonly cheapShare: number
}

/**
 * What order cost does without selection, by running its rules: half of the founders cost 1, half `ratio`; children copy
 * a random member and replace a random one. A slot of the virtual cluster starts its next evaluation when its last one is
 * committed; commits follow (virtual finish, id), founders before children.
 */
export function expectedDrift(
  ratio: number,
  lookahead: number,
  population: number,
  repeats = 8,
): DriftExpectation {
  const fromCommit = 1000
  const toCommit = 5000
  let cheap = 0
  for (let repeat = 0; repeat < repeats; repeat++) {
    cheap += cheapCommits(ratio, lookahead, population, fromCommit, toCommit, repeat)
  }
  const cheapShare = cheap / (repeats * (toCommit - fromCommit))
  return { ratio, lookahead, population, fromCommit, toCommit, cheapShare }
}

function cheapCommits(
  ratio: number,
  lookahead: number,
  population: number,
  from: number,
  to: number,
  repeat: number,
): number {
  const random = stream(1, 'check', 2, repeat)
  const members: number[] = Array.from({ length: population }, (_, index) => (index % 2 === 0 ? 1 : ratio))
  const slots = Array.from({ length: lookahead }, () => {
    const cost = members[random.below(population)]!
    return { cost, finish: cost }
  })
  let cheap = 0
  for (let commit = 1; commit <= to; commit++) {
    // The earliest finish; the lower index stands for the lower id.
    let next = slots[0]!
    for (const slot of slots) if (slot.finish < next.finish) next = slot
    if (commit > from && next.cost === 1) cheap += 1
    members[random.below(population)] = next.cost
    next.cost = members[random.below(population)]!
    next.finish += next.cost
  }
  return cheap
}
