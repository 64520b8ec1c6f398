import { describe, expect, it } from 'vitest'
import { busyAt, expectedDrift, recommend, spreadOf } from './advice.js'

describe('advice on order and lookahead', () => {
  it('reads the table of busy workers at its rows, between them and beyond', () => {
    const busy = (spread: number) => busyAt(spread).map((row) => row.busy)
    expect(busy(0.3)).toEqual([0.62, 0.73, 0.93, 1, 1])
    expect(busy(0)).toEqual(busy(0.1))
    for (const [column, share] of busy(1).entries()) expect(busy(5)[column]).toBeCloseTo(share, 12)
    expect(busy(0.65)[4]).toBeCloseTo((1 + 0.48) / 2, 10)
  })
  it('keeps order proposal where times are alike, and the smallest lookahead that keeps workers busy', () => {
    expect(recommend({ mean: 1, cv: 0.05 }, { mean: 1, cv: 0.05 }, 40)).toMatchObject({
      order: 'proposal',
      lookahead: 50,
    })
    expect(recommend({ mean: 1, cv: 0.3 }, { mean: 1, cv: 0.3 }, 40)).toMatchObject({
      order: 'proposal',
      lookahead: 80,
    })
  })
  it('recommends cost where expected cost foretells the time, arrival only where nothing does', () => {
    expect(recommend({ mean: 1, cv: 1.2 }, { mean: 1, cv: 0.1 }, 40)).toMatchObject({
      order: 'cost',
      lookahead: 50,
    })
    expect(recommend({ mean: 1, cv: 1.2 }, { mean: 1, cv: 1.2 }, 40)).toMatchObject({
      order: 'arrival',
      busy: undefined,
    })
  })
  it('computes a spread with the sample standard deviation', () => {
    expect(spreadOf([1, 2, 3])).toEqual({ mean: 2, cv: 0.5 })
    expect(spreadOf([4])).toEqual({ mean: 4, cv: 0 })
  })
})

describe('what order cost does without selection', () => {
  it('nothing, where all cost the same', () => {
    // Neutral copying keeps the expected share at 1/2; the share of one run has a standard deviation of 1/2 at most (all
    // or nothing), so 100 runs have a standard error of 0.05 at most.
    const { cheapShare } = expectedDrift(1 + 1e-9, 24, 240, 100)
    expect(Math.abs(cheapShare - 0.5)).toBeLessThan(4 * 0.05)
  })
  it('favours cheap bodies, more so with a wider window', () => {
    const wide = expectedDrift(10, 240, 240, 16).cheapShare
    const narrow = expectedDrift(10, 4, 240, 16).cheapShare
    expect(wide).toBeGreaterThan(0.6)
    expect(wide).toBeGreaterThan(narrow)
  })
})
