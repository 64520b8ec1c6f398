// How much is left and how fast it goes, with a clock that is made up.

import { expect, it } from 'vitest'
import { Meter, simulationsLeft } from './meter.js'

const island = (quota: number, committedSimulations: number, changes: object = {}) => ({
  ended: false,
  paused: false,
  quota,
  counters: { committedSimulations },
  ...changes,
})

it('islands that have ended or are paused have nothing left, and take nothing from what others have', () => {
  const going = island(100, 40)
  const ended = island(100, 98, { ended: true })
  const paused = island(100, 10, { paused: true })
  expect(simulationsLeft([going, ended, paused])).toBe(60)
  expect(simulationsLeft([island(100, 104)])).toBe(0)
})

it('the rate is that of the last half minute, and no time to go is promised where nothing moves', () => {
  let nowMs = 0
  const meter = new Meter(
    () => 2,
    () => nowMs,
  )
  meter.rate(0, 0, 1000)
  nowMs = 10_000
  expect(meter.rate(100, 12, 900)).toEqual({
    simulationsPerSecond: 10,
    busyFraction: 0.6,
    cores: 2,
    secondsLeft: 90,
  })
  nowMs = 45_000
  expect(meter.rate(100, 12, 900).secondsLeft).toBeUndefined()
})
