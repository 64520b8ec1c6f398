// Waves in periodic structures against closed forms: Kittel, Introduction to solid state physics, chapter on phonons;
// Brillouin, Wave propagation in periodic structures, 1946 (both from memory). All numbers were recomputed independently.

import { describe, expect, test } from 'vitest'
import { Refusal } from '../../shared/refusals.js'
import { bandRadps } from '../../sim/measure/bands.js'
import type { CellSpec } from '../../sim/measure/cell.js'
import { homogenise } from '../../sim/measure/homogenise.js'
import { extrapolate } from './beams-bodies.js'

const near = (value: number | undefined, truth: number, within = 1e-10) =>
  expect(Math.abs(value! - truth)).toBeLessThan(within * Math.max(1, Math.abs(truth)))
const spring = (a: number, b: number, shift: number[], stiffnessNpm = 1) => ({ a, b, shift, stiffnessNpm })

describe('chains', () => {
  const chain: CellSpec = {
    vectorsM: [[1]],
    nodes: [{ positionM: [0], massKg: 1 }],
    struts: [spring(0, 0, [1])],
  }
  const pair = (m1: number, m2: number, k1 = 1, k2 = 1): CellSpec => ({
    vectorsM: [[1]],
    nodes: [
      { positionM: [0], massKg: m1 },
      { positionM: [0.5], massKg: m2 },
    ],
    struts: [spring(0, 1, [0], k1), spring(1, 0, [1], k2)],
  })

  test.each([
    [0.1, 0.31286893008],
    [0.25, 0.76536686473],
    [0.5, Math.SQRT2],
    [0.75, 1.847759065023],
    [1, 2],
  ])('of equal masses: at q a = %d pi the frequency is %d', (part, truth) => {
    near(bandRadps(chain, [part * Math.PI])[0], truth)
  })

  test.each([0.1, 0.25, 0.5, 0.75])(
    'of equal masses: at q a = %d pi energy travels at a cos(q a / 2)',
    (part) => {
      // Group velocity dw/dq, by differences in q extrapolated to none.
      const q = part * Math.PI
      const slope = (d: number) => (bandRadps(chain, [q + d])[0]! - bandRadps(chain, [q - d])[0]!) / (2 * d)
      const [coarse, fine] = [slope(2e-3), slope(1e-3)]
      near((4 * fine - coarse) / 3, Math.cos(q / 2))
    },
  )

  test.each([
    [1, 1.5, 1.154700538379, Math.SQRT2, 1.825741858351, 0.681774333275, 1.69366971155],
    [1, 2, 1, Math.SQRT2, 1.732050807569, 0.61803398875, 1.61803398875],
    [1, 4, Math.SQRT1_2, Math.SQRT2, 1.581138830084, 0.468213192462, 1.510223959022],
  ])('of masses %d and %d: acoustic top %d, optical bottom %d and top %d', (m1, m2, low, high, top, a, b) => {
    const edge = bandRadps(pair(m1, m2), [Math.PI])
    near(edge[0], low)
    near(edge[1], high)
    const middle = bandRadps(pair(m1, m2), [0])
    // The root of a rounding error.
    near(middle[0], 0, 1e-7)
    near(middle[1], top)
    const half = bandRadps(pair(m1, m2), [Math.PI / 2])
    near(half[0], a)
    near(half[1], b)
  })

  test('of equal masses on springs 1 and 2 in turn: edges sqrt 2, 2, sqrt 6', () => {
    const edge = bandRadps(pair(1, 1, 1, 2), [Math.PI])
    near(edge[0], Math.SQRT2)
    near(edge[1], 2)
    near(bandRadps(pair(1, 1, 1, 2), [0])[1], 2.449489742783)
  })

  test('a cell of two equal masses has the bands of one, folded', () => {
    const folded = bandRadps(pair(1, 1), [0.6 * Math.PI])
    near(folded[0], 2 * Math.sin(0.15 * Math.PI))
    near(folded[1], 2 * Math.cos(0.15 * Math.PI))
  })

  test('waves that are not defined are refused', () => {
    expect(() => bandRadps(chain, [1, 2])).toThrow(Refusal)
    expect(() => bandRadps({ ...chain, nodes: [{ positionM: [0] }] }, [1])).toThrow(Refusal)
  })
})

