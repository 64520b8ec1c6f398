// What this thread or process has cost so far, in seconds of CPU.

import { openSync, readSync } from 'node:fs'

export type CpuClock = () => number

// Taken when this file loads, before any plug-in could put another in its place.
const monotonic = performance.now.bind(performance)

export function wallSeconds(): number {
  return monotonic() / 1000
}

/** CPU seconds of this process. */
export function processCpuSeconds(): number {
  const { user, system } = process.cpuUsage()
  return (user + system) / 1e6
}

/**
 * The clock of the thread that calls this: process.threadCpuUsage (Node 23.9 and later), else what Linux keeps of
 * every thread (brought up to date at scheduler ticks: good over tens of milliseconds, not for one short simulation),
 * else wall time, which is too much when there are more busy threads than cores.
 */
export function threadCpuClock(): CpuClock {
  const threads = process as { readonly threadCpuUsage?: () => NodeJS.CpuUsage }
  if (threads.threadCpuUsage !== undefined) {
    return () => {
      const usage = threads.threadCpuUsage?.()
      return usage === undefined ? wallSeconds() : (usage.user + usage.system) / 1e6
    }
  }
  return linuxThreadClock() ?? wallSeconds
}

/** Reads the first number of schedstat, nanoseconds on a processor; undefined where there is no such file. */
function linuxThreadClock(): CpuClock | undefined {
  try {
    const file = openSync('/proc/thread-self/schedstat', 'r')
    const bytes = new Uint8Array(64)
    const clock = (): number => {
      const length = readSync(file, bytes, 0, bytes.length, 0)
      let nanoseconds = 0
      for (let i = 0; i < length && bytes[i]! >= 48 && bytes[i]! <= 57; i++) {
        nanoseconds = nanoseconds * 10 + (bytes[i]! - 48)
      }
      return nanoseconds / 1e9
    }
    return clock() > 0 ? clock : undefined
  } catch {
    return undefined
  }
}

/**
 * CPU of a stretch of time, told of the pieces of work in it in proportion to their wall time. What the thread used
 * between two stretches, to take a message in, goes with the later one: a reading lags behind by up to a scheduler tick,
 * and what it lacks must be in the next.
 */
export class CpuSplit {
  private readonly clock: CpuClock
  private readonly wallClock: () => number
  private cpu: number
  private wall: number

  constructor(clock: CpuClock, wallClock = wallSeconds) {
    this.clock = clock
    this.wallClock = wallClock
    this.cpu = clock()
    this.wall = wallClock()
  }

  /** A stretch begins. */
  start(): void {
    this.wall = this.wallClock()
  }

  /** CPU seconds for one wall second of the stretch that ends here; the next one begins. */
  rate(): number {
    const { cpu, wall } = this
    this.cpu = this.clock()
    this.wall = this.wallClock()
    return this.wall > wall ? (this.cpu - cpu) / (this.wall - wall) : 0
  }
}
