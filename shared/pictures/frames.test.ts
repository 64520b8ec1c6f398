// Frames of a plug-in: what is wrong with them, how they travel, and what lies between two of them.

import { describe, expect, it } from 'vitest'
import { linkageFrames, solidFrames, trussFrames } from '../../tests/frames-fixture.js'
import type { Frames } from '../frames.js'
import { framesFault } from './fault.js'
import { groundHeight } from './ground.js'
import { lengthText, momentsOf, roundStep, roundStepUp } from './measure.js'
import { cornersOf, momentAt } from './moment.js'
import { base64Of, bytesOf, packFrames, packNumbers, unpackFrames } from './packing.js'

const flat = trussFrames({ bays: 3, chains: 1, frames: 20 })
const all = [flat, trussFrames({ bays: 2, chains: 3, frames: 20 }), linkageFrames(20), solidFrames(20)]

describe('what is wrong with frames', () => {
  it('is nothing with sound ones', () => {
    for (const frames of all) expect(framesFault(frames)).toBeUndefined()
  })
  const body = linkageFrames(20).bodies![0]!
  const grid = solidFrames(20).groundGrid!
  const faults: readonly (readonly [Partial<Frames>, RegExp])[] = [
    [{ dimensions: 4 as 3 }, /4 dimensions/],
    [{ positions: [] }, /no frame/],
    [{ positions: [new Float64Array(0)] }, /no frame with a node or a body/],
    [{ positions: [Float64Array.of(0, Number.NaN)] }, /not finite/],
    [{ positions: [Float64Array.of(0, 0), Float64Array.of(0)] }, /frame 1 has 1/],
    [{ positions: [Float64Array.of(0, 0, 0)] }, /3 numbers in a frame of 2/],
    [{ links: [{ a: 0, b: 99, kind: 'x' }] }, /link names a node/],
    [{ links: [{ a: 0, b: 1, kind: 'x', weight: 1.5 }] }, /weight of a link/],
    [{ markers: [{ node: -1, label: 'x', radiusM: 1 }] }, /marker names a node/],
    [{ nodeRadiiM: [] }, /0 node radii for 8/],
    [{ secondsPerFrame: 0 }, /secondsPerFrame/],
    [{ drive: [{ link: 0, values: Float64Array.of(1) }] }, /drive/],
    [{ drive: [{ link: 0, values: new Float64Array(20).fill(Number.NaN) }] }, /drive/],
    [{ contacts: [] }, /contacts/],
    [{ contacts: flat.contacts!.map(() => new Uint8Array(1)) }, /contacts/],
    [{ motors: [{ node: 99, label: 'm', values: new Float64Array(20) }] }, /motor/],
    [{ ground: [[0, Number.NaN]] }, /ground/],
    [{ bodies: [{ ...body, poses: [] }] }, /'crank' does not have 3 finite numbers in each/],
    [{ bodies: [{ ...body, cornersM: [1] }] }, /'crank' has no whole number/],
    [{ bodies: [{ ...body, faces: [[7]] }] }, /'crank' names a corner/],
    [{ bodies: [{ ...body, radiusM: -1 }] }, /'crank' has a radius below 0/],
    [{ walls: [{ label: 'w', pointsM: [1, 2, 3] }] }, /wall 'w'/],
    [{ groundGrid: { ...grid, countX: 3 } }, /grid/],
    [{ labels: [{ text: 'a', atM: [1] }] }, /label/],
    [{ worthSeeing: { lowM: [0, 0], highM: [0, 1] } }, /worth seeing/],
  ]
  it.each(faults)('is named: %o', (change, expected) => {
    expect(framesFault({ ...flat, ...change })).toMatch(expected)
  })
})

describe('packing', () => {
  it('keeps every number to half a step, which is 1/131,070 of its extent, and everything else as it is', () => {
    for (const frames of all) {
      const back = unpackFrames(JSON.parse(JSON.stringify(packFrames(frames))))
      const { positions, drive, contacts, bodies, motors, groundGrid, ...plain } = back
      expect(plain).toEqual(JSON.parse(JSON.stringify(plainOf(frames))))
      expect(contacts).toEqual(frames.contacts)
      for (const [frame, places] of frames.positions.entries())
        for (const [i, value] of places.entries())
          expect(Math.abs(positions[frame]![i]! - value)).toBeLessThan(1e-5)
      for (const [i, { link, values }] of frames.drive.entries()) {
        expect(drive[i]!.link).toBe(link)
        for (const [f, value] of values.entries())
          expect(Math.abs(drive[i]!.values[f]! - value)).toBeLessThan(2e-5)
      }
      for (const [i, one] of (frames.bodies ?? []).entries())
        for (const [f, pose] of one.poses.entries())
          for (const [n, value] of pose.entries())
            expect(Math.abs(bodies![i]!.poses[f]![n]! - value)).toBeLessThan(1e-4)
      expect(motors?.map(({ label }) => label)).toEqual(frames.motors?.map(({ label }) => label))
      if (frames.groundGrid)
        for (const [i, value] of frames.groundGrid.heightsM.entries())
          expect(Math.abs(groundGrid!.heightsM[i]! - value)).toBeLessThan(1e-6)
      expect(framesFault(back)).toBeUndefined()
    }
  })
  it('needs steps of 1/65,535 of the extent', () => {
    expect(packNumbers([0, 0.5]).step).toBeCloseTo(0.5 / 65_535, 12)
    expect(packNumbers([3, 3])).toMatchObject({ low: 3, step: 1 })
    expect(packNumbers([])).toMatchObject({ low: 0, base64: '' })
  })
  it('writes the base64 of RFC 4648 (2006), section 10', () => {
    const vectors = {
      '': '',
      f: 'Zg==',
      fo: 'Zm8=',
      foo: 'Zm9v',
      foob: 'Zm9vYg==',
      fooba: 'Zm9vYmE=',
      foobar: 'Zm9vYmFy',
    }
    for (const [plain, coded] of Object.entries(vectors)) {
      const bytes = new TextEncoder().encode(plain)
      expect(base64Of(bytes)).toBe(coded)
      expect(bytesOf(coded)).toEqual(bytes)
    }
  })
})

