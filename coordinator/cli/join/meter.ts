// How fast a running search is: simulations a second and how busy its cores are, over the last half minute.

import type { Island } from '../../evolution/island.js'
import type { ProgressView } from '../progress-view.js'

/** Simulations that are still to do: an island that has ended or is paused has none left, whatever its quota. */
export function simulationsLeft(
  islands: readonly (Pick<Island, 'ended' | 'paused' | 'quota'> & {
    readonly counters: Pick<Island['counters'], 'committedSimulations'>
  })[],
): number {
  return islands.reduce(
    (sum, { ended, paused, quota, counters }) =>
      sum + (ended || paused ? 0 : Math.max(0, quota - counters.committedSimulations)),
    0,
  )
}

interface Reading {
  readonly atMs: number
  readonly simulations: number
  readonly cpuSeconds: number
}

const windowMs = 30_000

export class Meter {
  readonly #cores: () => number
  readonly #nowMs: () => number
  #readings: Reading[] = []
  #lastMs: number

  /** `cores` may change while a search runs; `nowMs` is monotonic. */
  constructor(cores: () => number, nowMs: () => number) {
    this.#cores = cores
    this.#nowMs = nowMs
    this.#lastMs = nowMs()
  }

  /** True at most once in so many seconds. */
  isDue(seconds: number): boolean {
    const nowMs = this.#nowMs()
    if (nowMs - this.#lastMs < seconds * 1000) return false
    this.#lastMs = nowMs
    return true
  }

  /** Totals so far in, the rate out; `left` is how many simulations are still to do. */
  rate(simulations: number, cpuSeconds: number, left: number): NonNullable<ProgressView['rate']> {
    const now = { atMs: this.#nowMs(), simulations, cpuSeconds }
    this.#readings = [...this.#readings.filter((one) => one.atMs >= now.atMs - windowMs), now]
    const first = this.#readings[0]!
    const seconds = (now.atMs - first.atMs) / 1000
    const perSecond = seconds > 0 ? (now.simulations - first.simulations) / seconds : 0
    const cores = this.#cores()
    const busy = seconds > 0 && cores > 0 ? (now.cpuSeconds - first.cpuSeconds) / seconds / cores : 0
    return {
      simulationsPerSecond: perSecond,
      busyFraction: Math.min(1, busy),
      cores,
      ...(perSecond > 0 ? { secondsLeft: left / perSecond } : {}),
    }
  }
}
