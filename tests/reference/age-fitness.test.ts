// Age-fitness Pareto optimisation: exact invariants. Source: Age-Fitness Pareto Optimization, in Genetic
// Programming Theory and Practice VIII, 2011, 129-146 (abstract read; the rules of the algorithm from memory).
// The invariants follow from the rules and are checked on random pools and through the whole machine.

import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { ageFitnessPareto } from '../../coordinator/evolution/methods/age-fitness-pareto.js'
import {
  criteriaOf,
  outlives,
  survivorsOf,
} from '../../coordinator/evolution/methods/age-fitness-reduction.js'
import type { Individual } from '../../coordinator/evolution/types.js'
import { numberOf } from '../../shared/ids.js'
import { stream } from '../../shared/streams.js'
import { drive, individualOf, labelOf, shareBand } from './drive.js'

function aged(number: number, age: number, score: readonly number[]): Individual {
  return individualOf(1, number, { genome: {}, parents: [], origin: 'founder', age }, score)
}

/** Pools with few values, so that ties are common. */
const pools = fc
  .tuple(fc.integer({ min: 1, max: 3 }), fc.integer({ min: 1, max: 30 }), fc.integer({ min: 1, max: 20 }))
  .chain(([objectives, count, size]) =>
    fc.record({
      size: fc.constant(size),
      seed: fc.integer({ min: 0, max: 2 ** 32 - 1 }),
      pool: fc
        .array(
          fc.tuple(
            fc.integer({ min: 0, max: 5 }),
            fc.array(fc.integer({ min: 0, max: 6 }), { minLength: objectives, maxLength: objectives }),
            fc.integer({ min: 0, max: 9 }),
          ),
          { minLength: count, maxLength: count },
        )
        .map((rows) =>
          rows.map(([age, score, luck], k) =>
            aged(k + 1, age, luck === 0 ? score.map(() => Number.POSITIVE_INFINITY) : score),
          ),
        ),
    }),
  )

const points = (pool: readonly Individual[]): Set<string> =>
  new Set(pool.map((one) => [...criteriaOf(one)].join(' ')))
const frontOf = (pool: readonly Individual[]): Individual[] =>
  pool.filter((one) => !pool.some((other) => outlives(other, one)))
/** So wide that no front is thinned. */
const wide = Number.MAX_SAFE_INTEGER

describe('survivors of random pools', () => {
  test('the size is the population, or the points of the front when they are more; every point of it survives', () => {
    fc.assert(
      fc.property(pools, ({ pool, size, seed }) => {
        const survivors = survivorsOf(pool, size, wide, stream(seed, 'commit'))
        const front = points(frontOf(pool))
        expect(survivors.length).toBe(Math.min(pool.length, Math.max(size, front.size)))
        const kept = points(survivors)
        for (const point of front) expect(kept).toContain(point)
      }),
      { numRuns: 500 },
    )
  })

  test('whoever left was beaten or equalled by one who stayed: an older one never removes a younger', () => {
    fc.assert(
      fc.property(pools, ({ pool, size, seed }) => {
        const survivors = survivorsOf(pool, size, wide, stream(seed, 'commit'))
        for (const one of pool.filter((member) => !survivors.includes(member))) {
          const betters = survivors.filter((other) => outlives(other, one) || points([other, one]).size === 1)
          expect(betters.length).toBeGreaterThan(0)
          const failed = one.score[0] === Number.POSITIVE_INFINITY
          if (!failed) for (const better of betters) expect(better.age).toBeLessThanOrEqual(one.age)
        }
      }),
      { numRuns: 500 },
    )
  })

  test('with one objective, a population above its size is a staircase: strictly better with every step of age', () => {
    fc.assert(
      fc.property(pools, ({ pool, seed }) => {
        const single = pool.map((one) => aged(numberOf(one.id), one.age, [one.score[0]!]))
        const stairs = survivorsOf(single, 1, wide, stream(seed, 'commit')).toSorted((a, b) => a.age - b.age)
        for (let k = 1; k < stairs.length; k++) {
          expect(stairs[k]!.age).toBeGreaterThan(stairs[k - 1]!.age)
          expect(stairs[k]!.score[0]!).toBeLessThan(stairs[k - 1]!.score[0]!)
        }
      }),
      { numRuns: 500 },
    )
  })

  test('the best of every objective and a youngest stay, also when the front is thinned to its limit', () => {
    fc.assert(
      fc.property(pools, ({ pool, seed }) => {
        const working = pool.filter((one) => one.score[0] !== Number.POSITIVE_INFINITY)
        if (working.length === 0) return
        const objectives = working[0]!.score.length
        // Room for both ends of every criterion.
        const limit = 2 * (objectives + 1)
        const survivors = survivorsOf(pool, 1, limit, stream(seed, 'commit'))
        expect(survivors.length).toBeLessThanOrEqual(limit)
        for (let m = 0; m <= objectives; m++) {
          const least = (some: readonly Individual[]) => Math.min(...some.map((one) => criteriaOf(one)[m]!))
          expect(least(survivors)).toBe(least(working))
        }
      }),
      { numRuns: 500 },
    )
  })

  test('survivors are as likely as when pairs are drawn until one is decided (the published loop)', () => {
    // Ages and scores with dominance chains, an equal pair and incomparable ones.
    // biome-ignore format: a table
    const rows = [[0, 5], [1, 3], [2, 4], [2, 1], [3, 2], [3, 2], [4, 6], [1, 6]] as const
    const pool = rows.map(([age, score], k) => aged(k + 1, age, [score]))
    const runs = 8000
    const listed = new Array<number>(rows.length).fill(0)
    const published = new Array<number>(rows.length).fill(0)
    for (let run = 0; run < runs; run++) {
      for (const one of survivorsOf(pool, 5, wide, stream(81000, 'commit', 0, run)))
        listed[pool.indexOf(one)]!++
      const left = [...pool]
      const draws = stream(81001, 'commit', 0, run)
      while (left.length > 5) {
        const a = left[draws.below(left.length)]!
        const b = left[draws.below(left.length)]!
        if (a === b) continue
        if (outlives(a, b) || points([a, b]).size === 1) left.splice(left.indexOf(b), 1)
        else if (outlives(b, a)) left.splice(left.indexOf(a), 1)
      }
      for (const one of left) published[pool.indexOf(one)]!++
    }
    listed.forEach((count, k) => {
      const p = (count + published[k]!) / (2 * runs)
      expect(Math.abs(count - published[k]!) / runs).toBeLessThanOrEqual(Math.SQRT2 * shareBand(p, runs))
    })
    // The case decides something: somebody sometimes stays and sometimes goes.
    expect(listed.some((count) => count > 0.1 * runs && count < 0.9 * runs)).toBe(true)
  })
})