function plainOf({ positions, drive, contacts, bodies, motors, groundGrid, ...plain }: Frames) {
  return plain
}

describe('between two frames', () => {
  it('places go straight, drives evenly, contact is that of the earlier frame', () => {
    const moment = momentAt(flat, 4.25)
    for (const [i, value] of moment.positions.entries())
      expect(value).toBeCloseTo(0.75 * flat.positions[4]![i]! + 0.25 * flat.positions[5]![i]!, 12)
    expect(moment.contacts).toBe(flat.contacts![4])
    const series = flat.drive[0]!.values
    expect(moment.valueOf(series)).toBeCloseTo(0.75 * series[4]! + 0.25 * series[5]!, 12)
    expect(momentAt(flat, 19).positions).toBe(flat.positions[19])
  })
  it('turns in 3-D stay turns: corners keep their distances', () => {
    const frames = solidFrames(20)
    const [hull] = frames.bodies!
    for (const at of [3, 3.5]) {
      const corners = cornersOf(hull!, momentAt(frames, at).poses[0]!)
      const apart = (a: number, b: number) =>
        Math.hypot(...[0, 1, 2].map((i) => corners[3 * a + i]! - corners[3 * b + i]!))
      expect(apart(0, 4)).toBeCloseTo(0.12, 9)
      expect(apart(0, 2)).toBeCloseTo(0.06, 9)
      expect(apart(0, 1)).toBeCloseTo(0.08, 9)
    }
  })
  it('a quarter turn about the upright takes x to -z, as the right-hand rule says', () => {
    const half = Math.SQRT1_2
    const body = { label: 'b', role: 'machine', cornersM: [1, 0, 0], poses: [] } as const
    const [x, y, z] = cornersOf(body, Float64Array.of(0, 0, 0, 0, half, 0, half))
    expect([x, y, z].map((v) => Math.round(v! * 1e12) / 1e12 + 0)).toEqual([0, 0, -1])
  })
})

describe('the ground between its points', () => {
  it('is straight along a profile and level beyond its ends', () => {
    const height = groundHeight({
      ...flat,
      ground: [
        [0, 0],
        [1, 0.2],
        [1, 0.5],
        [2, 0.5],
      ],
    })!
    expect([-5, 0.5, 1.5, 9].map((x) => height(x, 0))).toEqual([0, 0.1, 0.5, 0.5])
    expect(groundHeight({ ...flat, ground: [] })).toBeUndefined()
  })
  it('is bilinear on a grid: exact for planes and at the crossings', () => {
    const grid = { firstXM: 0, firstZM: 0, spacingXM: 0.5, spacingZM: 0.25, countX: 3, countZ: 3 }
    const heightsM = Float64Array.from(
      { length: 9 },
      (_, i) => 2 * 0.5 * (i % 3) - 3 * 0.25 * Math.floor(i / 3),
    )
    const height = groundHeight({ ...flat, groundGrid: { ...grid, heightsM } })!
    for (const [x, z] of [
      [0.1, 0.2],
      [0.5, 0.5],
      [0.99, 0.01],
    ] as const)
      expect(height(x, z)).toBeCloseTo(2 * x - 3 * z, 12)
    expect(height(5, -3)).toBeCloseTo(2, 12)
  })
})

describe('numbers for people', () => {
  it('are round and have units', () => {
    expect(momentsOf(trussFrames({ bays: 1, chains: 1, frames: 41 }), 5)).toEqual([0, 10, 20, 30, 40])
    expect([roundStep(0.07), roundStep(9), roundStep(1), roundStep(0.2)]).toEqual([0.05, 5, 1, 0.2])
    expect([roundStepUp(0.07), roundStepUp(9), roundStepUp(1), roundStepUp(0.021)]).toEqual([
      0.1, 10, 1, 0.05,
    ])
    expect([lengthText(0.02), lengthText(0.5), lengthText(0.00005)]).toEqual(['20 mm', '0.5 m', '50 µm'])
  })
})
