// Chains of pendulums: small swings, and how long two histories that differ in the last bit stay together. Landau and
// Lifshitz, Mechanics (small oscillations; from memory); zeros of Laguerre polynomials: Abramowitz and Stegun, Handbook
// of mathematical functions, 1964 (from memory). Numbers recomputed independently of this code.

import { describe, expect, test } from 'vitest'
import { cos, sin } from '../../shared/detmath/index.js'
import { advance } from '../../sim/lattice/advance.js'
import { buildLattice } from '../../sim/lattice/build.js'
import type { LatticeSpec } from '../../sim/lattice/spec.js'
import { naturalModes } from '../../sim/measure/modes.js'
import { flow, type Motion, startMotion } from '../../sim/ode/flow.js'
import { type Rates, rungeKutta4 } from '../../sim/ode/runge-kutta.js'
import { strideMap } from '../../sim/problems/ramp-walker/gaits.js'
import { angularFrequency, at, put, record, x } from './physics-bodies.js'

const gravity = 9.81

/** Masses hanging on struts from a pin, stretched by exactly what hangs below. */
function hanging(
  masses: readonly number[],
  lengths: readonly number[],
  stiffnessNpm: number,
  g = gravity,
): LatticeSpec {
  const depths = [0]
  for (const length of lengths) depths.push(depths.at(-1)! - length)
  const below = (from: number) => masses.slice(from).reduce((sum, mass) => sum + mass, 0)
  return {
    nodes: depths.map((depth, i) => ({
      positionM: [0, depth],
      massKg: masses[i - 1] ?? 1,
      pinned: i === 0,
    })),
    struts: lengths.map((length, i) => ({
      a: i,
      b: i + 1,
      restM: length - (below(i) * g) / stiffnessNpm,
      stiffnessNpm,
      dampingNspm: 0,
    })),
    gravityMps2: [0, -g],
    stepSeconds: 'auto',
  }
}
/** The slow half of the modes: swings. The others are stretches of stiff struts. */
const swings = (spec: LatticeSpec) =>
  naturalModes(spec)
    .modes.map((mode) => mode.radps)
    .slice(0, spec.struts.length)

describe('small swings', () => {
  test('double pendulum of equal masses and lengths: 2.3971994 and 5.7873513 rad/s', () => {
    const [slow, fast] = swings(hanging([1, 1], [1, 1], 1e5))
    expect(slow! / Math.sqrt(gravity)).toBeCloseTo(0.76536686473, 10)
    expect(fast! / Math.sqrt(gravity)).toBeCloseTo(1.847759065023, 10)
    expect(slow).toBeCloseTo(2.3971994, 7)
    expect(fast).toBeCloseTo(5.7873513, 7)
  })

  test('its shapes: the lower angle is sqrt 2 times the upper one, with it and against it', () => {
    const { modes } = naturalModes(hanging([1, 1], [1, 1], 1e5))
    for (const [i, ratio] of [Math.SQRT2, -Math.SQRT2].entries()) {
      const { shape } = modes[i]!
      expect((shape[4]! - shape[2]!) / shape[2]!).toBeCloseTo(ratio, 9)
    }
  })

  test('2 kg on 1 m, then 1 kg on 0.5 m: 2.82559022 and 6.01340502 rad/s', () => {
    const [slow, fast] = swings(hanging([2, 1], [1, 0.5], 1e5))
    expect(slow).toBeCloseTo(2.82559022, 8)
    expect(fast).toBeCloseTo(6.01340502, 8)
  })

  test.each([
    [3, [0.64480583, 1.51468821, 2.50797629]],
    [10, [0.37120543, 0.85408111, 1.34474641]],
  ] as const)('%d equal pendulums: w^2 l / g are zeros of the Laguerre polynomial', (count, roots) => {
    const spec = hanging(Array(count).fill(1), Array(count).fill(1), 1e5, 1)
    const found = swings(spec)
    for (const [i, root] of roots.entries()) expect(found[i]).toBeCloseTo(root, 8)
    for (const radps of found) expect(laguerre(count, radps * radps) / laguerre(count, 0)).toBeCloseTo(0, 5)
  })

  test('in time, with struts that stretch by a thousandth', () => {
    const spec = hanging([1, 1], [1, 1], 2e4)
    for (const [ratio, radps] of [
      [Math.SQRT2, 2.3971994],
      [-Math.SQRT2, 5.7873513],
    ] as const) {
      const lattice = buildLattice(spec)
      put(lattice, 1, x, 1e-3)
      put(lattice, 2, x, 1e-3 * (1 + ratio))
      const swing = record(lattice, Math.round(20 / lattice.stepSeconds), (l) => at(l, 1, x))
      expect(angularFrequency(swing, lattice.stepSeconds) / radps).toBeCloseTo(1, 3)
    }
  })
})

/** L_n(x) by its recurrence. */
function laguerre(n: number, value: number): number {
  let [before, now] = [1, 1 - value]
  for (let k = 1; k < n; k++) {
    ;[before, now] = [now, ((2 * k + 1 - value) * now - k * before) / (k + 1)]
  }
  return now
}

/** Double pendulum of rigid massless rods, equal masses and lengths, l = g = 1; angles from the hanging position. */
const doublePendulum: Rates = (_seconds, state, rate) => {
  const first = state[0]!
  const second = state[1]!
  const [turning, turningToo] = [state[2]!, state[3]!]
  const s = sin(first - second)
  const c = cos(first - second)
  const upper = -2 * sin(first) - turningToo * turningToo * s
  const lower = -sin(second) + turning * turning * s
  const perRoom = 1 / (2 - c * c)
  rate[0] = turning
  rate[1] = turningToo
  rate[2] = (upper - c * lower) * perRoom
  rate[3] = (2 * lower - c * upper) * perRoom
}
const released = (nudge = 0): Motion => startMotion(rungeKutta4, doublePendulum, [2 + nudge, 2, 0, 0], 0.01)

