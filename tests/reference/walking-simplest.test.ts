// The simplest walking model. Garcia, Chatterjee, Ruina and Coleman, The simplest walking model: stability, complexity,
// and scaling, 1998 (equations and the stable range; abstract read). Gaits at slope 0.009 also as in Bhounsule's public
// code (2013) and his paper on the model (2014; abstract read). Where only "recomputed" stands: computed twice, by
// this code and by another one independent of it.

import { describe, expect, test } from 'vitest'
import { findGait, type Gait, multipliersOf, strideMap } from '../../sim/problems/ramp-walker/gaits.js'
import { endStep, stanceAfterStrike, startStep, takeStep } from '../../sim/problems/ramp-walker/model.js'

const h = 0.01

/** First guesses by the small-slope law. */
const longGuess = (gamma: number) => {
  const root = Math.cbrt(gamma)
  return [0.970956 * root - 0.186568 * gamma, -1.014846 * root + 1.24 * gamma] as const
}
const shortGuess = (gamma: number) => {
  const root = Math.cbrt(gamma)
  return [0.943976 * root - 0.264565 * gamma, -1.029246 * root + 1.15 * gamma] as const
}
function gait(guess: readonly [number, number], gamma: number, steps = 1, stepSeconds = h): Gait {
  const found = findGait(guess, gamma, steps, stepSeconds)
  if (!found) throw new Error(`no gait at ${gamma}`)
  return found
}

describe('the gaits at slope 0.009', () => {
  // theta, theta', phi, phi', period.
  const rows = [
    ['long', longGuess, 0.200310900544, -0.199832473005, 0.400621801088, -0.015822999948, 3.8824637529],
    ['short', shortGuess, 0.19393736981, -0.203866927442, 0.38787473962, -0.015144260853, 3.0961058681],
  ] as const

  test.each(rows)('%s', (_, guess, theta, thetaRate, phi, phiRate, period) => {
    const found = gait(guess(0.009), 0.009)
    expect(Math.abs(found.theta - theta)).toBeLessThan(1e-11)
    expect(Math.abs(found.thetaRate - thetaRate)).toBeLessThan(1e-11)
    expect(Math.abs(2 * found.theta - phi)).toBeLessThan(1e-11)
    expect(Math.abs(stanceAfterStrike(found.theta, found.thetaRate).phiRate - phiRate)).toBeLessThan(1e-11)
    expect(Math.abs(found.period - period)).toBeLessThan(1e-9)
  })

  test('multipliers: the long gait spirals in, the short one is a saddle', () => {
    const long = multipliersOf(gait(longGuess(0.009), 0.009).derivative)
    expect(long.real[0]).toBeCloseTo(-0.19009984, 7)
    expect(long.imaginary).toBeCloseTo(0.55759878, 7)
    expect(long.largest).toBeCloseTo(0.58911319, 7)
    const short = multipliersOf(gait(shortGuess(0.009), 0.009).derivative)
    expect(short.real[0] / 4.00386436).toBeCloseTo(1, 7)
    expect(short.real[1] / 0.45958959).toBeCloseTo(1, 7)
  })

  test('every step repeats the gait, and a start beside it comes nearer by 0.589 a step on average', () => {
    const { theta, thetaRate } = gait(longGuess(0.009), 0.009)
    const away = (steps: number) => {
      const end = strideMap([theta + 1e-5, thetaRate], 0.009, steps, h)!
      return Math.hypot(end.theta - theta, end.thetaRate - thetaRate)
    }
    // The map stretches some directions at first; over 11 steps, about a turn of the spiral and more, it shrinks.
    expect((away(18) / away(7)) ** (1 / 11)).toBeCloseTo(0.589, 1)
  })

  test('step length, speed and the energy of a step', () => {
    const { theta, thetaRate, period } = gait(longGuess(0.009), 0.009)
    expect(2 * Math.sin(theta)).toBeCloseTo(0.397948048842, 10)
    expect((2 * Math.sin(theta)) / period).toBeCloseTo(0.102498844594, 10)
    // What gravity does in a step is lost at heel strike: v- after the strike is cos 2 theta of v- before.
    const before = thetaRate / Math.cos(2 * theta)
    expect(0.5 * before * before * Math.sin(2 * theta) ** 2).toBeCloseTo(0.003581484089, 10)
    expect(2 * Math.sin(theta) * Math.sin(0.009)).toBeCloseTo(0.003581484089, 10)
  })

  test('energy of the stance leg is kept within a step', () => {
    const start = stanceAfterStrike(0.2003109, -0.1998325)
    const motion = startStep(start, 0.009, h)
    const energy = () => 0.5 * motion.state[1]! ** 2 + Math.cos(motion.state[0]! - 0.009)
    const first = energy()
    endStep(motion, 0.009)
    expect(Math.abs(energy() - first)).toBeLessThan(1e-11)
  })

  test('a step converges at fourth order, heel strike included', () => {
    const end = (stepSeconds: number) => {
      const taken = takeStep(stanceAfterStrike(0.2003109, -0.1998325), 0.009, stepSeconds)
      if ('fell' in taken) throw new Error(taken.fell)
      return [taken.period, taken.next.theta, taken.next.thetaRate]
    }
    const [coarse, middle, fine] = [0.05, 0.025, 0.0125].map(end)
    const apart = (p: number[], q: number[]) => Math.hypot(...p.map((one, i) => one - q[i]!))
    const order = Math.log2(apart(coarse!, middle!) / apart(middle!, fine!))
    expect(order).toBeGreaterThan(3.9)
    expect(order).toBeLessThan(4.1)
  })

  test('the scuff is not the heel strike, though theta is below zero there in the short gait', () => {
    const { theta, thetaRate } = gait(shortGuess(0.009), 0.009)
    const motion = startStep(stanceAfterStrike(theta, thetaRate), 0.009, h)
    const clearance = () => motion.state[2]! - 2 * motion.state[0]!
    expect(endStep(motion, 0.009, 2.1438)).toBeUndefined()
    expect(clearance()).toBeCloseTo(0, 4)
    expect(motion.state[0]).toBeCloseTo(-0.0499, 3)
    expect(endStep(motion, 0.009)!.period).toBeCloseTo(3.0961058681, 8)
  })
})

