// Who leaves when a child enters a full population: rows of one table.

import { check } from '../../../shared/check.js'
import type { Stream } from '../../../shared/streams.js'
import type { Individual } from '../types.js'
import { compareScores, tournament, uniformIndex } from './selection.js'

export interface ReplacementRow {
  readonly name: string
  readonly help: string
  /** Index of the member whose seat the child takes, or -1 when the child does not enter. */
  readonly victim: (
    members: readonly Individual[],
    child: Individual,
    tournamentSize: number,
    stream: Stream,
  ) => number
}

export const replacements: readonly ReplacementRow[] = [
  {
    name: 'worst',
    help: 'the child displaces the worst member unless it is worse itself',
    victim: (members, child, _size, stream) =>
      victimUnlessBetter(members, child, oneOfTheWorst(members, stream)),
  },
  {
    name: 'oldest',
    help: 'the child always enters; the member that entered first leaves, even the best',
    victim: () => 0,
  },
  {
    name: 'random',
    help: 'the child always enters; any member leaves, drawn evenly, even the best',
    victim: (members, _child, _size, stream) => uniformIndex(members.length, -1, stream),
  },
  {
    name: 'tournament',
    help: 'the loser of a tournament among distinct members leaves unless the child is worse still',
    victim: (members, child, size, stream) => {
      const rules = { size: Math.max(2, size), distinct: true }
      const loser = tournament(
        members.length,
        rules,
        (a, b) => compareScores(members[b]!, members[a]!),
        stream,
      )
      return victimUnlessBetter(members, child, loser)
    },
  },
  {
    name: 'parent',
    help: 'the child displaces its worse parent, or the worst member when its parents have left, unless it is worse itself',
    victim: (members, child, _size, stream) => {
      let parent = -1
      members.forEach((member, index) => {
        if (!child.parents.includes(member.id)) return
        if (parent < 0 || compareScores(member, members[parent]!) > 0) parent = index
      })
      return victimUnlessBetter(members, child, parent >= 0 ? parent : oneOfTheWorst(members, stream))
    },
  },
]

/** Equal is good enough to enter: otherwise a search could not move across a plateau. */
function victimUnlessBetter(members: readonly Individual[], child: Individual, victim: number): number {
  return compareScores(child, members[victim]!) <= 0 ? victim : -1
}

/** One of those that score worst, drawn evenly: the id would prefer some on a flat landscape. */
function oneOfTheWorst(members: readonly Individual[], stream: Stream): number {
  // Every commit comes through here. The first objective decides almost always, so it is looked at by itself.
  const single = members[0]!.score.length === 1
  let worst = 0
  let worstFirst = members[0]!.score[0]!
  let equals = 1
  for (let index = 1; index < members.length; index++) {
    const first = members[index]!.score[0]!
    if (first < worstFirst) continue
    const order = first > worstFirst ? 1 : single ? 0 : compareScores(members[index]!, members[worst]!)
    if (order > 0) {
      worst = index
      worstFirst = first
      equals = 1
    } else if (order === 0) equals++
  }
  if (equals === 1) return worst
  let skip = stream.below(equals)
  for (let index = worst; ; index++) {
    if (members[index]!.score[0]! !== worstFirst) continue
    if ((single || compareScores(members[index]!, members[worst]!) === 0) && skip-- === 0) return index
  }
}

const byName = new Map(replacements.map((row) => [row.name, row]))

export function replacementNamed(name: string): ReplacementRow {
  const row = byName.get(name)
  check(row !== undefined, `replacement rule ${name} is a row of the table`)
  return row
}
