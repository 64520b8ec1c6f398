import { expect, test } from 'vitest'
import { limits } from '../shared/limits.js'
import type { WorkItem } from '../shared/result.js'
import { defaultTimeLimit, Pace } from './pace.js'

const item = (expectedCost: number, replicates = 1): WorkItem => ({
  island: 1,
  evaluation: 1,
  individual: 1,
  firstReplicate: 0,
  replicates,
  genome: new Uint8Array(),
  expectedCost,
  attempt: 1,
  purpose: 'evaluate',
  isolation: 'shared',
  avoid: [],
})
const many = (count: number, cost = 1) => Array.from({ length: count }, () => item(cost))

test('as long as nothing is known, an item travels alone and has the long time limit', () => {
  const pace = new Pace(defaultTimeLimit)
  expect(pace.batchLength(many(100), 100)).toBe(1)
  expect(pace.limitSeconds(item(1))).toBe(defaultTimeLimit.unmeasuredSeconds)
})

test('a message lasts two to four tenths of a second of what was measured, dear items counting for more', () => {
  const pace = new Pace(defaultTimeLimit)
  for (let i = 0; i < 500; i++) pace.note(item(1 + (i % 3), 2), (1 + (i % 3)) * 2 * 0.001)
  for (const cost of [1, 2, 5]) {
    const seconds = pace.batchLength(many(1000, cost), 1000) * cost * 0.001
    expect(seconds).toBeGreaterThan(0.2)
    expect(seconds).toBeLessThanOrEqual(0.4 + 1e-9)
  }
})

test('a batch is never longer than the limit or than is offered, and never empty', () => {
  const pace = new Pace(defaultTimeLimit, 1e-9)
  expect(pace.batchLength(many(10_000), 10_000)).toBe(limits.dispatchBatch)
  expect(new Pace(defaultTimeLimit, 0.02).batchLength(many(10_000), 3)).toBe(3)
  expect(new Pace(defaultTimeLimit, 100).batchLength(many(5), 5)).toBe(1)
})

test('very cheap items are not split further than messages are worth', () => {
  const pace = new Pace(defaultTimeLimit, 1e-4)
  const seconds = pace.batchLength(many(10_000), 3) * 1e-4
  expect(seconds).toBeGreaterThan(0.015)
  expect(seconds).toBeLessThan(0.03)
  expect(pace.batchLength(many(50), 3)).toBe(50)
})

test('the time limit is 20 times the expected, never under the least', () => {
  const pace = new Pace({ ...defaultTimeLimit, leastSeconds: 10 }, 2)
  expect(pace.limitSeconds(item(3, 4))).toBeCloseTo(20 * 2 * 3 * 4, 9)
  expect(new Pace({ ...defaultTimeLimit, leastSeconds: 10 }, 0.001).limitSeconds(item(1))).toBe(10)
})

test('what is known follows a change of pace', () => {
  const pace = new Pace(defaultTimeLimit, 1)
  for (let i = 0; i < 2000; i++) pace.note(item(1), 0.001)
  expect(pace.expectedSeconds(item(1))).toBeCloseTo(0.001, 6)
  expect(pace.isSlow()).toBe(false)
  for (let i = 0; i < 2000; i++) pace.note(item(1), 2)
  expect(pace.isSlow()).toBe(true)
})
