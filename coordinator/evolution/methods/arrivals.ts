// Seats and who takes them: individuals from elsewhere, and newcomers in general.
//
// Members are kept in the order in which they entered. Rules for arrivals, the same for every method:
//   - who is a member already is ignored, so nobody sits twice;
//   - free seats are filled first, in the order given;
//   - in a full population an arrival displaces a *resident*, never another arrival of the same day, so the
//     outcome does not depend on which of them came first; when the residents are used up, the rest is turned away;
//   - a failed arrival never displaces one that works;
//   - the number of seats never changes once all are taken.
// Placement is a row of the table below. 'worst' and 'if-better' never lose the best of one objective.

import { check } from '../../../shared/check.js'
import type { Stream } from '../../../shared/streams.js'
import type { Individual, Placement } from '../types.js'
import { hasFailed } from './selection.js'

/** How a method judges its members. */
export interface Judgement {
  /** Best first, a total order. */
  readonly rank: (members: readonly Individual[]) => readonly Individual[]
  /** True when `a` is strictly better than `b`. */
  readonly better: (a: Individual, b: Individual) => boolean
}

export interface PlacementRow {
  readonly help: string
  /**
   * Pairs an arrival with the resident it displaces, or leaves it out. `residents` are ranked best first,
   * `arrivals` too.
   */
  readonly pair: (
    residents: readonly Individual[],
    arrivals: readonly Individual[],
    judgement: Judgement,
    stream: Stream,
  ) => readonly (readonly [Individual, Individual])[]
}

export const placements: { readonly [P in Placement]: PlacementRow } = {
  worst: {
    help: 'takes the seat of the worst resident; the seat of the best only when better',
    pair: (residents, arrivals, judgement) =>
      pairsFrom(arrivals, residents.toReversed()).filter(
        ([arrival, resident]) => resident !== residents[0] || judgement.better(arrival, resident),
      ),
  },
  random: {
    help: 'takes the seat of any resident, drawn evenly; the best can be lost',
    pair: (residents, arrivals, _judgement, stream) => {
      const order = stream.permutation(residents.length)
      return pairsFrom(
        arrivals,
        [...order].map((index) => residents[index]!),
      )
    },
  },
  'if-better': {
    help: 'takes the seat of the worst resident only when better than it',
    pair: (residents, arrivals, judgement) =>
      pairsFrom(arrivals, residents.toReversed()).filter(([arrival, resident]) =>
        judgement.better(arrival, resident),
      ),
  },
}

function pairsFrom(arrivals: readonly Individual[], victims: readonly Individual[]) {
  return arrivals.slice(0, victims.length).map((arrival, k) => [arrival, victims[k]!] as const)
}

/** Takes arrivals into `members` (changed in place), at most `seats` of them in all. */
export function placeArrivals(
  members: Individual[],
  seats: number,
  arrivals: readonly Individual[],
  placement: Placement,
  judgement: Judgement,
  stream: Stream,
): void {
  const strangers = newcomersOf(members, arrivals)
  const residents = [...members]
  const seated = strangers.slice(0, Math.max(0, seats - members.length))
  members.push(...seated)
  const standing = strangers.slice(seated.length)
  if (standing.length === 0 || residents.length === 0) return
  const pairs = placements[placement].pair(
    judgement.rank(residents),
    judgement.rank(standing),
    judgement,
    stream,
  )
  for (const [arrival, resident] of pairs) {
    if (hasFailed(arrival) && !hasFailed(resident)) continue
    replaceAt(members, members.indexOf(resident), arrival)
  }
}

/** Those of `arrivals` who are neither members nor named twice. */
export function newcomersOf(members: readonly Individual[], arrivals: readonly Individual[]): Individual[] {
  const known = new Set(members.map((member) => member.id))
  return arrivals.filter((arrival) => {
    if (known.has(arrival.id)) return false
    known.add(arrival.id)
    return true
  })
}

/** The member at `index` leaves; the newcomer enters last, so that members stay in order of entry. */
export function replaceAt(members: Individual[], index: number, newcomer: Individual): void {
  check(index >= 0 && index < members.length, 'the one to replace is a member')
  for (let k = index; k + 1 < members.length; k++) members[k] = members[k + 1]!
  members[members.length - 1] = newcomer
}
