// Survivor selection of age-fitness Pareto optimisation: pairs drawn at random fight on (age, objectives); the
// dominated one leaves, until the size is reached or only the front is left.
//
// Decided here, where the paper is silent or a long search needs more:
//   - Equal in age and every objective: a coin decides who leaves, so that copies cannot fill the front for ever.
//   - Failed against working: the failed one is dominated, whatever its age.
//   - Drawing pairs until one is decided equals drawing among the decided pairs whose two are still there, so those
//     are listed and drawn without repetition: as many draws as pairs at most.
//   - With several objectives nearly everybody is in the front, and the population would grow for ever. A front
//     above `frontMost` is thinned by crowding distance over age and objectives; the ends of each criterion stay.
//     Common practice, no source.

import { check } from '../../../shared/check.js'
import type { Stream } from '../../../shared/streams.js'
import { crowdingDistance, dominates } from '../pareto.js'
import type { Individual } from '../types.js'
import { hasFailed } from './selection.js'

/** Age, then scores: all smaller is better. */
export function criteriaOf(individual: Individual): Float64Array {
  const criteria = new Float64Array(individual.score.length + 1)
  criteria[0] = individual.age
  criteria.set(individual.score, 1)
  return criteria
}

/** True when `a` beats `b` on age and objectives, or works where `b` failed. */
export function outlives(a: Individual, b: Individual): boolean {
  if (hasFailed(a) !== hasFailed(b)) return hasFailed(b)
  return dominates(criteriaOf(a), criteriaOf(b))
}

interface Contests {
  /** Pairs as winner * pool size + loser; for equals either way round, a coin decides. */
  readonly pairs: number[]
  readonly equals: Set<number>
  /** How many can leave at most: everybody but one of each point of the front. */
  readonly removable: number
}

/** Every decided pair. The hot loop of the method, pool size squared: flat numbers, one pass a pair. */
function contestsOf(pool: readonly Individual[]): Contests {
  const n = pool.length
  const width = (pool[0]?.score.length ?? 0) + 2
  // Failure comes first and counts as one more criterion only between a failed and a working one.
  const flat = new Float64Array(n * width)
  pool.forEach((one, i) => {
    flat[i * width] = hasFailed(one) ? 1 : 0
    flat.set(criteriaOf(one), i * width + 1)
  })
  const pairs: number[] = []
  const equals = new Set<number>()
  const removable = new Uint8Array(n)
  for (let i = 0; i < n; i++) {
    for (let j = i + 1; j < n; j++) {
      const outcome = verdict(flat, i * width, j * width, width)
      if (outcome === neither) continue
      const loser = outcome === secondWins ? i : j
      const pair = (i + j - loser) * n + loser
      pairs.push(pair)
      if (outcome === even) equals.add(pair)
      removable[loser] = 1
    }
  }
  return { pairs, equals, removable: removable.reduce((sum, one) => sum + one, 0) }
}

const even = 0
const firstWins = 1
const secondWins = 2
const neither = 3

/** Two rows of failure, age and scores, at `a` and `b`: bit 1 when the first is better somewhere, bit 2 the second. */
function verdict(flat: Float64Array, a: number, b: number, width: number): number {
  if (flat[a] !== flat[b]) return flat[a]! < flat[b]! ? firstWins : secondWins
  let better = even
  for (let m = 1; m < width; m++) {
    if (flat[a + m]! < flat[b + m]!) better |= firstWins
    else if (flat[a + m]! > flat[b + m]!) better |= secondWins
  }
  return better
}

/**
 * Survivors of `pool` in its order: `size` of them, or the whole front (one of each point) when that is larger, but
 * never more than `frontMost` (at least `size`). A pool within `size` survives whole.
 */
export function survivorsOf(
  pool: readonly Individual[],
  size: number,
  frontMost: number,
  stream: Stream,
): Individual[] {
  check(frontMost >= size, 'the limit of the front is no smaller than the population')
  if (pool.length <= size) return [...pool]
  const n = pool.length
  const { pairs, equals, removable } = contestsOf(pool)
  const gone = new Uint8Array(n)
  let leaving = Math.min(n - size, removable)
  for (let left = pairs.length; leaving > 0; left--) {
    check(left > 0, 'as long as somebody can leave, a pair is undecided')
    const drawn = stream.below(left)
    const pair = pairs[drawn]!
    pairs[drawn] = pairs[left - 1]!
    const winner = Math.floor(pair / n)
    const loser = pair % n
    if (gone[winner] || gone[loser]) continue
    gone[equals.has(pair) && stream.chance(1, 2) ? winner : loser] = 1
    leaving--
  }
  const survivors = pool.filter((_, index) => !gone[index])
  return survivors.length <= Math.max(size, frontMost) ? survivors : thinned(survivors, frontMost)
}

/** The `count` least crowded, in their old order; equally crowded: older id first. */
function thinned(front: readonly Individual[], count: number): Individual[] {
  const distance = crowdingDistance(
    front.map(criteriaOf),
    front.map((_, index) => index),
  )
  const order = front.map((_, index) => index)
  order.sort((a, b) => {
    if (distance[a] !== distance[b]) return distance[a]! > distance[b]! ? -1 : 1
    return front[a]!.id - front[b]!.id
  })
  const kept = new Set(order.slice(0, count))
  return front.filter((_, index) => kept.has(index))
}