test('a swing foot that comes up to the ramp behind the stance leg is no heel strike', () => {
  // So slow that the stance leg never gets over: the swing leg has swung there and back by then, and phi - 2 theta grows
  // through zero while theta is above it.
  const motion = startStep(stanceAfterStrike(0.2, -0.19), 0.009, h)
  const clearance = () => motion.state[2]! - 2 * motion.state[0]!
  let [before, passages] = [clearance(), 0]
  for (let until = 0.05; until < 11; until += 0.05) {
    if (endStep(motion, 0.009, until)) break
    if (before < 0 && clearance() >= 0) {
      expect(motion.state[0]).toBeGreaterThan(0)
      passages++
    }
    before = clearance()
  }
  expect(passages).toBeGreaterThan(0)
  expect(takeStep(stanceAfterStrike(0.2, -0.19), 0.009, h)).toHaveProperty('fell', 'fell backwards')
})

describe('other slopes', () => {
  // gamma, theta, theta', period; recomputed.
  const long = [
    [0.003, 0.1394802488, -0.1426017346, 3.84544291],
    [0.004, 0.1533895649, -0.1560801467, 3.85261346],
    [0.006, 0.1753269527, -0.1768916293, 3.86545958],
    [0.008, 0.1927176924, -0.1929530343, 3.87702197],
    [0.012, 0.22009122, -0.21733855, 3.89779434],
    [0.015, 0.23671218, -0.23154613, 3.91200394],
  ] as const
  const short = [
    [0.003, 0.1353447694, -0.1450052399, 3.12118482],
    [0.006, 0.1699250374, -0.180182992, 3.10789899],
  ] as const

  test.each(long)('long gait at %d', (gamma, theta, thetaRate, period) => {
    const found = gait(longGuess(gamma), gamma)
    expect(found.theta / theta).toBeCloseTo(1, 7)
    expect(found.thetaRate / thetaRate).toBeCloseTo(1, 7)
    expect(found.period / period).toBeCloseTo(1, 8)
  })

  test.each(short)('short gait at %d', (gamma, theta, thetaRate, period) => {
    const found = gait(shortGuess(gamma), gamma)
    expect(found.theta / theta).toBeCloseTo(1, 8)
    expect(found.thetaRate / thetaRate).toBeCloseTo(1, 8)
    expect(found.period / period).toBeCloseTo(1, 8)
  })

  test('at 0.015 the long gait is nearly at the end of its stability', () => {
    expect(multipliersOf(gait(longGuess(0.015), 0.015).derivative).real[0]).toBeCloseTo(-0.9804644, 6)
  })

  test('it is stable from small slopes up to 0.01509, and not beyond; the short one nowhere', () => {
    for (const gamma of [0.001, 0.005, 0.01, 0.015]) {
      expect(multipliersOf(gait(longGuess(gamma), gamma).derivative).largest).toBeLessThan(1)
      expect(multipliersOf(gait(shortGuess(gamma), gamma).derivative).largest).toBeGreaterThan(1)
    }
    expect(multipliersOf(gait(longGuess(0.0152), 0.0152).derivative).largest).toBeGreaterThan(1)
  })
})

