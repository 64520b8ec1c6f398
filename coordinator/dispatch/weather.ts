// Hostile weather for tests: another dispatcher with its answers delayed and shuffled. Which answers are delayed, by
// how much, and how they are shuffled follows from a seed and the numbers of the evaluation, not from the moment.
//
// A search must not notice: its digest is the same in any weather (only a commit on arrival would change it).

import { limits } from '../../shared/limits.js'
import type { DispatchFact, WorkItem } from '../../shared/result.js'
import { type Stream, stream } from '../../shared/streams.js'
import type { Dispatcher, DispatchStatus } from '../engine/ports.js'

export interface Weather {
  readonly seed: number
  /** The longest delay, as a multiple of `baseMs`; 1000 unless said. */
  readonly maxDelayFactor?: number
  /** One answer in so many is delayed; 8 unless said. */
  readonly oneIn?: number
  /** The shortest delay; about what a simulation takes. 0.2 ms unless said. */
  readonly baseMs?: number
}

/** The same dispatcher under bad weather. No answer is lost; each delay lies between baseMs and baseMs * maxDelayFactor. */
export function underWeather(inner: Dispatcher, weather: Weather): Dispatcher {
  return new WeatherDispatcher(inner, weather)
}

interface Held {
  readonly fact: DispatchFact
  readonly releaseMs: number
  readonly rank: number
}

class WeatherDispatcher implements Dispatcher {
  private readonly inner: Dispatcher
  private readonly weather: Required<Weather>
  private held: Held[] = []

  constructor(inner: Dispatcher, weather: Weather) {
    this.inner = inner
    this.weather = { maxDelayFactor: 1000, oneIn: 8, baseMs: 0.2, ...weather }
  }

  start(): Promise<void> {
    return this.inner.start()
  }
  submit(items: readonly WorkItem[]): void {
    this.inner.submit(items)
  }
  status(): DispatchStatus {
    const { slots, outstanding, wanted } = this.inner.status()
    return { slots, outstanding: outstanding + this.held.length, wanted }
  }
  close(): Promise<void> {
    return this.inner.close()
  }

  async facts(waitMs: number): Promise<DispatchFact[]> {
    const nextMs = this.held.reduce(
      (least, { releaseMs }) => Math.min(least, releaseMs),
      Number.POSITIVE_INFINITY,
    )
    const patienceMs = Math.max(0, Math.min(waitMs, nextMs - performance.now()))
    for (const fact of await this.inner.facts(patienceMs)) this.held.push(this.hold(fact))
    const nowMs = performance.now()
    const due = this.held.filter(({ releaseMs }) => releaseMs <= nowMs)
    this.held = this.held.filter(({ releaseMs }) => releaseMs > nowMs)
    return due.sort((a, b) => a.rank - b.rank).map(({ fact }) => fact)
  }

  private hold(fact: DispatchFact): Held {
    const { delayMs, rank } = fact.kind === 'fleet' ? { delayMs: 0, rank: 0 } : forecast(this.weather, fact)
    return { fact, releaseMs: performance.now() + delayMs, rank }
  }
}

/** Delay and place among the answers of the same moment, from the seed and the evaluation's numbers alone. */
export function forecast(
  weather: Required<Weather>,
  fact: Exclude<DispatchFact, { kind: 'fleet' }>,
): { delayMs: number; rank: number } {
  const { island, evaluation, attempt, purpose } = fact.item
  const tries =
    2 * Math.min(attempt, limits.attemptsBeforeIsolation + limits.attemptsAlone) +
    (purpose === 'confirm' ? 1 : 0)
  const draws: Stream = stream(weather.seed, 'weather', island, evaluation, tries)
  const rank = draws.uniform()
  if (!draws.chance(1, weather.oneIn)) return { delayMs: 0, rank }
  // Every order of magnitude is as likely as any other: linear steps of a factor 10, interpolated within.
  const decades = Math.max(1, Math.ceil(Math.log10(weather.maxDelayFactor)))
  const factor = 10 ** draws.below(decades) * (1 + 9 * draws.uniform())
  return { delayMs: weather.baseMs * Math.min(factor, weather.maxDelayFactor), rank }
}
