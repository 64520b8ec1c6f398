// Single precision, 8 lanes: close to double precision near the origin and, because every lane counts from an origin
// that follows its body, just as close ten and a hundred metres away. Nothing to cite: our own promise.

import { describe, expect, test } from 'vitest'
import { buildLattice } from '../../sim/lattice/build.js'
import { advanceLanes, laneTally, packLanes, sampleLanes, unpackLane } from '../../sim/lattice/lanes.js'
import type { LatticeSpec } from '../../sim/lattice/spec.js'
import type { Tally } from '../../sim/lattice/tally.js'
import { varyLattice } from '../../sim/lattice/vary.js'

/** A braced row of cells that crawls over bumps of one millimetre, beginning at `startM` with `speedMps`. */
function crawler(dimensions: 2 | 3, startM: number, speedMps = 0): LatticeSpec {
  const columns = 5
  const layers = dimensions === 3 ? 2 : 1
  const cellM = 0.03
  const number = (i: number, j: number, k: number) => (i * 2 + j) * layers + k
  const nodes = Array.from({ length: columns * 2 * layers }, (_, n) => {
    const place = [Math.floor(n / (2 * layers)), Math.floor(n / layers) % 2, n % layers]
    const positionM = place.slice(0, dimensions).map((count) => count * cellM)
    positionM[0]! += startM
    positionM[1]! += 0.0012
    const velocityMps = positionM.map((_, axis) => (axis === 0 ? speedMps : 0))
    return { positionM, velocityMps, massKg: 0.006, friction: { forward: 0.3, backward: 0.9, sideways: 0.5 } }
  })
  const struts = []
  for (let i = 0; i < columns; i++)
    for (let j = 0; j < 2; j++)
      for (let k = 0; k < layers; k++)
        for (const [a, b, c] of [
          [1, 0, 0],
          [0, 1, 0],
          [0, 0, 1],
          [1, 1, 0],
          [1, -1, 0],
          [1, 0, 1],
          [0, 1, 1],
          [0, 1, -1],
        ] as const) {
          const [p, q, r] = [i + a, j + b, k + c]
          if (p >= columns || q < 0 || q > 1 || r < 0 || r >= layers) continue
          struts.push({ a: number(i, j, k), b: number(p, q, r), stiffnessNpm: 300, dampingNspm: 0.2 })
        }
  return {
    dimensions,
    nodes,
    struts: struts.filter((_, i) => i % 3 !== 0),
    actuators: struts
      .filter((_, i) => i % 3 === 0)
      .map((strut, i) => ({
        ...strut,
        group: 0,
        strain: 0.06,
        phaseTurns: i / 7,
        limits: { actuator: 'unlimited' },
      })),
    groups: [{ frequencyHz: 2 }],
    gravityMps2: dimensions === 2 ? [0, -9.81] : [0, -9.81, 0],
    ground: bumps(dimensions, startM),
    contact: { stiffness: 1500, damping: 800, exponent: 1, depthLimitM: 0.02 },
    stepSeconds: 2e-4,
  }
}

/** The same bumps under every start: heights at the same places relative to it. */
function bumps(dimensions: 2 | 3, startM: number) {
  const rows = dimensions === 3 ? 9 : 1
  const heightsM = Array.from({ length: 400 * rows }, (_, i) => 0.001 * (((i * 7) % 5) / 5))
  return { firstXM: startM - 1, spacingM: 0.015625, heightsM, rows, firstZM: -0.0625, spacingZM: 0.015625 }
}

/** Travel of the first node along x in every lane, m. */
function travels(spec: LatticeSpec, precision: 'double' | 'single', steps: number): number[] {
  const body = buildLattice(spec)
  const lattices = [0, 0.1, 0.2, 0.3].map((shift) =>
    varyLattice(body, { phaseTurns: spec.actuators!.map(({ phaseTurns }) => phaseTurns + shift) }),
  )
  const lanes = packLanes(lattices, { precision })
  expect(advanceLanes(lanes, steps)).toEqual([undefined, undefined, undefined, undefined])
  return lattices.map((_, i) => unpackLane(lanes, i).nodes[0]! - spec.nodes[0]!.positionM[0]!)
}