function energy([first, second, w, v]: Float64Array): number {
  const motion = w! * w! + 0.5 * v! * v! + w! * v! * Math.cos(first! - second!)
  return motion - 2 * Math.cos(first!) - Math.cos(second!)
}
const apart = (a: Motion, b: Motion) => Math.hypot(...a.state.map((value, i) => value - b.state[i]!))

describe('how long two histories stay together', () => {
  test('the double pendulum keeps its energy, to fourth order at least', () => {
    const drift = (h: number) => {
      const motion = startMotion(rungeKutta4, doublePendulum, [2, 2, 0, 0], h)
      const before = energy(motion.state)
      flow(motion, 5, [])
      return Math.abs(energy(motion.state) - before)
    }
    expect(drift(0.01)).toBeLessThan(1e-7)
    expect(Math.log2(drift(0.02) / drift(0.01))).toBeGreaterThan(3.8)
  })

  test('from rest at 2 rad errors grow by about exp(0.39) in sqrt(l / g)', () => {
    // One trajectory of 400 units, as the reference value; standard error from 20 blocks.
    const motion = released()
    const beside = released(1e-8)
    const growth: number[] = []
    for (let unit = 1; unit <= 400; unit++) {
      flow(motion, unit, [])
      flow(beside, unit, [])
      const distance = apart(motion, beside)
      growth.push(Math.log(distance / 1e-8))
      for (let i = 0; i < 4; i++) {
        beside.state[i] = motion.state[i]! + ((beside.state[i]! - motion.state[i]!) * 1e-8) / distance
      }
    }
    const blocks = Array.from({ length: 20 }, (_, k) => {
      return growth.slice(20 * k, 20 * (k + 1)).reduce((a, b) => a + b) / 20
    })
    const mean = blocks.reduce((a, b) => a + b) / 20
    const error = Math.sqrt(blocks.reduce((a, b) => a + (b - mean) ** 2, 0) / 19 / 20)
    expect(error).toBeLessThan(0.05)
    // Both values are of one trajectory: the band holds for their difference.
    expect(Math.abs(mean - 0.39)).toBeLessThan(4 * error * Math.SQRT2)
  })

  test('one unit in the last place fills the state after about 95 sqrt(l / g)', () => {
    const motion = released()
    const beside = released(2 ** -51)
    let unit = 0
    while (apart(motion, beside) < 1 && unit < 400) {
      unit++
      flow(motion, unit, [])
      flow(beside, unit, [])
    }
    // ln(1 / 4.4e-16) / 0.39 = 91; the growth along one way scatters by a third.
    expect(unit).toBeGreaterThan(60)
    expect(unit).toBeLessThan(130)
  })

  test('the walker at slope 0.0188 after about 109 steps', () => {
    const step = 0.05
    const settled = strideMap([0.2392, -0.2338], 0.017, 50, step)!
    const onAttractor = strideMap([settled.theta, settled.thetaRate], 0.0188, 100, step)!
    let one: readonly [number, number] = [onAttractor.theta, onAttractor.thetaRate]
    let other: readonly [number, number] = [one[0] + 2 ** -53, one[1]]
    let steps = 0
    while (Math.abs(one[0] - other[0]) < 0.01 && steps < 400) {
      steps++
      const ends = [one, other].map((start) => strideMap(start, 0.0188, 1, step)!)
      one = [ends[0]!.theta, ends[0]!.thetaRate]
      other = [ends[1]!.theta, ends[1]!.thetaRate]
    }
    // ln(0.01 / 1.1e-16) / 0.337 = 95 to a hundredth, 109 to one.
    expect(steps).toBeGreaterThan(60)
    expect(steps).toBeLessThan(140)
  })
})

describe('what can be promised', () => {
  test('the same start gives the same bits, far beyond the horizon', () => {
    const run = () => {
      const motion = released()
      flow(motion, 300, [])
      return Array.from(motion.state)
    }
    expect(run()).toEqual(run())
  })

  test('a motion taken up again from its state goes on with the same bits', () => {
    // Taken up at a whole unit: a motion is cut into steps from where it starts.
    const whole = released()
    for (let unit = 1; unit <= 120; unit++) flow(whole, unit, [])
    const again = startMotion(rungeKutta4, doublePendulum, Array.from(whole.state), 0.01)
    again.seconds = whole.seconds
    for (const motion of [again, whole]) for (let unit = 121; unit <= 200; unit++) flow(motion, unit, [])
    expect(Array.from(again.state)).toEqual(Array.from(whole.state))
  })

  test('a lattice taken up again from its nodes, rotors and step goes on with the same bits', () => {
    const spec = hanging([1, 1, 1], [1, 1, 1], 2e4)
    const lattice = buildLattice(spec)
    put(lattice, 3, x, 1)
    const whole = buildLattice(spec)
    put(whole, 3, x, 1)
    advance(whole, 2_000)
    advance(lattice, 777)
    const again = buildLattice(spec)
    again.nodes.set(lattice.nodes)
    again.step = lattice.step
    advance(again, 2_000 - 777)
    expect(Array.from(again.nodes)).toEqual(Array.from(whole.nodes))
  })
})
