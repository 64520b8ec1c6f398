// What cannot be made is named with its part and its rule; what can be made, and what repair made of it, passes.

import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { actuatorClasses } from './actuators.js'
import { makingFaults, makingFaultText } from './makeability.js'
import { clamped, cutLength, nearest, nearestRow, snapped, wallForPitch } from './repair.js'
import { siliconeTubes, springStrips, stripThicknessesM } from './stock.js'
import type { Parts, Process } from './types.js'

const tube = siliconeTubes.a10
const bellows = actuatorClasses.bellows
const process: Process = {
  name: 'bench',
  methods: ['cutting-to-length'],
  stock: [tube, ...springStrips],
  actuators: [bellows],
  wallLeastM: 0.001,
  gapLeastM: 0.002,
  envelopeM: [0.6, 0.1, 0.2],
  massMostKg: 0.5,
}
const sound: Parts = {
  struts: [{ name: 'post 1', stock: tube.name, lengthM: 0.05 }],
  actuators: [
    {
      name: 'chord 1',
      class: bellows.name,
      lengthM: 0.06,
      stroke: 0.25,
      ratePerSecond: 1.2,
      force: 5,
      duty: 1,
    },
  ],
  walls: [{ name: 'cell wall', thicknessM: 0.001 }],
  gaps: [{ name: 'slot', thicknessM: 0.002 }],
  envelopeM: [0.1, 0.2, 0.6],
  massKg: 0.5,
}
const found = (parts: Parts) => makingFaults(process, parts).map(makingFaultText)

describe('makeability', () => {
  test('a machine at its limits can be made, and so can one of which nothing is known', () => {
    expect(found(sound)).toEqual([])
    expect(found({})).toEqual([])
    const free: Process = { name: 'free', methods: [], stock: [tube], actuators: [bellows] }
    expect(
      makingFaults(free, { walls: [{ name: 'a', thicknessM: 0 }], massKg: 1e9, envelopeM: [9, 9] }),
    ).toEqual([])
  })

  const strut = sound.struts![0]!
  const chord = sound.actuators![0]!
  const rows: readonly (readonly [string, Parts, string])[] = [
    [
      'a strut too short to join',
      { struts: [{ ...strut, lengthM: 0.004 }] },
      'post 1: length of stock: found 4 mm, expected 20 mm to 2 m of silicone tube 17 x 15 mm, 10 A',
    ],
    [
      'a strut too long to buy',
      { struts: [{ ...strut, lengthM: 2.5 }] },
      'post 1: length of stock: found 2.5 m',
    ],
    [
      'a strut without a length',
      { struts: [{ ...strut, lengthM: Number.NaN }] },
      'post 1: length of stock: found NaN',
    ],
    [
      'a strut of what nobody has',
      { struts: [{ ...strut, stock: 'oak' }] },
      "post 1: row of stock: found 'oak', expected one of",
    ],
    [
      'an actuator that nobody has',
      { actuators: [{ ...chord, class: 'muscle' }] },
      "chord 1: actuator class: found 'muscle'",
    ],
    [
      'an actuator too short',
      { actuators: [{ ...chord, lengthM: 0.01 }] },
      'chord 1: length of the actuator: found 10 mm',
    ],
    [
      'too much stroke',
      { actuators: [{ ...chord, stroke: 0.3 }] },
      'chord 1: stroke of the actuator: found 0.3 of the length, expected at most 0.25 of the length of bellows',
    ],
    [
      'too much rate',
      { actuators: [{ ...chord, ratePerSecond: 1.3 }] },
      'chord 1: rate of the actuator: found 1.3 1/s',
    ],
    ['too much force', { actuators: [{ ...chord, force: 6 }] }, 'chord 1: force of the actuator: found 6 N'],
    [
      'too much power',
      { actuators: [{ ...chord, power: 5 }] },
      'chord 1: power of the actuator: found 5 W/m',
    ],
    [
      'too much duty',
      { actuators: [{ ...chord, duty: 1.1 }] },
      'chord 1: duty of the actuator: found 1.1 of the time',
    ],
    [
      'no number for a stroke',
      { actuators: [{ ...chord, stroke: Number.NaN }] },
      'chord 1: stroke of the actuator: found NaN',
    ],
    [
      'a thin wall',
      { walls: [{ name: 'cell wall', thicknessM: 0.0008 }] },
      'cell wall: least wall: found 0.8 mm, expected at least 1 mm',
    ],
    [
      'a narrow gap',
      { gaps: [{ name: 'slot', thicknessM: 0.001 }] },
      'slot: least gap: found 1 mm, expected at least 2 mm',
    ],
    [
      'a machine too tall',
      { envelopeM: [0.5, 0.1, 0.25] },
      'the whole machine: envelope: found 500 mm by 100 mm by 250 mm',
    ],
    ['a machine without a size', { envelopeM: [0.5, Number.NaN] }, 'the whole machine: envelope'],
    [
      'a machine too heavy',
      { massKg: 0.6 },
      'the whole machine: largest mass: found 0.6 kg, expected at most 0.5 kg',
    ],
  ]
  test.each(rows)('%s is refused with part and rule', (_, parts, text) => {
    expect(found(parts)).toHaveLength(1)
    expect(found(parts)[0]).toContain(text)
    expect(found({ ...sound, ...parts }).length).toBeGreaterThanOrEqual(1)
  })

  test('every fault is listed, not only the first', () => {
    expect(
      found({
        ...sound,
        massKg: 1,
        walls: [{ name: 'a', thicknessM: 0 }],
        struts: [{ ...strut, stock: '' }],
      }),
    ).toHaveLength(3)
  })
})

