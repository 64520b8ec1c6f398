// The spring-loaded inverted pendulum: Seyfarth, Geyer, Guenther and Blickhan, A movement criterion for running, 2002
// (abstract read: running stabilises itself only above some speed and with matched stiffness and angle). 80 kg on a
// massless leg of 1 m; flight, touch-down at a fixed angle, stance, take-off at rest length. Numbers recomputed
// independently of this code.

import { describe, expect, test } from 'vitest'
import { type EventOf, flow, startMotion } from '../../sim/ode/flow.js'
import { type Rates, rungeKutta4 } from '../../sim/ode/runge-kutta.js'

const mass = 80
const gravity = 9.81
const rest = 1

interface Leg {
  readonly stiffness: number
  /** Angle of attack from the ground, degrees. */
  readonly attack: number
}
/** Energy of 5 m/s at a height of 1 m. */
const energyAt5 = 0.5 * mass * 25 + mass * gravity * 1

const forwardSpeed = (energy: number, height: number) =>
  Math.sqrt((2 * (energy - mass * gravity * height)) / mass)

/** Stance in coordinates about the foot. */
const stance = (stiffness: number): Rates => {
  return (_seconds, [x, y, vx, vy], rate) => {
    const length = Math.sqrt(x! * x! + y! * y!)
    const pull = (stiffness * (rest - length)) / length / mass
    rate[0] = vx!
    rate[1] = vy!
    rate[2] = pull * x!
    rate[3] = pull * y! - gravity
  }
}
const lengthOf = (state: Float64Array) => Math.sqrt(state[0]! ** 2 + state[1]! ** 2)
const takeOff: EventOf = { value: (_seconds, state) => lengthOf(state) - rest, direction: 1 }
const deepest: EventOf = {
  value: (_seconds, state) => state[0]! * state[2]! + state[1]! * state[3]!,
  direction: 1,
}
const landed: EventOf = { value: (_seconds, state) => state[1]! - 0.02, direction: -1 }

/** From apex to apex; nothing when it stumbles: no touch-down, no take-off, or backwards. */
function stride(leg: Leg, height: number, speed: number, stepSeconds = 5e-4) {
  const angle = (leg.attack * Math.PI) / 180
  const drop = height - rest * Math.sin(angle)
  if (!(drop > 0)) return undefined
  const fall = Math.sqrt((2 * drop) / gravity)
  const start = [-rest * Math.cos(angle), rest * Math.sin(angle), speed, -gravity * fall]
  const motion = startMotion(rungeKutta4, stance(leg.stiffness), start, stepSeconds)
  if (flow(motion, 2, [deepest, landed])?.event !== 0) return undefined
  const compression = rest - lengthOf(motion.state)
  if (flow(motion, 2, [takeOff, landed])?.event !== 0) return undefined
  const [x, y, vx, vy] = motion.state
  if (!(vy! > 0) || !(vx! > 0)) return undefined
  const rise = vy! / gravity
  return {
    height: y! + (vy! * vy!) / (2 * gravity),
    speed: vx!,
    advance: speed * fall + rest * Math.cos(angle) + x! + vx! * rise,
    stanceSeconds: motion.seconds,
    seconds: fall + motion.seconds + rise,
    compression,
  }
}

/** The next apex, at constant energy. */
const next = (leg: Leg, energy: number, height: number) =>
  stride(leg, height, forwardSpeed(energy, height))?.height

/** Slope of the apex map. */
function slopeOf(leg: Leg, energy: number, height: number): number {
  return (next(leg, energy, height + 1e-5)! - next(leg, energy, height - 1e-5)!) / 2e-5
}

/** A stable apex, if the map has one: where the next apex crosses the old one downwards with a slope above -1. */
function stableApex(leg: Leg, energy: number): number | undefined {
  const least = rest * Math.sin((leg.attack * Math.PI) / 180)
  const most = energy / (mass * gravity)
  const excess = (height: number) => {
    const to = next(leg, energy, height)
    return to === undefined ? Number.NaN : to - height
  }
  const count = 120
  let [low, before] = [least + 1e-6, excess(least + 1e-6)]
  for (let i = 1; i < count; i++) {
    const high = least + ((most - least) * i) / count
    const after = excess(high)
    if (before > 0 && after <= 0) return settled(excess, low, high, leg, energy)
    ;[low, before] = [high, after]
  }
  return undefined
}

function settled(excess: (height: number) => number, low: number, high: number, leg: Leg, energy: number) {
  let [a, b] = [low, high]
  for (let i = 0; i < 40; i++) {
    const middle = (a + b) / 2
    if (excess(middle) > 0) a = middle
    else b = middle
  }
  return Math.abs(slopeOf(leg, energy, a)) < 1 ? a : undefined
}

