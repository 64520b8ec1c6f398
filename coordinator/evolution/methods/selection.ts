// Who is preferred: comparing individuals, and drawing parents from the members of an island.
//
// Two kinds of ties. Where an order is shown or cut off (ranked members, elites, truncation), equals go by id, so
// that the order is total. Where a contest is drawn (tournaments), the contestant drawn first keeps the win: the id
// would prefer old individuals and low island numbers on a flat landscape, and that would be selection nobody
// asked for. The draw itself is part of the birth's own stream, so both kinds repeat exactly.

import { check } from '../../../shared/check.js'
import type { Stream } from '../../../shared/streams.js'
import type { Individual } from '../types.js'

/** A failed individual scores +Infinity on every objective; the first one tells. */
export function hasFailed(individual: Individual): boolean {
  return individual.score[0] === Number.POSITIVE_INFINITY
}

/** Below 0 when `a` is better, 0 when equal: first objective, then the second, and so on. Smaller is better. */
export function compareScores(a: Individual, b: Individual): number {
  for (let m = 0; m < a.score.length; m++) {
    if (a.score[m]! < b.score[m]!) return -1
    if (a.score[m]! > b.score[m]!) return 1
  }
  return 0
}

/** A total order: scores, then id (older first). */
export function byScoreThenId(a: Individual, b: Individual): number {
  return compareScores(a, b) || a.id - b.id
}

/** Below 0 when the member at index `a` is preferred to the one at index `b`; 0 when neither is. */
export type Preference = (a: number, b: number) => number

/** An index below `count`, uniform, never `except` (-1: no exception). */
export function uniformIndex(count: number, except: number, stream: Stream): number {
  check(count > (except >= 0 ? 1 : 0), 'there is somebody to draw')
  if (except < 0) return stream.below(count)
  const index = stream.below(count - 1)
  return index >= except ? index + 1 : index
}

export interface TournamentRules {
  readonly size: number
  /** True: no contestant is drawn twice; `size` is cut to the number there is. */
  readonly distinct: boolean
}

/**
 * Index of the winner of a tournament among `count` members, `except` left out (-1: nobody). Ties go to the
 * contestant drawn first. Chance of the r-th from the bottom of N without ties: (r/N)^t - ((r-1)/N)^t with
 * replacement, C(r-1, t-1)/C(N, t) without (Blickle and Thiele, A comparison of selection schemes used in
 * evolutionary algorithms, 1996).
 */
export function tournament(
  count: number,
  rules: TournamentRules,
  prefer: Preference,
  stream: Stream,
  except = -1,
): number {
  const first = uniformIndex(count, except, stream)
  if (rules.size === 1) return first
  if (rules.distinct) return distinctTournament(count, rules.size, prefer, stream, except, first)
  let winner = first
  for (let k = 1; k < rules.size; k++) {
    const rival = uniformIndex(count, except, stream)
    if (prefer(rival, winner) < 0) winner = rival
  }
  return winner
}

function distinctTournament(
  count: number,
  size: number,
  prefer: Preference,
  stream: Stream,
  except: number,
  first: number,
): number {
  const contestants = [first]
  const wanted = Math.min(size, count - (except >= 0 ? 1 : 0))
  let winner = first
  while (contestants.length < wanted) {
    const rival = uniformIndex(count, except, stream)
    if (contestants.includes(rival)) continue
    contestants.push(rival)
    if (prefer(rival, winner) < 0) winner = rival
  }
  return winner
}

/**
 * Linear ranking over `count` ranks, 0 the best: the best is expected `pressure` times in `count` draws, the worst
 * 2 - pressure times, in between linear (Baker, Adaptive selection methods for genetic algorithms, 1985; formula
 * from memory). Drawn without a table of chances: with chance 2 - pressure uniform, otherwise the better of two
 * distinct ranks, which is the steepest linear ranking (worst never).
 */
export function linearRank(count: number, pressure: number, stream: Stream): number {
  check(pressure >= 1 && pressure <= 2, 'ranking pressure lies between 1 and 2')
  const flat = stream.uniform() < 2 - pressure
  const first = stream.below(count)
  if (flat || count === 1) return first
  return Math.min(first, uniformIndex(count, first, stream))
}

/** A rank among the best `fraction` of `count`, uniform; at least the best itself. */
export function truncatedRank(count: number, fraction: number, stream: Stream): number {
  return stream.below(Math.max(1, Math.floor(fraction * count)))
}
