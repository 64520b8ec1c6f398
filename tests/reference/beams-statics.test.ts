// Deflections of beams, small and large. S. Timoshenko and J. Gere, Theory of elastic stability, 1961, and handbooks of
// beam formulas (from memory); G. R. Cowper, The shear coefficient in Timoshenko's beam theory, 1966 (from memory);
// numbers recomputed independently of this code.

import { describe, expect, test } from 'vitest'
import {
  buildFramework,
  equilibrate,
  type Framework,
  forcesOf,
  inPieces,
  linearResponse,
  situationOf,
} from '../../sim/frames/index.js'
import { beam, type End, extrapolate, orderOf } from './beams-bodies.js'

const relative = (value: number, truth: number) => Math.abs(value / truth - 1)

function heldAt(framework: Framework, node: number, end: End): number[] {
  const x = framework.nodeUnknown[node]!
  return { free: [], pinned: [x, x + 1], clamped: [x, x + 1, framework.turnOf(node)] }[end]
}

/** Linear displacement across at a node, under loads across on nodes and moments on their turns. */
function deflection(
  framework: Framework,
  ends: readonly [End, End],
  node: number,
  load: (node: number) => { readonly across?: number; readonly turn?: number },
): number {
  const last = framework.nodeUnknown.length - 1
  const situation = situationOf(framework, [
    ...heldAt(framework, 0, ends[0]),
    ...heldAt(framework, last, ends[1]),
  ])
  for (let i = 0; i <= last; i++) {
    const { across = 0, turn = 0 } = load(i)
    situation.loads[framework.nodeUnknown[i]! + 1] = across
    situation.loads[framework.turnOf(i)] = turn
  }
  const u = linearResponse(situation)
  if ('reason' in u) throw new Error(u.reason)
  return u[framework.nodeUnknown[node]! + 1]!
}

describe('deflections by linear theory, L = EI = 1', () => {
  test.each([1, 2, 5, 8])('a cantilever of %d pieces with an end load: P L^3 / 3 EI', (pieces) => {
    const tip = deflection(beam({ pieces }), ['clamped', 'free'], pieces, (i) => ({
      across: i === pieces ? 1 : 0,
    }))
    expect(relative(tip, 1 / 3)).toBeLessThan(1e-10)
  })

  /** An even load of 1 a length as forces and moments that do the same work on the bars' shapes. */
  const even = (pieces: number) => (i: number) => {
    const l = 1 / pieces
    const isEnd = i === 0 || i === pieces
    return { across: isEnd ? l / 2 : l, turn: i === 0 ? (l * l) / 12 : i === pieces ? -(l * l) / 12 : 0 }
  }

  test.each([1, 3, 8])('a cantilever of %d pieces with an even load: q L^4 / 8 EI', (pieces) => {
    expect(
      relative(deflection(beam({ pieces }), ['clamped', 'free'], pieces, even(pieces)), 1 / 8),
    ).toBeLessThan(1e-10)
  })

  const middle = (pieces: number) => (i: number) => ({ across: i === pieces / 2 ? 1 : 0 })
  test.each([2, 6])('pinned ends, %d pieces: P L^3 / 48 EI and 5 q L^4 / 384 EI in the middle', (pieces) => {
    const one = deflection(beam({ pieces }), ['pinned', 'pinned'], pieces / 2, middle(pieces))
    const all = deflection(beam({ pieces }), ['pinned', 'pinned'], pieces / 2, even(pieces))
    expect(relative(one, 1 / 48)).toBeLessThan(1e-10)
    expect(relative(all, 5 / 384)).toBeLessThan(1e-10)
  })

  test.each([2, 6])('clamped ends, %d pieces: P L^3 / 192 EI in the middle', (pieces) => {
    const one = deflection(beam({ pieces }), ['clamped', 'clamped'], pieces / 2, middle(pieces))
    expect(relative(one, 1 / 192)).toBeLessThan(1e-10)
  })
})

describe('shear', () => {
  const cowper = (nu: number) => (10 * (1 + nu)) / (12 + 11 * nu)

  test("Cowper's factor of a rectangle at nu = 0.3 is 0.849673202614", () => {
    expect(relative(cowper(0.3), 0.849673202614)).toBeLessThan(1e-11)
  })

  test.each([
    [5, 1.0312],
    [10, 1.0078],
    [20, 1.00195],
  ])('L/h = %d: tip of a cantilever over that without shear: %d', (slenderness, ratio) => {
    const h = 1 / slenderness
    const tip = (kappa: number, pieces: number) =>
      deflection(
        beam({ pieces, wall: { shearN: (kappa * 12) / (2.6 * h * h) } }),
        ['clamped', 'free'],
        pieces,
        (i) => ({ across: i === pieces ? 1 : 0 }),
      )
    // The published ratios have 4 to 5 digits, kappa = 5/6.
    expect(Math.abs(3 * tip(5 / 6, 1) - ratio)).toBeLessThan(6e-5)
    for (const kappa of [5 / 6, cowper(0.3)]) {
      const shearN = (kappa * 12) / (2.6 * h * h)
      for (const pieces of [1, 4])
        expect(relative(tip(kappa, pieces), 1 / 3 + 1 / shearN)).toBeLessThan(1e-10)
    }
  })
})

