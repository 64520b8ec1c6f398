import { expect, test } from 'vitest'
import type { DispatchFact, WorkItem } from '../../shared/result.js'
import type { Dispatcher } from '../engine/ports.js'
import { forecast, underWeather, type Weather } from './weather.js'

const whole = { seed: 5, maxDelayFactor: 1000, oneIn: 8, baseMs: 0.01 } satisfies Required<Weather>

type AnswerFact = Exclude<DispatchFact, { kind: 'fleet' }>
const isAnswer = (fact: DispatchFact): fact is AnswerFact => fact.kind !== 'fleet'

function factOf(evaluation: number): AnswerFact {
  return {
    kind: 'result',
    item: { island: 1, evaluation, attempt: 1, purpose: 'evaluate' },
    result: { values: Float64Array.of(evaluation), failures: [] },
    digest: new Uint8Array(32),
    executor: { kind: 'thread', worker: 'here/1/t1', host: 'here' },
    cpuSeconds: 0,
    wallSeconds: 0,
  }
}

/** Answers everything at once, in order. */
function clearSky(): Dispatcher {
  let inbox: DispatchFact[] = []
  return {
    start: async () => undefined,
    submit: (items: readonly WorkItem[]) => {
      inbox.push(...items.map(({ evaluation }) => factOf(evaluation)))
    },
    facts: async (waitMs) => {
      if (inbox.length === 0) await new Promise((resolve) => setTimeout(resolve, waitMs))
      const facts = inbox
      inbox = []
      return facts
    },
    status: () => ({ slots: 1, outstanding: inbox.length, wanted: 3 }),
    close: async () => undefined,
  }
}

const numbers = Array.from({ length: 300 }, (_, i) => i + 1)

async function arrivals(weather: Weather): Promise<number[]> {
  const dispatcher = underWeather(clearSky(), weather)
  dispatcher.submit(numbers.map((evaluation) => ({ evaluation }) as WorkItem))
  const seen: number[] = []
  while (seen.length < numbers.length)
    seen.push(...(await dispatcher.facts(50)).filter(isAnswer).map(({ item }) => item.evaluation))
  expect(await dispatcher.facts(20)).toEqual([])
  expect(dispatcher.status().outstanding).toBe(0)
  return seen
}

test('every answer arrives once, in another order than it was given', async () => {
  const seen = await arrivals(whole)
  expect([...seen].sort((a, b) => a - b)).toEqual(numbers)
  const inversions = seen.filter((evaluation, i) => i > 0 && evaluation < seen[i - 1]!).length
  expect(inversions).toBeGreaterThan(100)
})

test('what is held back counts as outstanding', async () => {
  const dispatcher = underWeather(clearSky(), { ...whole, oneIn: 1, baseMs: 1e6 })
  dispatcher.submit([{ evaluation: 1 } as WorkItem])
  expect(await dispatcher.facts(5)).toEqual([])
  expect(dispatcher.status()).toEqual({ slots: 1, outstanding: 1, wanted: 3 })
})

test('the forecast follows from the seed and the evaluation alone', () => {
  const all = (seed: number) => numbers.map((n) => forecast({ ...whole, seed }, factOf(n)))
  expect(all(5)).toEqual(all(5))
  expect(all(6)).not.toEqual(all(5))
})

test('one in so many is delayed, by up to a thousand times, all orders of magnitude alike', () => {
  const many = Array.from(
    { length: 8000 },
    (_, i) => forecast({ ...whole, baseMs: 1 }, factOf(i + 1)).delayMs,
  )
  const delayed = many.filter((delayMs) => delayMs > 0)
  // Binomial(8000, 1/8): mean 1000, standard deviation 29.6; four of them.
  expect(Math.abs(delayed.length - 1000)).toBeLessThan(119)
  expect(Math.min(...delayed)).toBeGreaterThanOrEqual(1)
  expect(Math.max(...delayed)).toBeLessThanOrEqual(1000)
  for (const decade of [1, 10, 100]) {
    const share =
      delayed.filter((delayMs) => delayMs >= decade && delayMs < 10 * decade).length / delayed.length
    expect(Math.abs(share - 1 / 3)).toBeLessThan(4 * Math.sqrt(2 / 9 / delayed.length))
  }
})
