// Ranking members on any number of objectives: front first, then crowding distance, then id, as in NSGA-II. With
// one objective this is the score, then the id.

import { crowdingDistance, dominates, nonDominatedFronts } from '../pareto.js'
import type { Individual } from '../types.js'
import type { Judgement } from './arrivals.js'
import { byScoreThenId } from './selection.js'

export interface ParetoRanking {
  /** Front of each member, 0 the best. */
  readonly front: Int32Array
  /** Crowding distance of each member within its front. */
  readonly crowding: Float64Array
}

export function paretoRanking(members: readonly Individual[]): ParetoRanking {
  const points = members.map((member) => member.score)
  const front = new Int32Array(members.length)
  const crowding = new Float64Array(members.length)
  nonDominatedFronts(points).forEach((indices, rank) => {
    const distances = crowdingDistance(points, indices)
    for (const [k, index] of indices.entries()) {
      front[index] = rank
      crowding[index] = distances[k]!
    }
  })
  return { front, crowding }
}

/**
 * The crowded-comparison operator of Deb et al. 2002: lower front, then larger crowding distance. Below 0 when the
 * member at index `a` is preferred, 0 when neither is.
 */
export function crowdedComparison(ranking: ParetoRanking, a: number, b: number): number {
  if (ranking.front[a] !== ranking.front[b]) return ranking.front[a]! - ranking.front[b]!
  if (ranking.crowding[a] === ranking.crowding[b]) return 0
  return ranking.crowding[a]! > ranking.crowding[b]! ? -1 : 1
}

/** Best first, a total order that depends on who they are and not on the order they are given in. */
export function byParetoRank(members: readonly Individual[]): Individual[] {
  if (members.length > 0 && members[0]!.score.length === 1) return members.toSorted(byScoreThenId)
  // Among equal scores crowding goes by place in line, so the line must be one and the same.
  const line = members.toSorted((a, b) => a.id - b.id)
  const ranking = paretoRanking(line)
  const order = line.map((_, index) => index)
  order.sort((a, b) => crowdedComparison(ranking, a, b) || a - b)
  return order.map((index) => line[index]!)
}

export const paretoJudgement: Judgement = {
  rank: byParetoRank,
  better: (a, b) => dominates(a.score, b.score),
}