describe('sheets and solids', () => {
  const root3 = Math.sqrt(3)
  const triangular: CellSpec = {
    vectorsM: [
      [1, 0],
      [0.5, root3 / 2],
    ],
    nodes: [{ positionM: [0, 0], massKg: 1 }],
    struts: [spring(0, 0, [1, 0]), spring(0, 0, [0, 1]), spring(0, 0, [-1, 1])],
  }
  const square: CellSpec = {
    vectorsM: [
      [1, 0],
      [0, 1],
    ],
    nodes: [{ positionM: [0, 0], massKg: 1 }],
    struts: [
      spring(0, 0, [1, 0]),
      spring(0, 0, [0, 1]),
      spring(0, 0, [1, 1], 0.5),
      spring(0, 0, [-1, 1], 0.5),
    ],
  }

  /** Phase speeds for q to 0 along a direction, slowest first: even in q, so three waves are extrapolated. */
  const longWaves = (cell: CellSpec, direction: readonly number[]) => {
    const at = [0.08, 0.04, 0.02].map((q) => {
      return bandRadps(
        cell,
        direction.map((d) => q * d),
      ).map((w) => w / q)
    })
    return Array.from(at[0]!, (_, i) =>
      extrapolate(
        at.map((speeds) => speeds[i]!),
        [2, 4],
      ),
    )
  }

  test('long waves in the triangular lattice: 1.060660171780 and 0.612372435696 a sqrt(k/m), any direction', () => {
    for (const turns of [0, 0.07, 0.3]) {
      const [slow, fast] = longWaves(triangular, [
        Math.cos(2 * Math.PI * turns),
        Math.sin(2 * Math.PI * turns),
      ])
      near(slow, 0.612372435696)
      near(fast, 1.06066017178)
      near(fast! / slow!, root3)
    }
  })

  test('they are the waves of the homogenised continuum, sqrt(C / density)', () => {
    const { stiffness, cellSize } = homogenise(triangular)
    const density = 1 / cellSize
    const [slow, fast] = longWaves(triangular, [1, 0])
    near(fast, Math.sqrt(stiffness[0]![0]! / density))
    near(slow, Math.sqrt(stiffness[2]![2]! / density))
  })

  test('square lattice, k2 = 1/2, along [10]: sqrt 1.5 and sqrt 0.5; highest frequency squared 4 (k1 + k2)', () => {
    const [slow, fast] = longWaves(square, [1, 0])
    near(slow, Math.sqrt(0.5))
    near(fast, Math.sqrt(1.5))
    near(bandRadps(square, [Math.PI, 0])[1]! ** 2, 6)
  })

  test('highest frequency squared: 6 k/m triangular, 12 k/m simple cubic with face diagonals', () => {
    // Half a reciprocal vector, and a corner of the cubic zone.
    near(bandRadps(triangular, [0, (2 * Math.PI) / root3])[1]! ** 2, 6)
    const shifts = [-1, 0, 1].flatMap((x) => [-1, 0, 1].flatMap((y) => [-1, 0, 1].map((z) => [x, y, z])))
    const cubic: CellSpec = {
      vectorsM: [
        [1, 0, 0],
        [0, 1, 0],
        [0, 0, 1],
      ],
      nodes: [{ positionM: [0, 0, 0], massKg: 1 }],
      struts: shifts
        .filter((s) => [1, 2].includes(s.filter((i) => i !== 0).length) && s.find((i) => i !== 0)! > 0)
        .map((s) => spring(0, 0, s)),
    }
    near(bandRadps(cubic, [Math.PI, 0, 0])[2]! ** 2, 12)
    for (let i = 0; i < 50; i++) {
      const q = [1.1 * i, 0.7 * i, 2.3 * i]
      expect(bandRadps(cubic, q)[2]! ** 2).toBeLessThan(12 + 1e-9)
    }
  })
})
