// Columns: critical loads from the geometric stiffness of beams cut into pieces. S. Timoshenko and J. Gere, Theory of
// elastic stability, 1961 (from memory); A. G. Greenhill, Determination of the greatest height consistent with stability,
// 1881 (from memory); numbers recomputed independently of this code. Orders of convergence are measured.

import { describe, expect, test } from 'vitest'
import {
  type BarSpec,
  buildFramework,
  equilibrate,
  geometricStiffness,
  type HingeSpec,
  type Point,
  situationOf,
  stiffnessMatrix,
} from '../../sim/frames/index.js'
import { beam, bendingUnknowns, type End, eigenvaluesOf, orderOf, partOf } from './beams-bodies.js'

const relative = (value: number, truth: number) => Math.abs(value / truth - 1)

/** Critical factor of a thrust that is 1 (or given at both ends of every piece), L = EI = 1. */
function criticalLoad(
  pieces: number,
  ends: readonly [End, End],
  thrust: (piece: number) => readonly [number, number] = () => [1, 1],
  wall: Partial<BarSpec> = {},
): number {
  const framework = beam({ pieces, wall })
  const n = framework.unknownCount
  const free = bendingUnknowns(framework, ends)
  const stiffness = partOf(stiffnessMatrix(framework), n, free)
  const geometric = geometricStiffness(framework, (bar) => {
    const [a, b] = thrust(bar)
    return [-a, -b]
  })
  // (K - s |Kg|) x = 0: the largest 1/s of |Kg| x = (1/s) K x.
  const inverse = eigenvaluesOf(partOf(geometric, n, free).mul(-1), stiffness)
  return 1 / inverse.at(-1)!
}

describe("Euler's columns, P = pi^2 EI / (K L)^2", () => {
  test.each([
    ['pinned at both ends', ['pinned', 'pinned'], 1],
    ['clamped at both ends', ['clamped', 'clamped'], 0.5],
    ['clamped and free', ['clamped', 'free'], 2],
    ['clamped and pinned', ['clamped', 'pinned'], 0.699155659643],
  ] as const)('%s: K = %s', (_, ends, factor) => {
    const truth = (Math.PI / factor) ** 2
    const [coarse, middle, fine] = [8, 16, 32].map((pieces) => criticalLoad(pieces, ends))
    expect(relative(fine!, truth)).toBeLessThan(1e-5)
    expect(Math.abs(orderOf(coarse! - truth, middle! - truth) - 4)).toBeLessThan(0.1)
    // The two finer ones together.
    expect(relative((16 * fine! - middle!) / 15, truth)).toBeLessThan(2e-8)
  })

  test('clamped and pinned is the root of x = tan x, 4.49340945790906: P = 20.190728556', () => {
    const [coarse, fine] = [16, 32].map((pieces) => criticalLoad(pieces, ['clamped', 'pinned']))
    expect(relative((16 * fine! - coarse!) / 15, 20.190728556)).toBeLessThan(1e-8)
  })

  test.each([
    ['pinned', 'pinned', 1],
    ['clamped', 'free', 2],
  ] as const)('a column that shears, %s and %s: P = P_e / (1 + P_e / (kappa G A))', (one, other, factor) => {
    // F. Engesser, Die Knickfestigkeit gerader Staebe, 1891 (from memory; also in Timoshenko and Gere, section 2.17).
    const euler = (Math.PI / factor) ** 2
    for (const shearN of [20, 200]) {
      const truth = euler / (1 + euler / shearN)
      const [coarse, middle, fine] = [8, 16, 32].map((pieces) =>
        criticalLoad(pieces, [one, other], undefined, { shearN }),
      )
      const order = orderOf(coarse! - truth, middle! - truth)
      expect(relative(fine!, truth)).toBeLessThan(1e-3)
      expect(Math.abs(order - 2)).toBeLessThan(0.1)
    }
  })

  test('a column under its own thrust loses stability there in the large-displacement solver too', () => {
    const framework = beam({ pieces: 16 })
    const last = framework.nodeUnknown[16]!
    const foot = framework.nodeUnknown[0]!
    const situation = situationOf(framework, [foot, foot + 1, last + 1])
    const unstable = (load: number) => {
      situation.loads[last] = -load
      const balance = equilibrate(situation)
      if ('reason' in balance) throw new Error(balance.reason)
      return balance.unstable
    }
    expect(unstable(0.995 * Math.PI ** 2)).toBe(0)
    expect(unstable(1.005 * Math.PI ** 2)).toBe(1)
    // Beyond the second load, 4 pi^2, two.
    expect(unstable(1.02 * 4 * Math.PI ** 2)).toBe(2)
  })
})

describe('a column under its own weight, clamped at its foot', () => {
  // Thrust q (L - x), growing towards the foot.
  const greenhill = (pieces: number) =>
    criticalLoad(pieces, ['clamped', 'free'], (i) => [1 - i / pieces, 1 - (i + 1) / pieces])

  test('q L^3 / EI = 7.837347438943 (Greenhill), at fourth order', () => {
    const truth = 7.837347438943
    const [coarse, middle, fine] = [8, 16, 32].map(greenhill)
    expect(Math.abs(orderOf(coarse! - truth, middle! - truth) - 4)).toBeLessThan(0.1)
    expect(relative((16 * fine! - middle!) / 15, truth)).toBeLessThan(1e-9)
  })

  test('so the greatest height is 1.986352707430 (EI / q)^(1/3)', () => {
    expect(relative(Math.cbrt((16 * greenhill(16) - greenhill(8)) / 15), 1.98635270743)).toBeLessThan(1e-8)
  })
})

describe('a column of rigid links and torsion springs', () => {
  /** n links of length 1/n, k = n (EI / l with EI = 1); links `stiffness` times as stiff in bending. */
  function rigidLinks(n: number, stiffness: number): number {
    const nodes = Array.from({ length: n + 1 }, (_, i): Point => [i / n, 0])
    const bars = Array.from({ length: n }, (_, i): BarSpec => {
      return { a: i, b: i + 1, axialN: stiffness, bendingNm2: stiffness, turnA: 1, turnB: 0 }
    })
    const hinges = Array.from({ length: n - 1 }, (_, i): HingeSpec => {
      return { node: i + 1, turns: [0, 1], stiffnessNmprad: n }
    })
    const framework = buildFramework({ nodes, bars, hinges })
    const size = framework.unknownCount
    const free = Array.from(framework.nodeUnknown).flatMap((unknown, node) => {
      const turns = [framework.turnOf(node, 0), framework.turnOf(node, 1)].filter((one) => one >= 0)
      return node === 0 || node === n ? turns : [unknown + 1, ...turns]
    })
    const geometric = partOf(
      geometricStiffness(framework, () => [-1, -1]),
      size,
      free,
    ).mul(-1)
    return 1 / eigenvaluesOf(geometric, partOf(stiffnessMatrix(framework), size, free)).at(-1)!
  }

  test.each([
    [2, 0.810569469],
    [4, 0.949641204],
    [8, 0.987214831],
    [16, 0.996791364],
  ])('%d links: (4 k / l) sin^2(pi / 2 n), %d of Euler', (n, ratio) => {
    // Extrapolated to rigid links: what bends is in proportion to 1 / stiffness.
    const load = (10 * rigidLinks(n, 1e5) - rigidLinks(n, 1e4)) / 9
    expect(relative(load, 4 * n * n * Math.sin(Math.PI / (2 * n)) ** 2)).toBeLessThan(1e-7)
    expect(relative(load / Math.PI ** 2, ratio)).toBeLessThan(1e-7)
  })
})
