// The rimless wheel: McGeer, Passive dynamic walking, 1990 (from memory); Coleman, Chatterjee and Ruina, Motions of a
// rimless spoked wheel: a simple three-dimensional system with impacts, 1997 (abstract read). n spokes of length 1 a
// angle 2 alpha = 2 pi / n apart, J = I / (m l^2), down a slope gamma; impacts do not bounce and do not slip. Numbers
// recomputed from the closed forms; here they are held against motion and impacts, step by step.

import { describe, expect, test } from 'vitest'
import { type EventOf, flow, startMotion } from '../../sim/ode/flow.js'
import { type Rates, rungeKutta4 } from '../../sim/ode/runge-kutta.js'

const gravity = 9.81

interface Wheel {
  readonly spokes: number
  readonly slope: number
  readonly inertia: number
}

/** One spoke's fall: angle from the upright, clockwise; from just after an impact to the next one, or back. */
function roll({ spokes, slope, inertia }: Wheel, angular: number) {
  const alpha = Math.PI / spokes
  const rates: Rates = (_seconds, state, rate) => {
    rate[0] = state[1]!
    rate[1] = (gravity / (1 + inertia)) * Math.sin(state[0]!)
  }
  const nextSpoke: EventOf = { value: (_seconds, state) => state[0]! - slope - alpha, direction: 1 }
  const turnedBack: EventOf = { value: (_seconds, state) => state[1]!, direction: -1 }
  const motion = startMotion(rungeKutta4, rates, [slope - alpha, angular], 1e-3)
  const happening = flow(motion, 60, [nextSpoke, turnedBack])
  if (happening?.event !== 0) return undefined
  // Angular momentum about the new foot: the velocity across the old spoke is cos 2 alpha along the new one's.
  const before = motion.state[1]!
  const after = ((inertia + Math.cos(2 * alpha)) / (1 + inertia)) * before
  return { before, after, seconds: motion.seconds }
}

/** The speed after impact that repeats itself. */
function steady(wheel: Wheel): number {
  let angular = 3
  for (let i = 0; i < 200; i++) angular = roll(wheel, angular)!.after
  return angular
}

/** The slowest speed after impact that still gets over the top. */
function critical(wheel: Wheel): number {
  let [low, high] = [0, 3]
  for (let i = 0; i < 45; i++) {
    const middle = (low + high) / 2
    if (roll(wheel, middle)) high = middle
    else low = middle
  }
  return high
}

// n, slope, J; after and before impact, multiplier, critical, step time, mean speed.
const rows = [
  [8, 0.08, 0, 1.095462839648, 1.549218404905, 0.5, 0.975416874393, 1.034549811, 0.739806683],
  [8, 0.2, 0, 1.727228295825, 2.44266968127, 0.5, 0.602617858517, 0.430364961518, 1.778413517],
  [6, 0.2, 0, 1.139867283239, 2.279734566479, 0.25, 1.00912464995, 1.140672491, 0.876675827],
  [12, 0.05, 0, 1.234007384542, 1.424908991295, 0.75, 0.662135922638, 0.458944589, 1.12788799],
  [8, 0.2, 0.5, 1.911799978757, 2.375680439237, 0.647603013861, 0.492035421085, 0.396183296, 1.931850415],
] as const

describe.each(rows)('%d spokes, slope %d, J = %d', (spokes, slope, inertia, ...expected) => {
  const [after, before, multiplier, slowest, seconds, speed] = expected
  const wheel = { spokes, slope, inertia }

  test('rolls to the published gait', () => {
    const angular = steady(wheel)
    const step = roll(wheel, angular)!
    expect(angular / after).toBeCloseTo(1, 9)
    expect(step.before / before).toBeCloseTo(1, 9)
    expect(step.seconds / seconds).toBeCloseTo(1, 8)
    expect((2 * Math.sin(Math.PI / spokes)) / step.seconds / speed).toBeCloseTo(1, 8)
  })

  test('errors shrink by eta^2 a step, in speed as in its square', () => {
    const next = (angular: number) => roll(wheel, angular)!.after
    const spread = 1e-4
    expect((next(after + spread) - next(after - spread)) / (2 * spread)).toBeCloseTo(multiplier, 6)
    const squared = (square: number) => next(Math.sqrt(square)) ** 2
    const far = squared(after * after + 0.5) - squared(after * after)
    expect(far / 0.5).toBeCloseTo(multiplier, 8)
  })

  test('gets over the top from the published speed on', () => {
    expect(critical(wheel) / slowest).toBeCloseTo(1, 8)
  })
})

describe('the least slope for rolling on, J = 0', () => {
  test.each([
    [6, 0.178160046146],
    [8, 0.068229452452],
    [10, 0.033439064303],
    [12, 0.018903885133],
  ])('%d spokes: %d rad', (spokes, least) => {
    const rollsOn = (slope: number) => {
      let angular = 3
      for (let i = 0; i < 120; i++) {
        const step = roll({ spokes, slope, inertia: 0 }, angular)
        if (!step) return false
        angular = step.after
      }
      return true
    }
    expect(rollsOn(least * 1.001)).toBe(true)
    expect(rollsOn(least * 0.999)).toBe(false)
  })
})
