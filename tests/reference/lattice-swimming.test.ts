// Bodies of slender rods in honey: drag struts against resistive-force theory. Inertia is small, not zero, and its part in
// the result is measured. Class: 1e-3 where inertia is negligible (m w / b of 1e-3 or less), and its order.

import { describe, expect, test } from 'vitest'
import { addForces } from '../../sim/lattice/advance.js'
import { buildLattice } from '../../sim/lattice/build.js'
import { type Stroke, type Swimmer, squareStroke, swim } from './lattice-swimmers.js'
import { orderOf } from './physics-bodies.js'

const degrees = Math.PI / 180
/** gamma = 2, and m w / b = 4e-4. */
const honey: Swimmer = { normalNspm2: 2, tangentNspm2: 1, nodeKg: 2e-3, strokeSeconds: 30 }
const distance = (swimmer: Swimmer, stroke: Stroke) => Math.hypot(...swim(swimmer, stroke))
const relative = (value: number, truth: number) => Math.abs(value / truth - 1)

describe('three links, two driven joints (Purcell, Life at low Reynolds number, 1977, from memory)', () => {
  // Net displacement in link lengths after one square stroke of joint angles +-A, resistive-force theory, gamma = C_n / C_t
  // = 2, by quadrature independent of this code. Reversal at large strokes: Wiezel and Or, preprint 1603.02268, 2016
  // (abstract read).
  test.each([
    [10, 0.007455774176],
    [20, 0.029044856279],
    [30, 0.062494198602],
    [40, 0.104169415327],
    [50, 0.149162526047],
    [60, 0.19124723806],
    [70, 0.222767694214],
    [80, 0.234767339631],
    [90, 0.217837087154],
    [100, 0.163980724076],
    [110, 0.06913875738],
  ])('joint angles of +-%d degrees: %d of a link a stroke', (amplitude, truth) => {
    const [dx, dy] = swim(honey, squareStroke(amplitude * degrees))
    expect(relative(-dx, truth)).toBeLessThan(1e-3)
    expect(Math.abs(dy)).toBeLessThan(1e-3 * truth)
  })

  test('at 120 degrees it swims the other way, 0.064654291876', () => {
    expect(relative(swim(honey, squareStroke(120 * degrees))[0], 0.064654291876)).toBeLessThan(1e-3)
  })

  test('the best square stroke is +-79.675950 degrees: 0.2347825 of a link, 0.0782608 of the body', () => {
    const at = [77, 80, 83].map((angle) => distance(honey, squareStroke(angle * degrees)))
    const [low, middle, high] = at as [number, number, number]
    // Vertex of the parabola through three strokes, 3 degrees apart; its height to the vertex.
    const bend = low - 2 * middle + high
    const best = 80 - (3 * (high - low)) / 2 / bend
    expect(Math.abs(best - 79.67595)).toBeLessThan(0.1)
    const highest = middle - (high - low) ** 2 / (8 * bend)
    expect(relative(highest, 0.2347825)).toBeLessThan(1e-3)
    expect(relative(highest / 3, 0.0782608)).toBeLessThan(1e-3)
  })

  test('what inertia does shrinks as the mass, at least', () => {
    const error = (nodeKg: number) => {
      return Math.abs(distance({ ...honey, nodeKg }, squareStroke(60 * degrees)) - 0.19124723806)
    }
    expect(orderOf(error(8e-3), error(4e-3))).toBeGreaterThan(0.9)
    expect(error(4e-3)).toBeLessThan(1e-4)
  })

  test.each([1.2, 1.5, 1.7, 2, 3])('gamma = %d: small strokes bring (20/81)(gamma - 1) A^2', (gamma) => {
    // Twice the curvature 5 (gamma - 1)/81 of the straight pose times the area of the stroke; the next order is A^4.
    const swimmer = { ...honey, normalNspm2: gamma }
    const share = (amplitude: number) =>
      distance(swimmer, squareStroke(amplitude)) / ((20 / 81) * (gamma - 1) * amplitude * amplitude)
    const [ten, five] = [share(10 * degrees), share(5 * degrees)]
    expect(relative((4 * five - ten) / 3, 1)).toBeLessThan(1e-3)
  })

  test('faster or slower, the same way: the path counts, not the time', () => {
    const slow = distance(honey, squareStroke(50 * degrees))
    expect(
      relative(distance({ ...honey, strokeSeconds: 60 }, squareStroke(50 * degrees)), slow),
    ).toBeLessThan(1e-4)
  })
})

describe('the scallop theorem (Purcell, 1977, from memory)', () => {
  const smooth = (s: number) => s * s * (3 - 2 * s)
  const there = (phase: number) => smooth(phase < 0.5 ? 2 * phase : 2 - 2 * phase)

  test.each<[string, Stroke]>([
    ['both joints along one curve and back', (p) => [there(p) - 0.5, Math.sin(2 * there(p))]],
    ['one hinge', (p) => [there(p), 0.4]],
  ])('%s: the body comes back, but for what inertia does, m w / b at most', (_, stroke) => {
    const net = (nodeKg: number) => distance({ ...honey, nodeKg }, stroke)
    const [heavy, light] = [net(8e-3), net(4e-3)]
    // m w / b is 8e-4 for the lighter one, w = 2 pi / 30 s.
    expect(light).toBeLessThan(1e-4)
    expect(orderOf(heavy, light)).toBeGreaterThan(0.9)
  })

  test('there and back at different speeds makes no difference', () => {
    const uneven = (phase: number) => smooth(phase < 0.2 ? 5 * phase : (1 - phase) / 0.8)
    expect(distance(honey, (p) => [uneven(p) - 0.5, Math.sin(2 * uneven(p))])).toBeLessThan(1e-4)
  })
})

