import fc from 'fast-check'
import { expect, test } from 'vitest'
import { Shares } from './shares.js'

/** Serves one simulation after the other for so many seconds; the seconds that each search got. */
function served(
  searches: { readonly [name: string]: { readonly share: number; readonly cost: () => number } },
  seconds: number,
  guess = 0.5,
): Map<string, number> {
  const shares = new Shares()
  const got = new Map(Object.keys(searches).map((name) => [name, 0]))
  for (const [name, { share }] of Object.entries(searches)) shares.set(name, share)
  for (let passed = 0; passed < seconds; ) {
    const name = shares.pick(Object.keys(searches))!
    const cost = searches[name]!.cost()
    shares.charge(name, guess)
    shares.charge(name, cost - guess)
    got.set(name, got.get(name)! + cost)
    passed += cost
  }
  return got
}

test('two searches with costs 10:1 get equal time', () => {
  const got = served({ dear: { share: 1, cost: () => 10 }, cheap: { share: 1, cost: () => 1 } }, 2000)
  expect(got.get('dear')! / got.get('cheap')!).toBeCloseTo(1, 1)
})

test('property: time follows the shares, whatever the costs and the guesses', () => {
  const search = fc.record({ share: fc.integer({ min: 1, max: 5 }), cost: fc.integer({ min: 1, max: 50 }) })
  fc.assert(
    fc.property(
      fc.array(search, { minLength: 2, maxLength: 6 }),
      fc.integer({ min: 0, max: 30 }),
      (list, guess) => {
        const searches = Object.fromEntries(
          list.map(({ share, cost }, i) => [`s${i}`, { share, cost: () => cost }]),
        )
        const shareSum = list.reduce((sum, { share }) => sum + share, 0)
        const got = served(searches, 20_000, guess)
        for (const [i, { share, cost }] of list.entries()) {
          // Nobody is ahead or behind by more than his own simulation, a round, and the last of another.
          const slack = cost + 5 + 50
          expect(Math.abs(got.get(`s${i}`)! - (20_000 * share) / shareSum)).toBeLessThan(slack * list.length)
        }
      },
    ),
    { seed: 11, numRuns: 50 },
  )
})

test('a search that wanted nothing for long does not take the fleet when it comes back', () => {
  const shares = new Shares()
  shares.set('a', 1)
  shares.set('b', 1)
  for (let i = 0; i < 1000; i++) {
    expect(shares.pick(['a'])).toBe('a')
    shares.charge('a', 1)
  }
  let b = 0
  for (let i = 0; i < 100; i++) {
    const next = shares.pick(['a', 'b'])!
    shares.charge(next, 1)
    if (next === 'b') b++
  }
  expect(Math.abs(b - 50)).toBeLessThanOrEqual(2)
})

test('nobody is picked when nobody wants anything, and unknown searches are not', () => {
  const shares = new Shares()
  expect(shares.pick([])).toBeUndefined()
  expect(shares.pick(['stranger'])).toBeUndefined()
})
