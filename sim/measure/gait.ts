// How a machine travels: centre of mass, cost of transport, contact duty; and peak, mean and root mean square of any
// quantity that is sampled while it runs.

import { refuse } from '../../shared/refusals.js'
import type { Lattice } from '../lattice/layout.js'

export interface CentreOfMass {
  readonly massKg: number
  /** x, y (up), and z in 3-D. */
  readonly positionM: readonly number[]
  readonly velocityMps: readonly number[]
}

/** Centre of mass of all nodes: sum of m x over sum of m, and its velocity. */
export function centreOfMass({ nodes, nodeCount, stride, dimensions, massKg }: Lattice): CentreOfMass {
  let total = 0
  const sums = new Float64Array(2 * dimensions)
  for (let i = 0; i < nodeCount; i++) {
    total += massKg[i]!
    for (let k = 0; k < 2 * dimensions; k++) sums[k]! += massKg[i]! * nodes[i * stride + k]!
  }
  const means = Array.from(sums, (sum) => sum / total)
  return { massKg: total, positionM: means.slice(0, dimensions), velocityMps: means.slice(dimensions) }
}

/** Path between two places, m: along x; in space along the ground (x and z). Height does not count. */
export function travelM(from: readonly number[], to: readonly number[]): number {
  const along = to[0]! - from[0]!
  if (from.length < 3) return Math.abs(along)
  const across = to[2]! - from[2]!
  return Math.sqrt(along * along + across * across)
}

/**
 * Energy used for carrying the weight over the distance, E / (m g d), without unit (the specific resistance of Gabrielli
 * and von Karman, What price speed?, 1950, from memory). Undefined where nothing was travelled: there is no cost then,
 * and 0 or a large number would be wrong.
 */
export function costOfTransport(of: {
  readonly energyJ: number
  readonly massKg: number
  readonly gravityMps2: number
  readonly distanceM: number
}): number | undefined {
  const { energyJ, massKg, gravityMps2, distanceM } = of
  if (!(massKg > 0 && gravityMps2 > 0)) {
    throw refuse('impossible-value', {
      detail: `found ${massKg} kg under ${gravityMps2} m/s^2, expected both above 0.`,
      where: { field: 'massKg' },
    })
  }
  return distanceM > 0 ? energyJ / (massKg * gravityMps2 * distanceM) : undefined
}

export interface ContactRecord {
  /** Part of the time in contact, 0 to 1 (duty factor). */
  readonly duty: number
  /** Times contact began. */
  readonly touchdowns: number
  /** Mean length of contacts that both began and ended in the record, s; undefined when there was none. */
  readonly meanContactSeconds: number | undefined
  /** Mean time from one touchdown to the next, s; undefined with less than two. */
  readonly meanStrideSeconds: number | undefined
}

/**
 * Duty factor and rhythm of one foot, from samples that are 0 (or false) off the ground. Times to half a sample. The
 * duty factor is that of whole strides, from the first touchdown to the last, where there are two; else of the record.
 */
export function contactRecord(touching: ArrayLike<number | boolean>, sampleSeconds: number): ContactRecord {
  const began: number[] = []
  const lengths: number[] = []
  for (let i = 1; i < touching.length; i++) {
    const [before, now] = [Boolean(touching[i - 1]!), Boolean(touching[i]!)]
    if (now && !before) began.push(i)
    const since = began.at(-1)
    if (before && !now && since !== undefined) lengths.push(i - since)
  }
  const [first = 0, last = touching.length] = began.length > 1 ? [began[0], began.at(-1)] : []
  let inContact = 0
  for (let i = first; i < last; i++) if (touching[i]) inContact++
  const mean = (total: number, count: number) => (count > 0 ? (total * sampleSeconds) / count : undefined)
  return {
    duty: last > first ? inContact / (last - first) : 0,
    touchdowns: began.length,
    meanContactSeconds: mean(
      lengths.reduce((a, b) => a + b, 0),
      lengths.length,
    ),
    meanStrideSeconds: began.length > 1 ? mean(last - first, began.length - 1) : undefined,
  }
}

/** Running statistics of a quantity, in its own unit; equal weight for every sample. */
export interface Statistics {
  count: number
  mean: number
  /** Sum of squared departures from the mean. */
  squares: number
  least: number
  most: number
}

export function newStatistics(): Statistics {
  return {
    count: 0,
    mean: 0,
    squares: 0,
    least: Number.POSITIVE_INFINITY,
    most: Number.NEGATIVE_INFINITY,
  }
}

/** Takes one value in (Welford, Note on a method for calculating corrected sums of squares and products, 1962). */
export function takeValue(statistics: Statistics, value: number): void {
  statistics.count++
  const aside = value - statistics.mean
  statistics.mean += aside / statistics.count
  statistics.squares += aside * (value - statistics.mean)
  statistics.least = Math.min(statistics.least, value)
  statistics.most = Math.max(statistics.most, value)
}

/** Largest absolute value: what a part must stand. 0 when nothing was taken. */
export function peakOf({ count, least, most }: Statistics): number {
  return count === 0 ? 0 : Math.max(Math.abs(least), Math.abs(most))
}

/** Root mean square about 0. */
export function rmsOf({ count, mean, squares }: Statistics): number {
  return count === 0 ? 0 : Math.sqrt(mean * mean + squares / count)
}

/** Standard deviation of the values themselves (root mean square about their mean). */
export function deviationOf({ count, squares }: Statistics): number {
  return count === 0 ? 0 : Math.sqrt(squares / count)
}
