import { describe, expect, test } from 'vitest'
import { cos, sin } from '../../shared/detmath/index.js'
import { Solver } from '../../tests/tools/odex.js'
import { type EventOf, flow, startMotion } from './flow.js'
import { type Rates, rungeKutta4 } from './runge-kutta.js'

const pendulum: Rates = (_seconds, state, rate) => {
  rate[0] = state[1]!
  rate[1] = -sin(state[0]!)
}
/** q(5) from rest at q = 1: sin(q/2) = k cd(t, k), k = sin(1/2), by elliptic functions. */
const pendulumAt5 = -0.0239512848529275

function after(rates: Rates, start: readonly number[], seconds: number, stepSeconds: number) {
  const motion = startMotion(rungeKutta4, rates, start, stepSeconds)
  expect(flow(motion, seconds, [])).toBeUndefined()
  expect(motion.seconds).toBe(seconds)
  return motion.state
}

describe('fixed steps', () => {
  test('a pendulum converges at fourth order to its elliptic function', () => {
    const [coarse, middle, fine] = [0.02, 0.01, 0.005].map((h) => after(pendulum, [1, 0], 5, h)[0]!)
    expect(Math.log2((coarse! - middle!) / (middle! - fine!))).toBeCloseTo(4, 1)
    expect(Math.abs(fine! - pendulumAt5)).toBeLessThan(2e-11)
  })

  test('a driven, damped oscillator agrees with odex', () => {
    // The rates depend on time, so that the places within a step count.
    const odex = new Solver(2)
    odex.absoluteTolerance = 1e-13
    odex.relativeTolerance = 1e-13
    const theirs = odex.solve(
      (t, [q, v]) => [v!, -Math.sin(q!) - 0.2 * v! + 0.7 * Math.cos(1.3 * t)],
      0,
      [0.4, -0.1],
      12,
    ).y
    const ours = after(
      (t, y, rate) => {
        rate[0] = y[1]!
        rate[1] = -sin(y[0]!) - 0.2 * y[1]! + 0.7 * cos(1.3 * t)
      },
      [0.4, -0.1],
      12,
      0.004,
    )
    for (const i of [0, 1]) expect(Math.abs(ours[i]! - theirs[i]!)).toBeLessThan(1e-10)
  })

  test('a time that is no multiple of the step is reached exactly', () => {
    const exact = after(pendulum, [1, 0], 1.2345, 1e-4)[0]!
    expect(Math.abs(after(pendulum, [1, 0], 1.2345, 0.01)[0]! - exact)).toBeLessThan(1e-10)
  })

  test('a state that is no number stops the motion where it last was one', () => {
    const motion = startMotion(rungeKutta4, (t, _y, rate) => rate.fill(t < 1 ? 1 : Number.NaN), [0], 0.25)
    expect(flow(motion, 5, [])).toEqual({ event: -1, seconds: 0.75 })
    expect(motion.state[0]).toBeCloseTo(0.75, 12)
  })
})

describe('events', () => {
  const fall: Rates = (_seconds, state, rate) => {
    rate[0] = state[1]!
    rate[1] = -9.81
  }
  const floor: EventOf = { value: (_seconds, state) => state[0]!, direction: -1 }

  test('a fall of 1 m ends after sqrt(2 h / g), to round-off, whatever the step', () => {
    for (const h of [0.3, 0.1, 0.0137, 0.001]) {
      const motion = startMotion(rungeKutta4, fall, [1, 0], h)
      expect(flow(motion, 10, [floor])?.event).toBe(0)
      expect(Math.abs(motion.seconds / Math.sqrt(2 / 9.81) - 1)).toBeLessThan(1e-14)
      expect(Math.abs(motion.state[0]!)).toBeLessThan(1e-14)
    }
  })

  test('an event has the accuracy of the method: the time a pendulum hangs straight converges at fourth order', () => {
    // A quarter of the period 4 K(sin 1/2) = 4 x 1.6749922207...; K by the arithmetic-geometric mean.
    let [a, b] = [1, Math.cos(0.5)]
    while (Math.abs(a - b) > 1e-15) [a, b] = [(a + b) / 2, Math.sqrt(a * b)]
    const quarter = Math.PI / 2 / a
    const error = (h: number) => {
      const motion = startMotion(rungeKutta4, pendulum, [1, 0], h)
      flow(motion, 10, [{ ...floor }])
      return Math.abs(motion.seconds - quarter)
    }
    expect(Math.log2(error(0.1) / error(0.05))).toBeGreaterThan(3.7)
    expect(error(0.005)).toBeLessThan(1e-11)
  })

  test('direction and condition choose among passages, and going on does not find the same one again', () => {
    const spring: Rates = (_seconds, state, rate) => {
      rate[0] = state[1]!
      rate[1] = -state[0]!
    }
    const passages = (event: EventOf) => {
      const motion = startMotion(rungeKutta4, spring, [1, 0], 0.01)
      const seconds: number[] = []
      for (let found = flow(motion, 20, [event]); found; found = flow(motion, 20, [event])) {
        seconds.push(found.seconds / Math.PI)
      }
      return seconds.map((time) => Math.round(1e6 * time) / 1e6)
    }
    const zero = (_seconds: number, state: Float64Array) => state[0]!
    expect(passages({ value: zero, direction: 0 })).toEqual([0.5, 1.5, 2.5, 3.5, 4.5, 5.5])
    expect(passages({ value: zero, direction: -1 })).toEqual([0.5, 2.5, 4.5])
    expect(passages({ value: zero, direction: 1 })).toEqual([1.5, 3.5, 5.5])
    const counts = (seconds: number) => seconds > 6
    expect(passages({ value: zero, direction: 0, counts })).toEqual([2.5, 3.5, 4.5, 5.5])
  })

  test('of two events in one step the earlier is taken, whatever the order of the list', () => {
    const at = (seconds: number): EventOf => ({ value: (now) => now - seconds, direction: 1 })
    for (const [events, earlier] of [
      [[at(0.62), at(0.61)], 1],
      [[at(0.61), at(0.62)], 0],
    ] as const) {
      const motion = startMotion(rungeKutta4, fall, [1, 0], 0.25)
      const found = flow(motion, 10, events)
      expect(found?.event).toBe(earlier)
      expect(found?.seconds).toBeCloseTo(0.61, 14)
    }
  })

  test('repeats to the bit', () => {
    const run = () => {
      const motion = startMotion(rungeKutta4, pendulum, [1.1, 0], 0.01)
      flow(motion, 10, [floor])
      return [motion.seconds, ...motion.state]
    }
    expect(run()).toEqual(run())
  })
})