const largestError = (values: readonly number[], exact: readonly number[]) =>
  Math.max(...values.map((value, i) => Math.abs(value - exact[i]!))) / Math.max(...exact.map(Math.abs))

describe.each([2, 3] as const)('in %i dimensions', (dimensions) => {
  test.each([0, 10, 100])(
    'a crawl of 2 s that starts at %i m goes as far as in double precision',
    (startM) => {
      const exact = travels(crawler(dimensions, startM), 'double', 10_000)
      expect(Math.max(...exact.map(Math.abs))).toBeGreaterThan(0.005)
      const error = largestError(travels(crawler(dimensions, startM), 'single', 10_000), exact)
      expect(error).toBeLessThan(1e-3)
    },
  )

  test('origins follow bodies that slide for metres, and what is read out does not notice', () => {
    const gentle = crawler(dimensions, 0, 3)
    // Bumps of half a millimetre: higher ones throw the body, and bounces multiply what rounding began.
    const ground = { ...gentle.ground!, heightsM: gentle.ground!.heightsM.map((heightM) => heightM / 2) }
    const spec = { ...gentle, ground, gravityMps2: gentle.gravityMps2.map((g) => g / 20) }
    const [exact, single] = (['double', 'single'] as const).map((precision) => {
      const lanes = packLanes([buildLattice(spec)], { precision })
      for (let sample = 0; sample < 200; sample++) {
        advanceLanes(lanes, 25)
        sampleLanes(lanes, 0.005)
      }
      const { nodes } = unpackLane(lanes, 0)
      return { x: nodes[0]!, y: nodes[1]!, origin: lanes.origins[0]!, tally: laneTally(lanes, 0) }
    }) as [Reading, Reading]
    expect(exact.x).toBeGreaterThan(2)
    expect(exact.origin).toBe(0)
    expect(Math.abs(single.origin - exact.x)).toBeLessThan(1)
    expect(Math.abs(single.x - exact.x)).toBeLessThan(1e-3 * exact.x)
    for (const [i, heightM] of exact.tally.highestM.entries()) {
      expect(Math.abs(single.tally.highestM[i]! - heightM)).toBeLessThan(1e-3)
      expect(Math.abs(single.tally.lowestM[i]! - exact.tally.lowestM[i]!)).toBeLessThan(1e-3)
    }
  })

  test('origins follow bodies that fall, and the ground with them', () => {
    const high = crawler(dimensions, 0)
    const drop = {
      ...high,
      nodes: high.nodes.map((node) => ({ ...node, positionM: up(node.positionM, 1.2) })),
    }
    const [exact, single] = (['double', 'single'] as const).map((precision) => {
      const lanes = packLanes(
        [buildLattice({ ...drop, contact: { ...drop.contact!, depthLimitM: 0.06 }, stepSeconds: 1e-4 })],
        { precision },
      )
      advanceLanes(lanes, 2000)
      sampleLanes(lanes, 0)
      expect(advanceLanes(lanes, 13_000)).toEqual([undefined])
      const { nodes } = unpackLane(lanes, 0)
      return { x: nodes[0]!, y: nodes[1]!, origin: lanes.origins[1]!, tally: laneTally(lanes, 0) }
    }) as [Reading, Reading]
    expect(exact.y).toBeLessThan(0.1)
    expect(single.origin).toBeLessThan(0.6)
    expect(Math.abs(single.y - exact.y)).toBeLessThan(1e-3)
    // Sampled while it was high up.
    expect(single.tally.highestM[0]).toBeGreaterThan(0.9)
    expect(Math.abs(single.tally.highestM[0]! - exact.tally.highestM[0]!)).toBeLessThan(1e-5)
  })
})

interface Reading {
  readonly x: number
  readonly y: number
  readonly origin: number
  readonly tally: Tally
}

const up = (place: readonly number[], byM: number) =>
  place.map((value, axis) => (axis === 1 ? value + byM : value))