describe('running at 5 m/s, 20 kN/m, 68 degrees', () => {
  const leg = { stiffness: 20_000, attack: 68 }

  test('a single step from y = 1 m', () => {
    const one = stride(leg, 1, 5)!
    expect(one.height).toBeCloseTo(0.955740410461, 9)
    expect(one.speed).toBeCloseTo(5.086096061495, 9)
    expect(one.advance).toBeCloseTo(1.899748100309, 9)
    expect(one.stanceSeconds).toBeCloseTo(0.162070293221, 9)
  })

  test('it converges at fourth order, touch-down and take-off included', () => {
    const error = (h: number) => Math.abs(stride(leg, 1, 5, h)!.height - 0.955740410461)
    expect(Math.abs(Math.log2(error(0.01) / error(0.005)) - 4)).toBeLessThan(0.1)
  })

  test('apexes settle: 0.95574, 0.94053, 0.94023, 0.94027, ...', () => {
    const apexes = [1]
    for (let i = 0; i < 12; i++) apexes.push(next(leg, energyAt5, apexes.at(-1)!)!)
    for (const [i, apex] of [0.9557404105, 0.9405270672, 0.9402263288, 0.9402737559].entries()) {
      expect(apexes[i + 1]).toBeCloseTo(apex, 8)
    }
    expect(apexes.at(-1)).toBeCloseTo(0.9402671444, 9)
  })

  test('the gait that it settles to', () => {
    const apex = stableApex(leg, energyAt5)!
    const speed = forwardSpeed(energyAt5, apex)
    const gait = stride(leg, apex, speed)!
    expect(apex).toBeCloseTo(0.9402671444, 9)
    expect(slopeOf(leg, energyAt5, apex)).toBeCloseTo(-0.16130769, 6)
    expect(speed).toBeCloseTo(5.11585366, 7)
    expect(gait.advance).toBeCloseTo(1.27764272, 7)
    expect(gait.stanceSeconds).toBeCloseTo(0.14924007, 7)
    expect(gait.compression).toBeCloseTo(0.10434352, 7)
    expect((leg.stiffness * gait.compression) / (mass * gravity)).toBeCloseTo(2.659111, 5)
    expect(gait.seconds).toBeCloseTo(0.25253261, 7)
  })

  test('the other one is unstable', () => {
    const apex = 1.3376863814
    expect(next(leg, energyAt5, apex)).toBeCloseTo(apex, 8)
    expect(slopeOf(leg, energyAt5, apex)).toBeCloseTo(1.68696762, 5)
  })
})

describe('where running stabilises itself', () => {
  const at5 = (attack: number, stiffness = 20_000) => stableApex({ stiffness, attack }, energyAt5)

  test('angles of attack from 66.306 to 68.854 degrees at 20 kN/m', () => {
    expect(at5(66.2)).toBeUndefined()
    expect(at5(66.4)).toBeDefined()
    expect(at5(68.75)).toBeDefined()
    expect(at5(68.95)).toBeUndefined()
  })

  test('stiffness from 18.55 to 23.29 kN/m at 68 degrees', () => {
    expect(at5(68, 18_450)).toBeUndefined()
    expect(at5(68, 18_650)).toBeDefined()
    expect(at5(68, 23_190)).toBeDefined()
    expect(at5(68, 23_390)).toBeUndefined()
  })

  const stable = (speed: number, degrees: number) =>
    stableApex({ stiffness: 20_000, attack: degrees }, 0.5 * mass * speed * speed + mass * gravity) !==
    undefined

  test.each([
    [3.2, 71.7],
    [3.5, 71.1],
    [4, 70],
    [7, 63],
  ] as const)('at %d m/s and 20 kN/m %d degrees are stable, 3 more are not', (speed, degrees) => {
    expect(stable(speed, degrees)).toBe(true)
    expect(stable(speed, degrees + 3)).toBe(false)
  })

  test('the bands: 71.7 at 3.2, 70.9 to 71.3 at 3.5, 69.5 to 70.5 at 4, up to 65.5 at 7 m/s', () => {
    // To a tenth of a degree.
    for (const [speed, low, high] of [
      [3.2, 71.7, 71.7],
      [3.5, 70.9, 71.3],
      [4, 69.5, 70.5],
    ] as const) {
      for (const inside of [low, high]) expect(stable(speed, inside)).toBe(true)
      for (const outside of [low - 0.1, high + 0.1]) expect(stable(speed, outside)).toBe(false)
    }
    for (const inside of [60, 65.5]) expect(stable(7, inside)).toBe(true)
    expect(stable(7, 65.6)).toBe(false)
  })

  test('at 3 m/s no angle is', () => {
    for (let degrees = 60; degrees < 80; degrees += 0.5) expect(stable(3, degrees)).toBe(false)
  })
})
