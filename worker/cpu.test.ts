// What a thread tells of its CPU is its own, and none of it is lost between stretches.

import { describe, expect, it } from 'vitest'
import { CpuSplit, processCpuSeconds, threadCpuClock, wallSeconds } from './cpu.js'

function burn(seconds: number): void {
  const end = wallSeconds() + seconds
  while (wallSeconds() < end);
}

describe('CPU of a thread', () => {
  it('is no more than what the process used, and grows with work', () => {
    const clock = threadCpuClock()
    const before = { own: clock(), all: processCpuSeconds() }
    burn(0.2)
    const own = clock() - before.own
    // Readings lag behind by a scheduler tick at most.
    expect(own).toBeLessThanOrEqual(processCpuSeconds() - before.all + 0.02)
    expect(own).toBeGreaterThan(0)
  })

  it('is shared out whole: readings that lag are made good by the next', () => {
    // A clock that is brought up to date every 4 ms of work; pieces of 2 ms in stretches with pauses between them.
    let worked = 0
    let wall = 0
    const split = new CpuSplit(
      () => Math.floor(worked / 0.004) * 0.004,
      () => wall,
    )
    let told = 0
    for (let stretch = 0; stretch < 50; stretch++) {
      wall += 0.01
      split.start()
      worked += 0.0021
      wall += 0.002
      told += split.rate() * 0.002
    }
    expect(told).toBeGreaterThan(worked - 0.0041)
    expect(told).toBeLessThanOrEqual(worked + 1e-12)
  })
})