test('with the same drag along and across nothing swims: the middle of the drag stays', () => {
  // Sum of b v over the rods is zero, whatever the stroke; a supporting statement: Ishimoto, Herault and Moreau, preprint
  // 2504.09417, 2025 (abstract read). The pose at the end is that of the start, so the middle of the body stays too.
  const even = { ...honey, normalNspm2: 1 }
  expect(distance(even, squareStroke(60 * degrees))).toBeLessThan(1e-6)
})

describe('a long filament with a travelling wave (Gray and Hancock, 1955, from memory)', () => {
  /**
   * U/c of points that move only across, y = b sin(k x - w t), over one wave of `segments` rods: the speed along x at
   * which the drag of the whole wave vanishes. Forces are linear in U: two of them give the zero.
   */
  const speed = (bk: number, gamma: number, segments: number) => {
    const spacing = (2 * Math.PI) / segments
    const drag = (along: number) => {
      const nodes = Array.from({ length: segments + 1 }, (_, i) => ({
        positionM: [i * spacing, bk * Math.sin(i * spacing)],
        velocityMps: [along, -bk * Math.cos(i * spacing)],
        massKg: 1,
      }))
      const dragStruts = Array.from({ length: segments }, (_, i) => {
        return { a: i, b: i + 1, normalNspm2: gamma, tangentNspm2: 1 }
      })
      const lattice = buildLattice({ nodes, struts: [], dragStruts, gravityMps2: [0, 0], stepSeconds: 1e-3 })
      addForces(lattice)
      let sum = 0
      for (let i = 0; i <= segments; i++) sum += lattice.nodes[6 * i + 4]!
      return sum
    }
    const [still, moving] = [drag(0), drag(1)]
    return still / (still - moving)
  }

  test.each([
    [2, 0.1, 0.004944398564],
    [2, 0.3, 0.040876075977],
    [2, 0.5, 0.097757507863],
    [2, 1, 0.238752397519],
    [1.5, 0.1, 0.002478326198],
    [1.5, 0.3, 0.020864466752],
    [1.5, 0.5, 0.051390665631],
    [1.5, 1, 0.135558678509],
  ])('gamma %d, b k = %d: |U| = %d c, against the wave', (gamma, bk, truth) => {
    // Values: quadrature of the same theory, independent of this code. The wave goes towards +x.
    expect(relative(-speed(bk, gamma, 256), truth)).toBeLessThan(1e-3)
    const error = (segments: number) => Math.abs(-speed(bk, gamma, segments) - truth)
    expect(Math.abs(orderOf(error(32), error(64)) - 2)).toBeLessThan(0.1)
  })

  test('small waves: U/c = (1/2) b^2 k^2 (gamma - 1) / (1 + (1/2) gamma b^2 k^2); none with gamma = 1', () => {
    for (const gamma of [1.5, 2]) {
      const bk = 0.02
      const truth = (0.5 * bk * bk * (gamma - 1)) / (1 + 0.5 * gamma * bk * bk)
      expect(relative(-speed(bk, gamma, 512), truth)).toBeLessThan(1e-3)
    }
    expect(Math.abs(speed(0.5, 1, 64))).toBeLessThan(1e-14)
  })

  test('coefficients a body of rods is given, and the drag that follows: Gray and Hancock, Lighthill', () => {
    // C_t = 2 pi / (ln(2 w/a) - 1/2), C_n = 4 pi / (ln(2 w/a) + 1/2), times viscosity, w the wave length (1955, formula from
    // memory); Lighthill, Flagellar hydrodynamics, 1976 (from memory): q = 0.09 w in place of w, without - 1/2. These
    // anchor what a user should enter; the numbers were recomputed.
    const coefficients = (x: number, half: number) => [
      (2 * Math.PI) / (Math.log(x) - half),
      (4 * Math.PI) / (Math.log(x) + 0.5),
    ]
    const rows = [
      [50, 1.53055416, 2.461498864, 1.608240288, 2.859600867, 4.659000485, 1.629248521],
      [100, 1.309455967, 2.167244361, 1.655072347, 2.17383293, 3.706487522, 1.705047095],
      [200, 1.144172971, 1.935829815, 1.691903116, 1.753356244, 3.077338639, 1.755113172],
    ] as const
    // Force on a rod of 1 m that moves at 1 m/s along or across itself, in a fluid of viscosity 1.
    const drag = (tangentNspm2: number, normalNspm2: number, velocityMps: readonly number[]) => {
      const nodes = [0, 1].map((place) => ({ positionM: [place, 0], velocityMps, massKg: 1 }))
      const dragStruts = [{ a: 0, b: 1, normalNspm2, tangentNspm2 }]
      const lattice = buildLattice({ nodes, struts: [], dragStruts, gravityMps2: [0, 0], stepSeconds: 1e-3 })
      addForces(lattice)
      return Math.hypot(lattice.nodes[4]! + lattice.nodes[10]!, lattice.nodes[5]! + lattice.nodes[11]!)
    }
    for (const [slender, grayT, grayN, grayRatio, lightT, lightN, lightRatio] of rows) {
      for (const [[t, n], truths] of [
        [coefficients(2 * slender, 0.5), [grayT, grayN, grayRatio]],
        [coefficients(0.18 * slender, 0), [lightT, lightN, lightRatio]],
      ] as const) {
        const [along, across] = [drag(t!, n!, [1, 0]), drag(t!, n!, [0, 1])]
        expect(relative(along, truths[0])).toBeLessThan(1e-8)
        expect(relative(across, truths[1])).toBeLessThan(1e-8)
        expect(relative(across / along, truths[2])).toBeLessThan(1e-8)
      }
    }
  })
})