describe('towards chaos', () => {
  const coarse = 0.02

  /** The walking state after `steps` steps; throws where it falls. */
  function walked(start: readonly [number, number], gamma: number, steps: number): readonly [number, number] {
    const end = strideMap(start, gamma, steps, coarse)
    if (!end) throw new Error(`fell at ${gamma}`)
    return [end.theta, end.thetaRate]
  }

  /** Slope where the gait of `steps` steps has a multiplier of -1, by the secant rule. */
  function doubling(start: readonly [number, number], steps: number, from: number, to: number): number {
    let place = start
    const excess = (gamma: number) => {
      const found = gait(place, gamma, steps, coarse)
      place = [found.theta, found.thetaRate]
      return multipliersOf(found.derivative).real[0] + 1
    }
    let [a, b] = [from, to]
    let [left, right] = [excess(a), excess(b)]
    for (let i = 0; i < 8 && Math.abs(b - a) > 1e-10; i++) {
      const next = b - (right * (b - a)) / (right - left)
      ;[a, left] = [b, right]
      ;[b, right] = [next, excess(next)]
    }
    return b
  }

  test('one step becomes two at 0.0150884', () => {
    // Published as about 0.0151 (from memory); recomputed 0.015088438.
    expect(Math.abs(doubling(longGuess(0.015), 1, 0.0149, 0.0151) - 0.0150884)).toBeLessThan(1e-5)
    expect(doubling(longGuess(0.015), 1, 0.0149, 0.0151)).toBeCloseTo(0.015088438, 8)
  })

  test('at 0.0170 two different steps alternate', () => {
    const start = walked(longGuess(0.015), 0.017, 150)
    const found = gait(start, 0.017, 2, coarse)
    const other = walked([found.theta, found.thetaRate], 0.017, 1)[0]
    expect(Math.max(found.theta, other)).toBeCloseTo(0.2537896211, 9)
    expect(Math.min(found.theta, other)).toBeCloseTo(0.2378129168, 9)
    expect(multipliersOf(found.derivative).largest).toBeLessThan(1)
  })

  test('two become four at 0.0176694, four eight at 0.0181601', () => {
    const two = walked(longGuess(0.015), 0.0174, 200)
    const four = walked(longGuess(0.015), 0.018, 300)
    expect(doubling(two, 2, 0.0175, 0.0176)).toBeCloseTo(0.01766937486, 8)
    expect(doubling(four, 4, 0.01805, 0.0181)).toBeCloseTo(0.01816011956, 8)
  })

  test('at 0.0188 nothing repeats within 32 steps, and errors grow by exp(0.337) a step', () => {
    let start = walked(longGuess(0.015), 0.017, 50)
    start = walked(start, 0.0188, 100)
    const path = [start]
    for (let i = 0; i < 200; i++) path.push(walked(path.at(-1)!, 0.0188, 1))
    for (let period = 1; period <= 32; period++) {
      const apart = path.slice(period).map(([theta], i) => Math.abs(theta - path[i]![0]))
      expect(Math.max(...apart)).toBeGreaterThan(1e-3)
    }
    // Two walkers side by side, brought back to 1e-7 apart after every step (Benettin's method, from memory).
    const growth: number[] = []
    let beside: readonly [number, number] = [start[0] + 1e-7, start[1]]
    for (let i = 0; i < 1_200; i++) {
      const next = walked(start, 0.0188, 1)
      const nextBeside = walked(beside, 0.0188, 1)
      const [x, y] = [nextBeside[0] - next[0], nextBeside[1] - next[1]]
      const apart = Math.hypot(x, y)
      growth.push(Math.log(apart / 1e-7))
      start = next
      beside = [next[0] + (1e-7 * x) / apart, next[1] + (1e-7 * y) / apart]
    }
    // Standard error from means of 20 blocks; the reference value is one trajectory as well.
    const blocks = Array.from({ length: 20 }, (_, k) => {
      const block = growth.slice(60 * k, 60 * (k + 1))
      return block.reduce((a, b) => a + b) / block.length
    })
    const mean = blocks.reduce((a, b) => a + b) / 20
    const error = Math.sqrt(blocks.reduce((a, b) => a + (b - mean) ** 2, 0) / 19 / 20)
    expect(error).toBeLessThan(0.02)
    expect(Math.abs(mean - 0.337)).toBeLessThan(4 * Math.hypot(error, 0.005))
  })

  test('from 0.0183 to 0.0190 nothing repeats within 32 steps', () => {
    let start = walked(longGuess(0.015), 0.017, 50)
    for (const gamma of [0.0183, 0.0184, 0.0185, 0.0186, 0.0187, 0.0189, 0.019]) {
      start = walked(start, gamma, 200)
      const path = [start]
      for (let i = 0; i < 200; i++) path.push(walked(path.at(-1)!, gamma, 1))
      for (let period = 1; period <= 32; period++) {
        const apart = path.slice(period).map(([theta], i) => Math.abs(theta - path[i]![0]))
        expect(Math.max(...apart)).toBeGreaterThan(5e-4)
      }
    }
  })

  test('walking ends near 0.019: it goes on at 0.01904, and falls at 0.0191 and 0.0192', () => {
    const start = walked(walked(longGuess(0.015), 0.017, 50), 0.0188, 100)
    const steady = walked(start, 0.019, 300)
    expect(strideMap(steady, 0.01904, 1_000, coarse)).toBeDefined()
    // How long it lasts depends on the start: 979 steps at 0.0191 from one, 45 at 0.0192.
    expect(strideMap(steady, 0.0191, 3_000, coarse)).toBeUndefined()
    expect(strideMap(steady, 0.0192, 1_000, coarse)).toBeUndefined()
  })
})

