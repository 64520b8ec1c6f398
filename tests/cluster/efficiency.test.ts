// The small version of the figure `cluster-efficiency`: values that are known exactly, and one promise.

import { expect, test } from 'vitest'
import { busyAtBarrier, busyInCostOrder, killedFleet } from './efficiency.js'
import { efficiency } from './virtual-fleet.js'

// n exponential jobs on w workers, greedy queue: (n - w) / w + H_w by the memoryless property. Values computed from
// it; for n = w the efficiency is 1 / H_n.
const barriers = [
  { births: 10, workers: 10, exact: 1 / 2.928968253968 },
  { births: 50, workers: 50, exact: 1 / 4.499205338329 },
  { births: 20, workers: 10, exact: 0.50903949 },
  { births: 100, workers: 10, exact: 0.83829547 },
]

test.each(barriers)('a generation of $births on $workers workers costs what a barrier must', (barrier) => {
  const { value, standardError } = busyAtBarrier({ ...barrier, seed: 20261201, generations: 120 })
  expect(standardError).toBeLessThan(0.03)
  expect(Math.abs(value - barrier.exact)).toBeLessThan(4 * standardError)
})

test('an island in cost order keeps workers as busy as its order promises', () => {
  const busy = busyInCostOrder({ seed: 1, workers: 50, islands: 1, ahead: 2, cv: 0.1, seconds: 400 })
  expect(busy).toBeGreaterThan(1 - 0.07)
  const scarce = busyInCostOrder({ seed: 1, workers: 50, islands: 1, ahead: 1.5, cv: 1, seconds: 400 })
  expect(scarce).toBeLessThan(0.6)
})

test('killed workers cost hardly more than the work that dies with them', () => {
  const fleet = { workers: 50, meanLifeSeconds: 300, replacedAfterSeconds: 0, ahead: 3, cv: 0.1 } as const
  const accounts = killedFleet({ ...fleet, seed: 1, order: 'proposal', seconds: 300 })
  expect(accounts.kills).toBeGreaterThan(20)
  expect(accounts.usesMs.destroyed).toBeGreaterThan(0)
  expect(efficiency(accounts)).toBeGreaterThan(0.95)
})
