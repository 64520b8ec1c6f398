// How much of a fleet's time is of use, counted in virtual time (tests/cluster/efficiency.ts).

import {
  type Barrier,
  busyAtBarrier,
  busyInCostOrder,
  busyWithMixedIslands,
  killedFleet,
} from '../../cluster/efficiency.js'
import { busyShare, efficiency } from '../../cluster/virtual-fleet.js'
import type { Measure } from '../measure.js'

const workers = 200

function share(ms: number, ofMs: number): string {
  return `${((100 * ms) / ofMs).toFixed(1)} %`
}

function killed(quick: boolean): Measure[] {
  return [0.1, 0.3].flatMap((cv) =>
    [0, 10].map((replacedAfterSeconds) => {
      const seconds = quick ? 300 : 1500
      const fleet = { seed: 1, workers, meanLifeSeconds: 300, ahead: 3, order: 'proposal' } as const
      const accounts = killedFleet({ ...fleet, replacedAfterSeconds, cv, seconds })
      const { aliveMs, usesMs, kills, hedges } = accounts
      return {
        name: `200 workers of mean life 300 s, replaced after ${replacedAfterSeconds} s, simulations of 10 s, cv ${cv}: useful / ideal`,
        unit: '1',
        goal: { atLeast: 0.95 },
        value: efficiency(accounts),
        remark: `${kills} kills, destroyed ${share(usesMs.destroyed, aliveMs)} of the time alive, busy ${busyShare(accounts).toFixed(3)}, confirming ${share(usesMs.confirmed, aliveMs)}, double ${share(usesMs.double, aliveMs)}, ${hedges} hedges`,
      }
    }),
  )
}

/** Busy shares that the design of the orders promises, by spread and lookahead over workers: simulated with one island. */
const promised: readonly (readonly [number, readonly (readonly [number, number])[]])[] = [
  [
    0.1,
    [
      [1.5, 1],
      [2, 1],
      [3, 1],
      [4, 1],
    ],
  ],
  [
    0.3,
    [
      [1.5, 0.73],
      [2, 0.93],
      [3, 1],
      [4, 1],
    ],
  ],
  [
    1,
    [
      [1.5, 0.23],
      [2, 0.29],
      [3, 0.41],
      [4, 0.48],
    ],
  ],
]
const promisedWithin = 0.07

function ordered(quick: boolean): Measure[] {
  return promised.flatMap(([cv, shares]) =>
    shares.map(([ahead, busy]) => {
      // Where waiting is long, what happens in a window hangs on few evaluations: several are averaged.
      const seeds = cv === 1 && !quick ? [1, 2, 3] : [1]
      const seconds = quick ? 600 : cv === 1 ? 4000 : 1500
      const values = seeds.map((seed) => busyInCostOrder({ seed, workers, islands: 1, ahead, cv, seconds }))
      return {
        name: `cost order, spread ${cv}, lookahead ${ahead} x workers: busy`,
        unit: '1',
        goal: { atLeast: busy - promisedWithin },
        value: values.reduce((a, b) => a + b, 0) / values.length,
        remark: `promised ${busy} within ${promisedWithin}; runs ${values.map((one) => one.toFixed(3)).join(' ')}`,
      }
    }),
  )
}

function mixed(quick: boolean): Measure[] {
  const seconds = quick ? 2000 : 10_000
  return [1, 10].map((dear) => {
    const alone = busyWithMixedIslands({ seed: 1, migrates: false, dear, seconds })
    const together = busyWithMixedIslands({ seed: 1, migrates: true, dear, seconds })
    return {
      name: `mixed islands, one ${dear === 1 ? 'as dear as the others' : `${dear} times dearer`}: busy share lost by migration`,
      unit: '1',
      goal: { atMost: 0.05 },
      value: alone - together,
      remark: `${alone.toFixed(3)} without, ${together.toFixed(3)} with`,
    }
  })
}

/**
 * Greedy queue of n exponential jobs on w workers: makespan (n - w) / w + H_w in units of the mean, by the memoryless
 * property; efficiency n / (w makespan).
 */
export function exactAtBarrier({ births, workers }: Pick<Barrier, 'births' | 'workers'>): number {
  let harmonic = 0
  for (let k = 1; k <= workers; k++) harmonic += 1 / k
  return births / (workers * ((births - workers) / workers + harmonic))
}

function barrier(quick: boolean): Measure[] {
  const cases: readonly (readonly [number, number])[] = [
    [10, 10],
    [50, 50],
    [20, 10],
    [100, 10],
  ]
  return cases.map(([births, workers]) => {
    const generations = quick ? 200 : 1000
    const { value, standardError } = busyAtBarrier({ seed: 1, workers, births, generations })
    const exact = exactAtBarrier({ births, workers })
    return {
      name: `barrier, ${births} births on ${workers} workers: from the exact value`,
      unit: 'standard errors',
      goal: { atMost: 4 },
      value: Math.abs(value - exact) / standardError,
      remark: `${value.toFixed(4)} +- ${standardError.toFixed(4)}, exactly ${exact.toFixed(8)}`,
    }
  })
}

export function measureEfficiency(quick: boolean): readonly Measure[] {
  return [...killed(quick), ...ordered(quick), ...mixed(quick), ...barrier(quick)]
}