describe('the machine', () => {
  const population = 12
  /** A machine on arbitrary but fixed scores with ties, and how it went on for `commits` commits. */
  function run(lookahead: number, objectives: number, commits: number, seed: number) {
    let serial = 0
    const fresh = () => ({ label: Int32Array.of(serial++) })
    const started = drive({
      method: ageFitnessPareto,
      population,
      objectives,
      lookahead,
      seed,
      variation: { founder: fresh, cross: (a) => a, mutate: fresh, distance: () => 0 },
      score: (genome) => {
        const draws = stream(seed, 'spare', 0, 0, labelOf(genome))
        return Array.from({ length: objectives }, () => draws.below(40))
      },
    })
    const committed = Array.from({ length: commits }, () => started.step())
    return { ...started, committed }
  }

  test.each([1, 5, 30])(
    'age is the number of generations since the oldest line began, lookahead %i',
    (lookahead) => {
      const { committed, machine } = run(lookahead, 1, 40 * population, 82000)
      const began = new Map<number, number>()
      committed.forEach((one, commit) => {
        // The commits of the founders belong to generation 0, as do the next ones.
        const generation = Math.max(0, Math.floor(commit / population) - 1)
        const begun = one.parents.map((id) => began.get(id)!)
        began.set(one.id, begun.length === 0 ? generation : Math.min(...begun))
      })
      for (const member of machine.members()) expect(member.age).toBe(39 - began.get(member.id)!)
      expect(new Set(machine.members().map((member) => member.age)).size).toBeGreaterThan(1)
    },
  )

  test.each([1, 5, 30])('a child enters as old as its older parent is then, lookahead %i', (lookahead) => {
    const { step, machine } = run(lookahead, 2, 20 * population, 82100)
    let children = 0
    for (let k = 0; k < 5 * population; k++) {
      const ages = new Map(machine.held().map((one) => [one.id, one.age]))
      const generationEnds = (20 * population + k - population + 1) % population === 0
      const one = step()
      if (one.parents.length === 0 || generationEnds) continue
      if (!one.parents.every((id) => ages.has(id))) continue
      children++
      expect(one.age).toBe(Math.max(...one.parents.map((id) => ages.get(id)!)))
    }
    expect(children).toBeGreaterThan(population)
  })

  test('founders first, then one newcomer in every generation', () => {
    const { committed } = run(1, 1, 20 * population, 82200)
    const newcomers = [...committed.keys()].filter((commit) => committed[commit]!.parents.length === 0)
    const expected = Array.from({ length: population }, (_, k) => k)
    for (let generation = 1; generation < 20; generation++) expected.push(generation * population)
    expect(newcomers).toEqual(expected)
  })

  test.each([1, 2, 3])(
    'the best of each of %i objectives is never lost, members stay within the limit',
    (objectives) => {
      const { machine, step, committed } = run(4, objectives, population, 82300)
      const best = new Array<number>(objectives).fill(Infinity)
      const note = ({ score }: Individual): void => {
        for (let m = 0; m < objectives; m++) best[m] = Math.min(best[m]!, score[m]!)
      }
      committed.forEach(note)
      for (let generation = 0; generation < 60; generation++) {
        for (let k = 0; k < population; k++) note(step())
        const members = machine.members()
        expect(members.length).toBeGreaterThanOrEqual(population)
        expect(members.length).toBeLessThanOrEqual(2 * population)
        for (let m = 0; m < objectives; m++) {
          expect(Math.min(...members.map((member) => member.score[m]!))).toBe(best[m])
        }
      }
    },
  )
})
