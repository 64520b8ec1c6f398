// The few statistics of the benchmark: medians, a slope, a sign test and a bootstrap interval.

import { stream } from '../../shared/streams.js'

export function mean(values: readonly number[]): number {
  return values.reduce((sum, value) => sum + value, 0) / values.length
}

export function median(values: readonly number[]): number {
  const sorted = values.toSorted((a, b) => a - b)
  const middle = Math.floor(sorted.length / 2)
  return sorted.length % 2 === 1 ? sorted[middle]! : (sorted[middle - 1]! + sorted[middle]!) / 2
}

/** Least-squares slope of y over x. */
export function slope(points: readonly (readonly [x: number, y: number])[]): number {
  const meanX = mean(points.map(([x]) => x))
  const meanY = mean(points.map(([, y]) => y))
  const products = points.reduce((sum, [x, y]) => sum + (x - meanX) * (y - meanY), 0)
  const squares = points.reduce((sum, [x]) => sum + (x - meanX) ** 2, 0)
  return products / squares
}

/** One-sided sign test: the chance of `wins` or more of `n` when both sides are equally good (exact binomial). */
export function signTest(wins: number, n: number): number {
  let ways = 1
  let tail = 0
  for (let k = 0; k <= n; k++) {
    if (k >= wins) tail += ways
    ways = (ways * (n - k)) / (k + 1)
  }
  return tail / 2 ** n
}

const resamples = 10_000

/** 95 % percentile bootstrap interval of the mean (Efron and Tibshirani, An introduction to the bootstrap, 1993). */
export function bootstrapInterval(values: readonly number[]): readonly [number, number] {
  const draw = stream(1, 'spare', values.length)
  const means = Array.from({ length: resamples }, () =>
    mean(values.map(() => values[draw.below(values.length)]!)),
  ).sort((a, b) => a - b)
  return [means[Math.floor(0.025 * resamples)]!, means[Math.ceil(0.975 * resamples) - 1]!]
}
