import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { stream } from '../../../shared/streams.js'
import { individualOf } from '../../../tests/reference/drive.js'
import type { Individual, Placement } from '../types.js'
import { type Judgement, placeArrivals } from './arrivals.js'
import { byScoreThenId, compareScores } from './selection.js'

const judgement: Judgement = {
  rank: (members) => members.toSorted(byScoreThenId),
  better: (a, b) => compareScores(a, b) < 0,
}

function made(island: number, number: number, score: number): Individual {
  return individualOf(island, number, { genome: {}, parents: [], origin: 'founder', age: 0 }, [score])
}
function residents(...scores: number[]): Individual[] {
  return scores.map((score, k) => made(1, k + 1, score))
}
function strangers(...scores: number[]): Individual[] {
  return scores.map((score, k) => made(2, k + 1, score))
}
function place(
  members: Individual[],
  arrivals: readonly Individual[],
  placement: Placement,
  seats = members.length,
): number[] {
  placeArrivals(members, seats, arrivals, placement, judgement, stream(41000, 'arrivals'))
  return members.map((member) => member.score[0]!)
}

describe('where arrivals sit', () => {
  test('worst: takes the seat of the worst, even when it is worse itself, and enters last', () => {
    expect(place(residents(1, 9, 5), strangers(20), 'worst')).toEqual([1, 5, 20])
  })

  test('worst: two arrivals displace the two worst residents, never each other', () => {
    expect(place(residents(1, 9, 5), strangers(20, 30), 'worst')).toEqual([1, 20, 30])
    expect(place(residents(1, 9, 5), strangers(30, 20), 'worst')).toEqual([1, 20, 30])
  })

  test('worst: the best leaves only for a better one, also in a population of one', () => {
    expect(place(residents(1, 9), strangers(20, 30, 40), 'worst')).toEqual([1, 20])
    expect(place(residents(3), strangers(3), 'worst')).toEqual([3])
    expect(place(residents(3), strangers(2), 'worst')).toEqual([2])
  })

  test('if-better: only what is better than the worst sits down; an equal one does not', () => {
    expect(place(residents(1, 9, 5), strangers(9), 'if-better')).toEqual([1, 9, 5])
    expect(place(residents(1, 9, 5), strangers(8), 'if-better')).toEqual([1, 5, 8])
    expect(place(residents(1, 9, 5), strangers(7, 2, 8), 'if-better')).toEqual([1, 5, 2])
  })

  test('random: every resident is as likely to leave', () => {
    const left = [0, 0, 0, 0]
    for (let run = 0; run < 4000; run++) {
      const members = residents(0, 1, 2, 3)
      placeArrivals(members, 4, strangers(9), 'random', judgement, stream(41100, 'arrivals', run))
      const gone = [0, 1, 2, 3].find((score) => members.every((member) => member.score[0] !== score))
      left[gone!]!++
    }
    // Four standard errors of a share of one quarter.
    for (const count of left) expect(Math.abs(count - 1000)).toBeLessThan(4 * Math.sqrt(4000 * 0.25 * 0.75))
  })

  test('free seats are taken first, whatever the placement', () => {
    for (const placement of ['worst', 'random', 'if-better'] as const) {
      expect(place(residents(1, 2), strangers(50), placement, 3)).toEqual([1, 2, 50])
    }
  })

  test('who sits here already is ignored, and so is the second of two copies', () => {
    const members = residents(1, 9)
    expect(place(members, [members[0]!, members[1]!], 'worst')).toEqual([1, 9])
    const [one] = strangers(20)
    expect(place(residents(1, 9, 5), [one!, { ...one! }], 'worst')).toEqual([1, 5, 20])
  })

  test('a failed arrival never displaces one that works', () => {
    for (const placement of ['worst', 'random', 'if-better'] as const) {
      expect(place(residents(1, 9), strangers(Infinity), placement)).toEqual([1, 9])
    }
    expect(place(residents(1, Infinity), strangers(Infinity), 'worst')).toEqual([1, Infinity])
  })

  test('worst and if-better: who sits in the end does not depend on the order of arrivals or of seats', () => {
    const scores = fc.array(fc.integer({ min: 0, max: 30 }), { minLength: 1, maxLength: 8 })
    const placement = fc.constantFrom<Placement>('worst', 'if-better')
    fc.assert(
      fc.property(scores, scores, placement, fc.nat(1000), (here, there, rule, seed) => {
        const outcome = (members: Individual[], arrivals: Individual[]) => {
          placeArrivals(members, here.length, arrivals, rule, judgement, stream(1, 'arrivals'))
          return members.map((member) => member.id).toSorted()
        }
        const shuffled = <T>(some: readonly T[]): T[] =>
          [...stream(seed, 'spare').permutation(some.length)].map((index) => some[index]!)
        const straight = outcome(residents(...here), strangers(...there))
        expect(outcome(shuffled(residents(...here)), shuffled(strangers(...there)))).toEqual(straight)
        expect(straight.length).toBe(here.length)
      }),
      { numRuns: 300, seed: 41200 },
    )
  })
})
