// Gaits of the walking model: starts that come back after one step or a few, and how small errors grow. After a
// heel strike two numbers say all, theta and its rate, so the stride map is one of the plane; a gait is a fixed
// point of it (found by Newton's method) and its multipliers are the eigenvalues of the map's derivative: below 1
// in size, errors die out.

import { stanceAfterStrike, takeStep } from './model.js'

export interface Gait {
  readonly theta: number
  readonly thetaRate: number
  /** Of all its steps together. */
  readonly period: number
  /** What is left of one whole turn of the gait minus its start: how well the fixed point is found. */
  readonly residual: number
  /** d(next)/d(start), rows theta and rate. */
  readonly derivative: Rows
}

type Point = readonly [theta: number, thetaRate: number]

/** Where `steps` steps lead and how long they take; nothing when it falls on the way. */
export function strideMap(start: Point, gamma: number, steps: number, stepSeconds: number) {
  let [theta, thetaRate] = start
  let period = 0
  for (let i = 0; i < steps; i++) {
    const taken = takeStep(stanceAfterStrike(theta, thetaRate), gamma, stepSeconds)
    if ('fell' in taken) return undefined
    theta = taken.next.theta
    thetaRate = taken.next.thetaRate
    period += taken.period
  }
  return { theta, thetaRate, period }
}

type Rows = readonly [number, number, number, number]

/**
 * Derivative of `steps` steps together: the product of the derivatives along the way. Nothing when it falls, or a
 * neighbour does.
 */
export function strideDerivative(
  start: Point,
  gamma: number,
  steps: number,
  stepSeconds: number,
): Rows | undefined {
  let [theta, thetaRate] = start
  let product: Rows = [1, 0, 0, 1]
  for (let i = 0; i < steps; i++) {
    const one = oneDerivative([theta, thetaRate], gamma, stepSeconds)
    const end = strideMap([theta, thetaRate], gamma, 1, stepSeconds)
    if (!one || !end) return undefined
    const [a, b, c, d] = one
    const [p, q, r, s] = product
    product = [a * p + b * r, a * q + b * s, c * p + d * r, c * q + d * s]
    theta = end.theta
    thetaRate = end.thetaRate
  }
  return product
}

/** By differences of fourth order. */
function oneDerivative([theta, thetaRate]: Point, gamma: number, stepSeconds: number): Rows | undefined {
  const spread = 2e-4 * theta
  const columns: number[][] = []
  for (const [along, rateAlong] of [
    [spread, 0],
    [0, spread],
  ] as const) {
    const [far, near, back, farBack] = [2, 1, -1, -2].map((way) =>
      strideMap([theta + way * along, thetaRate + way * rateAlong], gamma, 1, stepSeconds),
    )
    if (!far || !near || !back || !farBack) return undefined
    columns.push(
      (['theta', 'thetaRate'] as const).map(
        (name) => (8 * (near[name] - back[name]) - (far[name] - farBack[name])) / (12 * spread),
      ),
    )
  }
  const [byTheta, byRate] = columns as [number[], number[]]
  return [byTheta[0]!, byRate[0]!, byTheta[1]!, byRate[1]!]
}

/** The gait of `steps` steps near `start`, by Newton's method; nothing when it falls or does not settle. */
export function findGait(start: Point, gamma: number, steps: number, stepSeconds: number): Gait | undefined {
  let [theta, thetaRate] = start
  for (let round = 0; round < 12; round++) {
    const end = strideMap([theta, thetaRate], gamma, steps, stepSeconds)
    const derivative = strideDerivative([theta, thetaRate], gamma, steps, stepSeconds)
    if (!end || !derivative) return undefined
    const away = end.theta - theta
    const awayRate = end.thetaRate - thetaRate
    const residual = Math.sqrt(away * away + awayRate * awayRate)
    if (residual < 1e-12 * theta || round === 11) {
      return residual < 1e-9 * theta
        ? { theta, thetaRate, period: end.period, residual, derivative }
        : undefined
    }
    // (derivative - 1) change = -away.
    const [a, b, c, d] = [derivative[0] - 1, derivative[1], derivative[2], derivative[3] - 1]
    const determinant = a * d - b * c
    theta -= (d * away - b * awayRate) / determinant
    thetaRate -= (a * awayRate - c * away) / determinant
  }
  return undefined
}

export interface Multipliers {
  readonly real: readonly [number, number]
  /** Imaginary part of the first; the second has the opposite. */
  readonly imaginary: number
  /** Size of the larger. */
  readonly largest: number
}

/** Eigenvalues of a two-by-two matrix given by rows; the larger real one first. */
export function multipliersOf([a, b, c, d]: Rows): Multipliers {
  const half = (a + d) / 2
  const determinant = a * d - b * c
  const inside = half * half - determinant
  if (inside < 0) {
    return { real: [half, half], imaginary: Math.sqrt(-inside), largest: Math.sqrt(determinant) }
  }
  const root = Math.sqrt(inside)
  const real = half >= 0 ? ([half + root, half - root] as const) : ([half - root, half + root] as const)
  return { real, imaginary: 0, largest: Math.abs(real[0]) }
}