describe('repair', () => {
  const amount = fc.double({ min: 0, max: 0.01, noNaN: true })

  test('snaps to the nearest size, of two to the smaller, and leaves what is a size', () => {
    expect(nearest(0.00027, stripThicknessesM)).toBe(0.00025)
    expect(nearest(1.5, [2, 1])).toBe(1)
    expect(nearestRow(0.00033, springStrips).name).toBe('spring-steel strip 10 x 0.3 mm')
    fc.assert(
      fc.property(amount, (value) => {
        const size = nearest(value, stripThicknessesM)
        for (const other of stripThicknessesM)
          expect(Math.abs(size - value)).toBeLessThanOrEqual(Math.abs(other - value))
        expect(nearest(size, stripThicknessesM)).toBe(size)
      }),
    )
  })

  test('changes no genome in place and is idempotent', () => {
    const walls = Float64Array.of(0.0001, 0.00044, 0.3)
    const once = snapped(walls, stripThicknessesM)
    expect(Array.from(once)).toEqual([0.0001, 0.0004, 0.001])
    expect(snapped(once, stripThicknessesM)).toEqual(once)
    expect(Array.from(walls)).toEqual([0.0001, 0.00044, 0.3])
    expect(Array.from(clamped(Float64Array.of(-1, 0.5, 2), 0, 1))).toEqual([0, 0.5, 1])
  })

  test('what it returns can be made', () => {
    fc.assert(
      fc.property(amount, fc.double({ min: 0, max: 3, noNaN: true }), (wallM, lengthM) => {
        const row = nearestRow(wallM, springStrips)
        const struts = [{ name: 'leaf', stock: row.name, lengthM: cutLength(lengthM, row) }]
        expect(makingFaults(process, { struts })).toEqual([])
      }),
    )
  })

  test('a wall leaves its gap where the pitch has room, and keeps the least wall where it has not', () => {
    fc.assert(
      fc.property(amount, fc.double({ min: 0.003, max: 0.02, noNaN: true }), (wanted, pitchM) => {
        const wallM = wallForPitch(wanted, pitchM, 0.001, 0.002)
        expect(wallM).toBeGreaterThanOrEqual(0.001)
        expect(pitchM - wallM).toBeGreaterThanOrEqual(0.002 * (1 - 1e-12))
        expect(wallForPitch(wallM, pitchM, 0.001, 0.002)).toBe(wallM)
      }),
    )
    expect(wallForPitch(0.005, 0.002, 0.001, 0.002)).toBe(0.001)
  })
})
