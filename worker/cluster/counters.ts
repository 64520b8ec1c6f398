// What this agent has done since it started.

import type { LaneCounts } from './lane.js'

const minuteMs = 60_000

export class Counters {
  simulations = 0
  failures = 0
  lost = 0
  /** Items given back unfinished. */
  handedBack = 0
  leasesLost = 0
  simulatedSeconds = 0
  /** Unix time. */
  lastAnswerSeconds = 0
  private readonly nowMs: () => number
  /** Simulations at moments of the last minute. */
  private readonly moments: { readonly ms: number; readonly simulations: number }[] = []

  constructor(nowMs: () => number) {
    this.nowMs = nowMs
    this.minute()
  }

  add({ simulations, failures, lost }: LaneCounts): void {
    this.simulations += simulations
    this.failures += failures
    this.lost += lost
  }

  /** Called now and then, so that the rate is that of the last minute. */
  minute(): void {
    const ms = this.nowMs()
    this.moments.push({ ms, simulations: this.simulations })
    while (this.moments.length > 2 && ms - this.moments[1]!.ms > minuteMs) this.moments.shift()
  }

  /** Simulations a second. */
  rate(): number {
    const first = this.moments[0]!
    const seconds = (this.nowMs() - first.ms) / 1000
    return seconds > 0 ? (this.simulations - first.simulations) / seconds : 0
  }

  /** The figures of a heartbeat. */
  beat() {
    const { simulations, failures, lost, handedBack } = this
    return {
      simulations,
      failures,
      lost,
      handedBack,
      rate: this.rate(),
      memoryMB: process.memoryUsage.rss() / 2 ** 20,
    }
  }
}