describe('large deflections: the pinned elastica', () => {
  // Half of a pinned column of length 1 is a cantilever of length 1/2 clamped in the middle and pushed along its axis;
  // its tip turns by the end angle. Angle, P / P_cr, chord / L, deflection of the middle / L.
  const rows = [
    [20, 1.015396866, 0.9697309074, 0.1097065212],
    [60, 1.15171962, 0.7410196061, 0.2966038231],
    [100, 1.518388793, 0.3489893004, 0.3957697483],
    [120, 1.884800869, 0.1231599724, 0.401585495],
  ] as const
  const critical = Math.PI * Math.PI

  /** The half column under the load P, found from a sideways push that is taken away again. */
  function half(load: number, pieces: number) {
    const nodes = [
      [0, 0],
      [0.5, 0],
    ] as const
    const one = { nodes, bars: [{ a: 0, b: 1, axialN: 1e7, bendingNm2: 1 }] }
    const framework = buildFramework(inPieces(one, pieces))
    const tip = framework.nodeUnknown[1]!
    const situation = situationOf(framework, heldAt(framework, 0, 'clamped'))
    const settle = (along: number, across: number) => {
      situation.loads[tip] = along
      situation.loads[tip + 1] = across
      const balance = equilibrate(situation)
      if ('reason' in balance) throw new Error(balance.reason)
      return balance
    }
    for (let step = 1; step <= 20; step++) settle((-load * step) / 20, (5 * step) / 20)
    for (let push = 5; push > 1e-4; push *= 0.7) settle(-load, push)
    const { unstable } = settle(-load, 0)
    const { u } = situation
    return {
      degrees: (u[framework.turnOf(1)]! * 180) / Math.PI,
      chord: 2 * (0.5 + u[tip]!),
      middle: Math.abs(u[tip + 1]!),
      unstable,
    }
  }

  test.each(rows)(
    'end angle %d degrees at P = %d P_cr: chord %d, middle %d',
    (angle, load, chord, middle) => {
      const at = [16, 32, 64].map((pieces) => half(load * critical, pieces))
      const fine = at[2]!
      // Near the critical load the angle feels the smallest error of the load: 0.2 % at 64 pieces.
      expect(relative(fine.degrees, angle)).toBeLessThan(3e-3)
      expect(relative(fine.chord, chord)).toBeLessThan(3e-3)
      expect(relative(fine.middle, middle)).toBeLessThan(3e-3)
      for (const one of at) expect(one.unstable).toBe(0)
      const limit = (key: 'degrees' | 'chord' | 'middle') =>
        extrapolate(
          at.map((one) => one[key]),
          [2, 4],
        )
      expect(relative(limit('degrees'), angle)).toBeLessThan(1e-4)
      expect(relative(limit('chord'), chord)).toBeLessThan(1e-4)
      expect(relative(limit('middle'), middle)).toBeLessThan(1e-4)
    },
  )

  test('converges at second order in the pieces', () => {
    const [, load, chord, middle] = rows[1]
    const [coarse, fine] = [16, 32].map((pieces) => half(load * critical, pieces))
    expect(Math.abs(orderOf(coarse!.chord - chord, fine!.chord - chord) - 2)).toBeLessThan(0.1)
    expect(Math.abs(orderOf(coarse!.middle - middle, fine!.middle - middle) - 2)).toBeLessThan(0.1)
  })
})

describe('an end moment bends a beam to a circle', () => {
  // M = 2 pi EI / L closes it. Common practice, no source.
  test('half a turn: the tip lies across at 2 L / pi', () => {
    const framework = beam({ pieces: 32, wall: { axialN: 1e4 } })
    const situation = situationOf(framework, heldAt(framework, 0, 'clamped'))
    for (let step = 1; step <= 20; step++) {
      situation.loads[framework.turnOf(32)] = (Math.PI * step) / 20
      const balance = equilibrate(situation)
      if ('reason' in balance) throw new Error(balance.reason)
    }
    const tip = framework.nodeUnknown[32]!
    expect(Math.abs(situation.u[tip]! + 1)).toBeLessThan(1e-3)
    expect(relative(situation.u[tip + 1]!, 2 / Math.PI)).toBeLessThan(2e-3)
    // Every piece carries the same moment, and nothing pulls.
    expect(relative(-forcesOf(situation)[framework.turnOf(0)]!, Math.PI)).toBeLessThan(1e-9)
  })
})
