// The standard measures against closed forms of a harmonic actuator (recomputed, no source needed).

import { expect, test } from 'vitest'
import { actuatorClasses } from './actuators.js'
import { actuatorFigures, actuatorMeasures, addSample, startTally, worstFigures } from './measures.js'

const linear = { motion: 'linear', forceMost: 5 } as const

/** Force F cos(w t) on a strut of length L + A sin(w t), over whole periods. */
function harmonic(forceN: number, amplitudeM: number, motion: 'linear' | 'rotary' = 'linear') {
  const seconds = 1e-4
  const angular = 2 * Math.PI * 2
  const tally = startTally()
  for (let i = 0; i < 10_000; i++) {
    const phase = angular * i * seconds
    const sample = {
      force: forceN * Math.cos(phase),
      length: 0.1 + amplitudeM * Math.sin(phase),
      speed: amplitudeM * angular * Math.cos(phase),
    }
    addSample(tally, sample, { ...linear, motion }, seconds)
  }
  return { tally, figures: actuatorFigures(tally, 0.1, seconds), angular }
}

test('peak force, stroke and mean power of a strut that is braked all the time are those of a sine', () => {
  // Tension while it lengthens: as a linear actuator it takes power up, F A w / 2 on average, and delivers none.
  expect(harmonic(3, 0.01).figures).toMatchObject({ power: 0 })
  // Thrust while it lengthens (tension turned round): delivers all of it.
  const { figures, angular } = harmonic(-3, 0.01)
  expect(figures.peakForce).toBeCloseTo(3, 6)
  expect(figures.stroke).toBeCloseTo(0.2, 6)
  expect(figures.power).toBeCloseTo((3 * 0.01 * angular) / 2, 6)
})

test('a motor delivers power while it turns the way it pushes', () => {
  const { figures, angular } = harmonic(3, 0.01, 'rotary')
  expect(figures.power).toBeCloseTo((3 * 0.01 * angular) / 2, 6)
  expect(harmonic(-3, 0.01, 'rotary').figures.power).toBe(0)
})

test('duty is the share of time above a tenth of the limit', () => {
  // |3 cos x| > 0.5 for 1 - (2 / pi) asin(1 / 6) of the time.
  const share = 1 - (2 / Math.PI) * Math.asin(0.5 / 3)
  expect(Math.abs(harmonic(3, 0.01).figures.duty - share)).toBeLessThan(1e-3)
  expect(harmonic(0.49, 0.01).figures.duty).toBe(0)
})

test('an actuator that was never sampled has done nothing', () => {
  expect(actuatorFigures(startTally(), 1, 1)).toEqual({ peakForce: 0, stroke: 0, power: 0, duty: 0 })
})

test('the worst of several is taken number by number', () => {
  const a = { peakForce: 1, stroke: 0.4, power: 2, duty: 0.1 }
  const b = { peakForce: 3, stroke: 0.2, power: 1, duty: 0.3 }
  expect(worstFigures([a, b])).toEqual({ peakForce: 3, stroke: 0.4, power: 2, duty: 0.3 })
  expect(worstFigures([])).toEqual({ peakForce: 0, stroke: 0, power: 0, duty: 0 })
})

test('declared ranges have units and hold what the class can do', () => {
  for (const row of Object.values(actuatorClasses)) {
    const { peakForce, stroke, power, duty } = actuatorMeasures(row)
    expect(peakForce.high).toBeGreaterThan(row.forceMost)
    expect(peakForce.unit).toBe(row.motion === 'linear' ? 'N' : 'N m')
    expect(stroke.high).toBeGreaterThan(0)
    expect(power.high).toBeGreaterThan(0)
    expect(duty).toEqual({ low: 0, high: 1, unit: '1' })
  }
})
