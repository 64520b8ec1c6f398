// Natural frequencies of beams cut into pieces, against the closed forms of Euler-Bernoulli and Timoshenko beams.
// S. Timoshenko, Vibration problems in engineering, 1937; R. D. Blevins, Formulas for natural frequency and mode shape,
// 1979 (both from memory); numbers recomputed independently of this code. Where the pieces converge the order is
// measured: 4 in the square of the frequency with consistent masses, 2 with lumped ones or where shear counts.

import { Matrix, solve } from 'ml-matrix'
import { describe, expect, test } from 'vitest'
import { consistentMass, lumpedMass, stiffnessMatrix } from '../../sim/frames/index.js'
import {
  type BeamOptions,
  beam,
  bendingUnknowns,
  type End,
  eigenvaluesOf,
  extrapolate,
  orderOf,
  partOf,
} from './beams-bodies.js'

const relative = (value: number, truth: number) => Math.abs(value / truth - 1)

interface Bending {
  readonly stiffness: Matrix
  readonly consistent: Matrix
  readonly lumped: Matrix
  /** How many of the unknowns, at the end of the list, are turns. */
  readonly turns: number
}

function bending(options: BeamOptions, ends: readonly [End, End]): Bending {
  const framework = beam(options)
  const n = framework.unknownCount
  const turning = new Set(Array.from(framework.nodeUnknown, (_, node) => framework.turnOf(node)))
  const free = bendingUnknowns(framework, ends)
  const turns = free.filter((i) => turning.has(i))
  const order = [...free.filter((i) => !turning.has(i)), ...turns]
  return {
    stiffness: partOf(stiffnessMatrix(framework), n, order),
    consistent: partOf(consistentMass(framework), n, order),
    lumped: partOf(lumpedMass(framework), n, order),
    turns: turns.length,
  }
}

/** Squares of the angular frequencies of a beam of length 1, ascending; units EI / (rho A L^4). */
function squares(options: BeamOptions, ends: readonly [End, End]): number[] {
  const { stiffness, consistent } = bending(options, ends)
  return eigenvaluesOf(stiffness, consistent)
}

/** The same with lumped masses: turns have no mass and follow the displacements (static condensation). */
function lumpedSquares(options: BeamOptions, ends: readonly [End, End]): number[] {
  const { stiffness: k, lumped, turns } = bending(options, ends)
  const moved = k.rows - turns
  const part = (a: number, b: number, c: number, d: number) => k.subMatrix(a, b - 1, c, d - 1)
  const coupling = part(moved, k.rows, 0, moved)
  const followed = solve(part(moved, k.rows, moved, k.rows), coupling)
  const condensed = Matrix.sub(part(0, moved, 0, moved), coupling.transpose().mmul(followed))
  return eigenvaluesOf(condensed, lumped.subMatrix(0, moved - 1, 0, moved - 1))
}

const cases = [
  {
    name: 'cantilever',
    ends: ['clamped', 'free'],
    roots: [1.87510406871196, 4.69409113297417, 7.85475743823761, 10.9955407348755],
    rigid: 0,
  },
  {
    name: 'clamped at both ends',
    ends: ['clamped', 'clamped'],
    roots: [4.7300407448627, 7.85320462409584, 10.9956078380017],
    rigid: 0,
  },
  {
    name: 'free at both ends',
    ends: ['free', 'free'],
    roots: [4.7300407448627, 7.85320462409584, 10.9956078380017],
    rigid: 2,
  },
  {
    name: 'clamped and pinned',
    ends: ['clamped', 'pinned'],
    roots: [3.92660231204792, 7.06858274562873, 10.210176122813],
    rigid: 0,
  },
  {
    name: 'pinned at both ends',
    ends: ['pinned', 'pinned'],
    roots: [Math.PI, 2 * Math.PI, 3 * Math.PI],
    rigid: 0,
  },
] as const

