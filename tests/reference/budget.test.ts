// The split of a budget against apportionment theory: Jefferson's divisor method (D'Hondt's in Europe) by a house
// that was really seated, by counting seat by seat, and by its published properties. Balinski and Young, Fair
// Representation (1982): divisor methods alone are free of the population paradox, all are house-monotone, and
// Jefferson's alone among them always stays within the lower quota.

import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { splitBudget } from '../../coordinator/evolution/budget.js'

describe('worked examples', () => {
  // The first apportionment of the United States (Act of April 14, 1792): census of 1790, one seat for each 33,000,
  // fractions dropped, 105 seats in all. Populations as in Balinski and Young (1982), from memory; the seats follow
  // from them by the divisor, which the test does again.
  test('the House of Representatives of 1792', () => {
    const census = {
      Virginia: 630_560,
      Massachusetts: 475_327,
      Pennsylvania: 432_879,
      'North Carolina': 353_523,
      'New York': 331_589,
      Maryland: 278_514,
      Connecticut: 236_841,
      'South Carolina': 206_236,
      'New Jersey': 179_570,
      'New Hampshire': 141_822,
      'the fourteenth state': 85_533,
      Georgia: 70_835,
      Kentucky: 68_705,
      'Rhode Island': 68_446,
      Delaware: 55_540,
    }
    const seats = [19, 14, 13, 10, 10, 8, 7, 6, 5, 4, 2, 2, 2, 2, 1]
    expect(Object.values(census).map((people) => Math.floor(people / 33_000))).toEqual(seats)
    expect(splitBudget(105, Object.values(census))).toEqual(seats)
  })

  // The example that texts on D'Hondt's method use (from memory).
  test('eight seats for 100,000, 80,000, 30,000 and 20,000 votes', () => {
    expect(splitBudget(8, [100_000, 80_000, 30_000, 20_000])).toEqual([4, 3, 1, 0])
  })

  test('equal shares: what is left over goes to the first islands', () => {
    expect(splitBudget(11, [4, 4, 4])).toEqual([4, 4, 3])
    expect(splitBudget(0, [1, 2])).toEqual([0, 0])
    expect(splitBudget(7, [])).toEqual([])
  })
})

/** Seat by seat from nothing, with the definition's own quotient. */
function seatBySeat(total: number, shares: readonly number[]): number[] {
  const seats = shares.map(() => 0)
  for (let seat = 0; seat < total; seat++) {
    let winner = 0
    for (let island = 1; island < shares.length; island++) {
      // share / (seats + 1), compared without division.
      if (shares[island]! * (seats[winner]! + 1) > shares[winner]! * (seats[island]! + 1)) winner = island
    }
    seats[winner]!++
  }
  return seats
}

describe('properties', () => {
  const someShares = fc.array(fc.oneof(fc.integer({ min: 1, max: 40 }), fc.constantFrom(1, 1, 3, 24, 24)), {
    minLength: 1,
    maxLength: 12,
  })
  const anyShares = fc.array(fc.integer({ min: 1, max: 2 ** 40 }), { minLength: 1, maxLength: 30 })
  const anyTotal = fc.integer({ min: 0, max: 2 ** 52 })
  const sumOf = (numbers: readonly number[]) => numbers.reduce((a, b) => a + b, 0)
  const seeded = { seed: 24_000, numRuns: 400 }

  test('equals counting seat by seat', () => {
    fc.assert(
      fc.property(fc.integer({ min: 0, max: 400 }), someShares, (total, shares) => {
        expect(splitBudget(total, shares)).toEqual(seatBySeat(total, shares))
      }),
      seeded,
    )
  })

  test('is house-monotone: a larger budget never takes from an island', () => {
    fc.assert(
      fc.property(anyTotal, fc.integer({ min: 1, max: 1_000 }), anyShares, (total, more, shares) => {
        const before = splitBudget(total, shares)
        splitBudget(total + more, shares).forEach((quota, island) => {
          expect(quota).toBeGreaterThanOrEqual(before[island]!)
        })
      }),
      seeded,
    )
  })

  test('sums to the budget and gives nobody less than the whole part of the exact share', () => {
    fc.assert(
      fc.property(anyTotal, anyShares, (total, shares) => {
        const quotas = splitBudget(total, shares)
        expect(quotas.reduce((sum, quota) => sum + BigInt(quota), 0n)).toBe(BigInt(total))
        const all = shares.reduce((sum, share) => sum + BigInt(share), 0n)
        quotas.forEach((quota, island) => {
          expect(BigInt(quota) >= (BigInt(total) * BigInt(shares[island]!)) / all).toBe(true)
        })
      }),
      seeded,
    )
  })

  test('one common divisor explains every quota', () => {
    fc.assert(
      fc.property(fc.integer({ min: 1, max: 5_000 }), someShares, (total, shares) => {
        const quotas = splitBudget(total, shares)
        // The dearest seat given costs no more than the cheapest not given: share / seats against share / (seats + 1).
        const given = Math.min(
          ...shares.map((share, at) => (quotas[at]! > 0 ? share / quotas[at]! : Infinity)),
        )
        const refused = Math.max(...shares.map((share, at) => share / (quotas[at]! + 1)))
        expect(given).toBeGreaterThanOrEqual(refused)
        expect(sumOf(quotas)).toBe(total)
      }),
      seeded,
    )
  })

  test('equal shares differ by one at most, and a larger share never gets less', () => {
    fc.assert(
      fc.property(anyTotal, anyShares, (total, shares) => {
        const quotas = splitBudget(total, shares)
        for (let a = 0; a < shares.length; a++) {
          for (let b = 0; b < shares.length; b++) {
            if (shares[a]! > shares[b]!) expect(quotas[a]!).toBeGreaterThanOrEqual(quotas[b]!)
            if (shares[a] === shares[b]) expect(Math.abs(quotas[a]! - quotas[b]!)).toBeLessThanOrEqual(1)
          }
        }
      }),
      { ...seeded, numRuns: 100 },
    )
  })

  test('only whole budgets and shares above zero are taken', () => {
    for (const total of [-1, 0.5, 2 ** 53, Number.NaN])
      expect(() => splitBudget(total, [1])).toThrow('a budget')
    for (const share of [0, -2, 1.5, Number.NaN]) expect(() => splitBudget(3, [1, share])).toThrow('shares')
  })
})