describe('the law for small slopes', () => {
  // theta = theta0 gamma^(1/3) + theta1 gamma; theta0 = tanh^(2/3)(tau / 2): closed form, tau = pi for the short gait,
  // tan(tau / 2) = -3 tanh(tau / 2) for the long one. theta1 of the long
  // gait is -0.18657, recomputed twice: from the gait itself and from the energy of a step.
  interface Expansion {
    readonly first: number
    readonly second: number
  }

  /** Coefficients of gamma^(1/3) and gamma of what `read` gives, from gaits at four small slopes. */
  function expansion(guess: typeof longGuess, read: (found: Gait) => number): Expansion {
    // over(x) = first + second x + ..., x = gamma^(2/3): Newton's polynomial through four slopes.
    const cubes = [0.02, 0.035, 0.05, 0.065]
    const xs = cubes.map((root) => root * root)
    const table = cubes.map((root) => read(gait(guess(root ** 3), root ** 3, 1, 0.02)) / root)
    for (let order = 1; order < 4; order++) {
      for (let i = 3; i >= order; i--) table[i] = (table[i]! - table[i - 1]!) / (xs[i]! - xs[i - order]!)
    }
    // Value and slope at x = 0.
    let [value, slope] = [table[3]!, 0]
    for (let i = 2; i >= 0; i--) {
      slope = value - slope * xs[i]!
      value = table[i]! - value * xs[i]!
    }
    return { first: value, second: slope }
  }
  const closed = (tau: number) => Math.cbrt(Math.tanh(tau / 2)) ** 2

  const rows = [
    ['short', shortGuess, Math.PI, 0.943976068448, -0.264567],
    ['long', longGuess, 3.81209179509, 0.970956124939, -0.186569],
  ] as const

  test('tau of the long gait', () => {
    expect(Math.tan(3.81209179509 / 2) / (-3 * Math.tanh(3.81209179509 / 2))).toBeCloseTo(1, 9)
  })

  test.each(rows)('%s gait', (_, guess, tau, theta0, theta1) => {
    expect(closed(tau)).toBeCloseTo(theta0, 11)
    const { first, second } = expansion(guess, (found) => found.theta)
    expect(first).toBeCloseTo(theta0, 7)
    expect(second).toBeCloseTo(theta1, 4)
  })

  test.each(rows)(
    '%s gait: the second term follows from the energy of a step',
    (_, guess, _tau, theta0, theta1) => {
      // Derived: 1/2 theta'^2 tan^2(2 theta) = 2 sin(theta) sin(gamma), the loss at heel strike and gravity's work, with
      // theta' = a gamma^(1/3) + c gamma, gives a^2 theta0 = 1 and theta1 = -2 c theta0 / a - (17/6) theta0^3.
      const rate = expansion(guess, (found) => found.thetaRate)
      expect(rate.first * rate.first * theta0).toBeCloseTo(1, 6)
      const second = (-2 * rate.second * theta0) / rate.first - (17 / 6) * theta0 ** 3
      expect(second).toBeCloseTo(theta1, 4)
    },
  )
})
