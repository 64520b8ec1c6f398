// How a budget of simulations is split into quotas. The rule is Jefferson's (D'Hondt's) divisor method: it is
// house-monotone, so a larger budget never takes from an island (Balinski and Young, Fair Representation,
// 1982, from memory), and it never gives less than the whole part of an island's exact share.

import { check } from '../../shared/check.js'

/**
 * Splits `total` (integer) in proportion to positive integer `shares`; the quotas sum to `total`. The next seat
 * goes to the largest share / (seats + 1); ties to the earlier island.
 */
export function splitBudget(total: number, shares: readonly number[]): number[] {
  check(Number.isSafeInteger(total) && total >= 0, 'a budget is a whole number')
  check(
    shares.every((share) => Number.isSafeInteger(share) && share > 0),
    'shares are positive whole numbers',
  )
  if (shares.length === 0) return []
  const sum = shares.reduce((a, b) => a + b, 0)
  // BigInt: total * share may pass 2^53. The lower quota is never exceeded by what the rule would give.
  const quotas = shares.map((share) => Number((BigInt(total) * BigInt(share)) / BigInt(sum)))
  let left = total - quotas.reduce((a, b) => a + b, 0)
  check(left >= 0 && left < shares.length, 'whole parts leave less than one seat an island')
  for (; left > 0; left--) quotas[next(shares, quotas)]! += 1
  return quotas
}

function next(shares: readonly number[], quotas: readonly number[]): number {
  let best = 0
  for (let island = 1; island < shares.length; island++) {
    const ahead =
      BigInt(shares[island]!) * BigInt(quotas[best]! + 1) >
      BigInt(shares[best]!) * BigInt(quotas[island]! + 1)
    if (ahead) best = island
  }
  return best
}