describe.each(cases)('a beam $name', ({ ends, roots, rigid }) => {
  const at = [8, 16, 32].map((pieces) => squares({ pieces }, ends).slice(rigid))

  test('has the published roots beta L, consistent masses', () => {
    for (const [i, root] of roots.entries()) {
      expect(relative(at[2]![i]! ** 0.25, root)).toBeLessThan(6e-6)
      const squared = extrapolate(
        at.map((found) => found[i]!),
        [4, 6],
      )
      expect(relative(squared ** 0.25, root)).toBeLessThan(1e-8)
    }
  })

  test('reaches them at fourth order', () => {
    const truth = roots[0]! ** 4
    expect(Math.abs(orderOf(at[0]![0]! - truth, at[1]![0]! - truth) - 4)).toBeLessThan(0.1)
  })

  test('approaches them from above, as a Rayleigh quotient must', () => {
    for (const [i, root] of roots.entries()) expect(at[0]![i]! / root ** 4).toBeGreaterThan(1)
  })
})

test('lumped masses converge at second order', () => {
  const truth = cases[0].roots[0] ** 4
  const error = (pieces: number) => lumpedSquares({ pieces }, ['clamped', 'free'])[0]! - truth
  expect(Math.abs(orderOf(error(16), error(32)) - 2)).toBeLessThan(0.1)
})

test('squares of the cantilever roots and their ratios', () => {
  const at = [8, 16, 32].map((pieces) => squares({ pieces }, ['clamped', 'free']))
  const found = [0, 1, 2].map((i) =>
    Math.sqrt(
      extrapolate(
        at.map((one) => one[i]!),
        [4, 6],
      ),
    ),
  )
  for (const [i, omega] of [3.5160152685, 22.0344915647, 61.6972144135].entries()) {
    expect(relative(found[i]!, omega)).toBeLessThan(1e-8)
  }
  expect(relative(found[1]! / found[0]!, 6.266893026)).toBeLessThan(1e-8)
  expect(relative(found[2]! / found[0]!, 17.54748194)).toBeLessThan(1e-8)
})

test('a free beam has two rigid motions across and no more', () => {
  const found = squares({ pieces: 12 }, ['free', 'free'])
  expect(found.filter((squared) => Math.abs(squared) < 1e-4).length).toBe(2)
})

describe('Timoshenko beams, pinned at both ends, nu = 0.3, shear factor 5/6', () => {
  // With E I = 1, L = 1, thickness h: A = 12 / (E h^2) a width, kappa G A = kappa 12 / (2 (1 + nu) h^2), and the
  // rotary inertia is h^2 / 12 of the mass.
  const sheared = (slenderness: number) => {
    const h = 1 / slenderness
    const shearN = ((5 / 6) * 12) / (2.6 * h * h)
    return { shearN, rotaryKgm: (h * h) / 12 }
  }
  test.each([
    [5, [0.939656681, 0.814786988, 0.691889302]],
    [10, [0.983573084, 0.939656681, 0.879858932]],
    [20, [0.995797476, 0.983573084, 0.964373958]],
  ])('L/h = %d: frequencies over those of Euler-Bernoulli, modes 1 to 3: %s', (slenderness, ratios) => {
    const at = [8, 16, 32].map((pieces) =>
      squares({ pieces, wall: sheared(slenderness) }, ['pinned', 'pinned']),
    )
    for (const [i, ratio] of ratios.entries()) {
      const mode = (i + 1) * Math.PI
      const squared = extrapolate(
        at.map((one) => one[i]!),
        [2, 4],
      )
      expect(relative(Math.sqrt(squared) / (mode * mode), ratio)).toBeLessThan(1e-6)
    }
  })

  test('converge at second order: these bars leave out the shear of what is spread between their ends', () => {
    const error = (pieces: number) =>
      Math.sqrt(squares({ pieces, wall: sheared(10) }, ['pinned', 'pinned'])[0]!) / Math.PI ** 2 - 0.983573084
    expect(Math.abs(orderOf(error(16), error(32)) - 2)).toBeLessThan(0.1)
  })
})
