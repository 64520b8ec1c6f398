import { describe, expect, test } from 'vitest'
import { stream } from '../../../shared/streams.js'
import { individualOf } from '../../../tests/reference/drive.js'
import type { Individual } from '../types.js'
import { replacementNamed } from './replacement.js'

function made(number: number, score: number, parents: number[] = []): Individual {
  return individualOf(1, number, { genome: {}, parents, origin: 'mutated', age: 0 }, [score])
}
const members = [made(1, 4), made(2, 9), made(3, 9), made(4, 1)]

/** How often each member was the victim in 3,000 tries; the last count is "the child does not enter". */
function victims(rule: string, child: Individual, tournament = 2): number[] {
  const counts = new Array<number>(members.length + 1).fill(0)
  for (let run = 0; run < 3000; run++) {
    const victim = replacementNamed(rule).victim(members, child, tournament, stream(42000, 'commit', run))
    counts[victim < 0 ? members.length : victim]!++
  }
  return counts
}
/** Four standard errors around a share of 3,000. */
function expectShare(count: number, p: number): void {
  expect(Math.abs(count / 3000 - p)).toBeLessThan(4 * Math.sqrt((p * (1 - p)) / 3000))
}

describe('who leaves when a child enters', () => {
  test('worst: one of the worst, drawn evenly, also for an equal child; a worse child stays out', () => {
    const counts = victims('worst', made(9, 9))
    expect([counts[0], counts[3], counts[4]]).toEqual([0, 0, 0])
    expectShare(counts[1]!, 0.5)
    expect(victims('worst', made(9, 10))).toEqual([0, 0, 0, 0, 3000])
    expect(victims('worst', made(9, Infinity))).toEqual([0, 0, 0, 0, 3000])
  })

  test('oldest: always the first to have entered', () => {
    expect(victims('oldest', made(9, 100))).toEqual([3000, 0, 0, 0, 0])
  })

  test('random: anybody, evenly, for any child', () => {
    for (const count of victims('random', made(9, 100)).slice(0, 4)) expectShare(count, 0.25)
  })

  test('tournament of two: the worse of two distinct members, equals evenly, so the best never leaves', () => {
    const counts = victims('tournament', made(9, 0))
    // Six pairs: each of the two worst loses two and half of the one between them, the 4 loses to the 1.
    for (const [index, p] of [1 / 6, 5 / 12, 5 / 12].entries()) expectShare(counts[index]!, p)
    expect(counts[3]).toBe(0)
  })

  test('parent: the worse parent, for a child that is no worse; without parents here one of the worst', () => {
    const [a, b] = [members[0]!.id, members[3]!.id]
    expect(victims('parent', made(9, 4, [a, b]))).toEqual([3000, 0, 0, 0, 0])
    expect(victims('parent', made(9, 5, [a, b]))).toEqual([0, 0, 0, 0, 3000])
    const counts = victims('parent', made(9, 5, [77]))
    expect(counts[1]! + counts[2]!).toBe(3000)
  })
})
