// Moduli of periodic lattices of springs, from the frameworks' homogenisation, against closed forms. M. Ostoja-Starzewski,
// Lattice models in micromechanics, 2002 (from memory); the kagome lattice likewise. All numbers were recomputed
// independently of this code. Linear algebra: 1e-10.

import { describe, expect, test } from 'vitest'
import { stream } from '../../shared/streams.js'
import {
  type BarSpec,
  type FrameworkSpec,
  homogenise,
  moduliOf,
  nearestIsotropic,
  type Point,
  turned,
} from '../../sim/frames/index.js'
import { homogenise as homogeniseSprings } from '../../sim/measure/homogenise.js'
import { kagome, squareWithDiagonals, triangular } from './elasticity-cells.js'

const near = (value: number, truth: number) =>
  expect(Math.abs(value - truth)).toBeLessThan(1e-10 * Math.max(1, Math.abs(truth)))

describe('triangular lattice, spring k = 1', () => {
  const { stiffness, mechanisms } = homogenise(triangular(1))

  test('has the published stiffness and moduli', () => {
    near(stiffness.c11, 1.299038105677)
    near(stiffness.c22, 1.299038105677)
    near(stiffness.c12, 0.433012701892)
    near(stiffness.c66, 0.433012701892)
    const { e1, nu12, g12 } = moduliOf(stiffness)
    near(e1, 1.154700538379)
    near(nu12, 1 / 3)
    near(g12, 0.433012701892)
    const { bulk, shear, anisotropy } = nearestIsotropic(stiffness)
    near(bulk, 0.866025403784)
    near(shear, 0.433012701892)
    expect(anisotropy).toBeLessThan(1e-7)
    expect(mechanisms).toBe(0)
  })
})

describe('square lattice with both diagonals', () => {
  test.each([
    [1, 1 / 2, 4 / 3, 1 / 3, 1, 4 / 3, 1 / 3],
    [1, 1, 3 / 2, 1 / 2, 2, 2.4, 0.2],
    [1, Math.SQRT1_2, Math.SQRT2, 0.414213562373, Math.SQRT2, 1.783611624891, 0.261203874964],
  ])(
    'k1 = %d, k2 = %d: E %d, nu %d, Zener %d; at 45 degrees E %d, nu %d',
    (k1, k2, e, nu, zener, e45, nu45) => {
      const { stiffness } = homogenise(squareWithDiagonals(k1, k2))
      const straight = moduliOf(stiffness)
      near(straight.e1, e)
      near(straight.e2, e)
      near(straight.nu12, nu)
      near((2 * stiffness.c66) / (stiffness.c11 - stiffness.c12), zener)
      const slanting = moduliOf(turned(stiffness, Math.PI / 4))
      near(slanting.e1, e45)
      near(slanting.nu12, nu45)
    },
  )

  test('without diagonals it has no shear stiffness, and still its other moduli', () => {
    const { stiffness, mechanisms } = homogenise(squareWithDiagonals(1, 0))
    expect(stiffness.c66).toBe(0)
    expect(mechanisms).toBe(0)
    const { e1, nu12, g12 } = moduliOf(stiffness)
    expect([e1, nu12, g12]).toEqual([1, 0, 0])
  })
})

describe('kagome lattice, spring k = 1, bonds of length 1', () => {
  test('has the published moduli although it is only just rigid', () => {
    const { stiffness } = homogenise(kagome(1))
    const { e1, e2, nu12, g12 } = moduliOf(stiffness)
    near(e1, 0.57735026919)
    near(e2, 0.57735026919)
    near(nu12, 1 / 3)
    near(g12, 0.21650635095)
  })

  test.each([1, 2, 3, 4])('%d x %d cells: 3 n - 2 mechanisms, one for each line of bonds but two', (n) => {
    // As many bonds as coordinates, and each of the 3 n lines of bonds can carry a tension of its own: so 3 n zero
    // modes, two of which move the whole. Counting rule: C. R. Calladine, Buckminster Fuller's tensegrity structures
    // and Clerk Maxwell's rules, 1978 (from memory).
    const { mechanisms, stiffness } = homogenise(kagome(1, n))
    expect(mechanisms).toBe(3 * n - 2)
    near(moduliOf(stiffness).e1, 0.57735026919)
  })
})

describe('two independent homogenisations', () => {
  /** A random cell of 3 to 6 nodes, each joined to some others near by, welded or pin-jointed. */
  function randomCell(number: number, welded: boolean): FrameworkSpec {
    const draw = stream(20_261_201, 'spare', 7, number)
    const count = 3 + draw.below(4)
    const nodes = Array.from({ length: count }, (): Point => [draw.uniform(), draw.uniform()])
    const bars: BarSpec[] = []
    for (let a = 0; a < count; a++) {
      for (let n = 0; n < 4; n++) {
        const shift = [draw.below(3) - 1, draw.below(3) - 1] as const
        const b = draw.below(count)
        if (a === b && shift[0] === 0 && shift[1] === 0) continue
        bars.push({
          a,
          b,
          shift,
          axialN: 0.5 + draw.uniform(),
          bendingNm2: welded ? 0.01 * (0.5 + draw.uniform()) : 0,
        })
      }
    }
    const periods = [
      [1.1, 0.1],
      [-0.2, 0.9],
    ] as const
    return { nodes, bars, periods }
  }

  test.each([true, false])('agree on random cells, walls welded: %s', (welded) => {
    let stiff = 0
    for (let i = 0; i < 60; i++) {
      const cell = randomCell(i, welded)
      const ours = homogenise(cell)
      const theirs = homogeniseSprings({
        vectorsM: cell.periods!,
        nodes: cell.nodes.map((positionM) => ({ positionM })),
        ...(welded
          ? {
              beams: cell.bars.map(({ axialN, bendingNm2 = 0, ...rest }) => ({
                ...rest,
                stretchN: axialN,
                bendingNm2,
              })),
            }
          : { struts: springsOf(cell) }),
      })
      expect(ours.mechanisms).toBe(theirs.mechanisms)
      const { c11, c22, c12, c66, c16, c26 } = ours.stiffness
      const scale = c11 + c22
      for (const [i, row] of [
        [c11, c12, c16],
        [c12, c22, c26],
        [c16, c26, c66],
      ].entries()) {
        for (const [j, value] of row.entries()) {
          expect(Math.abs(value - theirs.stiffness[i]![j]!)).toBeLessThan(1e-9 * scale)
        }
      }
      if (ours.mechanisms === 0) stiff++
    }
    expect(stiff).toBeGreaterThan(10)
  })

  function springsOf({ nodes, periods, bars }: FrameworkSpec) {
    return bars.map(({ a, b, shift = [0, 0], axialN }) => {
      const [p, q] = periods!
      const x = nodes[b]![0] + shift[0] * p[0] + shift[1] * q[0] - nodes[a]![0]
      const y = nodes[b]![1] + shift[0] * p[1] + shift[1] * q[1] - nodes[a]![1]
      return { a, b, shift, stiffnessNpm: axialN / Math.hypot(x, y) }
    })
  }
})
