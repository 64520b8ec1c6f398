// What must hold for every body, whatever it is made of: momentum, angular momentum, energy, symmetry. Property tests over
// random bodies. Conservation follows from forces in equal and opposite pairs along the line between two nodes (Newton's
// third law; any textbook of mechanics) and from the integrator (Hairer, Lubich and Wanner, Geometric Numerical
// Integration, 2006, from memory).

import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { addForces, advance } from '../../sim/lattice/advance.js'
import { buildLattice, type Lattice } from '../../sim/lattice/build.js'
import {
  elasticJ,
  fillJ,
  gravitationalJ,
  kineticJ,
  lengthRateMps,
  momenta,
  tensionN,
} from '../../sim/lattice/observe.js'
import type { LatticeSpec } from '../../sim/lattice/spec.js'
import { imageOf, randomBody } from './lattice-free-bodies.js'
import { orderOf } from './physics-bodies.js'

const seeds = fc.integer({ min: 0, max: 2 ** 32 - 1 })
/** A fixed seed, so that a failure is the same one tomorrow. */
const runs = (numRuns: number) => ({ numRuns, seed: 20_261_201 })
const dimensions = [2, 3] as const

describe.each(dimensions)('a free body in %d dimensions', (d) => {
  test('keeps momentum and angular momentum to rounding, dashpots, drives and fills at work', () => {
    fc.assert(
      fc.property(seeds, (seed) => {
        const lattice = buildLattice(randomBody(seed, { dimensions: d, isAlive: true }))
        const before = momenta(lattice)
        const steps = 3_000
        expect(advance(lattice, steps)).toBeUndefined()
        const after = momenta(lattice)
        // Every rounding of a sum is at most 2^-53 of the largest force times h; sizes: 50 N, 0.5 m, sqrt(steps).
        const speedSize = lattice.massKg.reduce((a, b) => a + b, 0) * 1
        for (const name of ['px', 'py', 'pz', 'angular', 'angularX', 'angularY'] as const) {
          expect(Math.abs(after[name] - before[name])).toBeLessThan(1e-12 * speedSize)
        }
      }),
      runs(25),
    )
  })

  test('drag struts and node drag take momentum away only through drag: dP/dt = sum of drag forces', () => {
    // Isotropic rods and node drag, equal mass per drag: P decays as exp(-b t / m) whatever the body does.
    fc.assert(
      fc.property(seeds, (seed) => {
        const h = 1e-4
        const body = randomBody(seed, { dimensions: d, isAlive: true, stepSeconds: h })
        const nodes = body.nodes.map((node) => ({ ...node, massKg: 0.02 }))
        const lattice = buildLattice({ ...body, nodes, dragNspm: 0.05 })
        const before = momenta(lattice)
        advance(lattice, 2_000)
        const after = momenta(lattice)
        // Symplectic Euler: exactly the factor (1 - h b / m) a step.
        const factor = (1 - (h * 0.05) / 0.02) ** 2_000
        for (const name of ['px', 'py', 'pz'] as const) {
          expect(Math.abs(after[name] - factor * before[name])).toBeLessThan(1e-13)
        }
      }),
      runs(15),
    )
  })

  test('without damping and drive its energy ripples at first order in h and does not drift', () => {
    fc.assert(
      fc.property(seeds, (seed) => {
        const ripple = (stepSeconds: number) => {
          const lattice = buildLattice(randomBody(seed, { dimensions: d, isAlive: false, stepSeconds }))
          const energy = () => kineticJ(lattice) + elasticJ(lattice) + fillJ(lattice)
          const start = energy()
          let worst = 0
          let [early, late] = [0, 0]
          const samples = 400
          for (let i = 0; i < samples; i++) {
            advance(lattice, Math.round(0.01 / stepSeconds))
            const change = energy() / start - 1
            worst = Math.max(worst, Math.abs(change))
            if (i < samples / 2) early += (2 * change) / samples
            else late += (2 * change) / samples
          }
          return { worst, drift: Math.abs(late - early) }
        }
        const [whole, half] = [ripple(4e-4), ripple(2e-4)]
        expect(whole.worst).toBeLessThan(0.2)
        expect(half.worst).toBeLessThan(0.7 * whole.worst)
        expect(whole.drift).toBeLessThan(0.3 * whole.worst)
      }),
      runs(8),
    )
  })

  test('the energy budget closes at first order: what is stored and lost is what drives and gravity put in', () => {
    const residual = (seed: number, stepSeconds: number) => {
      const body = randomBody(seed, { dimensions: d, isAlive: true, stepSeconds })
      const gravityMps2 = d === 2 ? [0, -9.81] : [0, -9.81, 0]
      const lattice = buildLattice({ ...body, gravityMps2 })
      const stored = () => kineticJ(lattice) + gravitationalJ(lattice)
      const start = stored()
      let work = 0
      let turnedOver = 0
      for (let i = 0; i < Math.round(0.4 / stepSeconds); i++) {
        const rates = Array.from(lattice.restM, (_, s) => -tensionN(lattice, s) * lengthRateMps(lattice, s))
        work += rates.reduce((a, b) => a + b, 0) * stepSeconds
        turnedOver += rates.reduce((a, b) => a + Math.abs(b), 0) * stepSeconds
        work += fillPower(lattice) * stepSeconds
        advance(lattice, 1)
      }
      return (stored() - start - work) / turnedOver
    }
    for (const seed of [1, 2, 3]) {
      const [whole, half] = [residual(seed, 2e-4), residual(seed, 1e-4)]
      expect(Math.abs(whole)).toBeLessThan(0.03)
      expect(Math.abs(orderOf(whole, half) - 1)).toBeLessThan(0.05)
    }
  })
})

/** Power that areas and volumes give to the nodes, W. */
function fillPower(lattice: Lattice): number {
  const bare: Lattice = { ...lattice, passiveCount: 0, activeCount: 0, guidedCount: 0 }
  addForces(bare)
  let sum = 0
  for (let o = 0; o < lattice.nodes.length; o += lattice.stride) {
    for (let axis = 0; axis < lattice.dimensions; axis++) {
      const at = o + 2 * lattice.dimensions + axis
      sum += lattice.nodes[at]! * lattice.nodes[o + lattice.dimensions + axis]!
      lattice.nodes[at] = 0
    }
  }
  return sum
}

/** Positions and velocities, node after node. */
function stateOf({ nodes, stride }: Lattice): number[] {
  return Array.from(nodes).filter((_, i) => i % stride < (2 * stride) / 3)
}

function expectImage(
  spec: LatticeSpec,
  image: LatticeSpec,
  turn: (v: readonly number[]) => readonly number[],
): void {
  const [one, other] = [buildLattice(spec), buildLattice(image)]
  advance(one, 2_000)
  advance(other, 2_000)
  const d = one.dimensions
  const [a, b] = [stateOf(one), stateOf(other)]
  for (let i = 0; i < a.length; i += d) {
    // + 0: -0 and 0 are one place.
    expect(b.slice(i, i + d).map((v) => v + 0)).toEqual(turn(a.slice(i, i + d)).map((v) => v + 0))
  }
}

describe('symmetry, to the bit', () => {
  const mirror = (axis: number) => (v: readonly number[]) =>
    v.map((value, i) => (i === axis ? -value : value))

  test.each([
    [2, 0],
    [2, 1],
    [3, 0],
    [3, 1],
    [3, 2],
  ] as const)('in %d dimensions, mirrored along axis %d', (d, axis) => {
    fc.assert(
      fc.property(seeds, (seed) => {
        // The sum over the corners of a tetrahedron has an order, so volumes have a test of their own.
        const body = { ...randomBody(seed, { dimensions: d, isAlive: true }), volumes: [] }
        expectImage(body, imageOf(body, mirror(axis), mirror(axis), true), mirror(axis))
      }),
      runs(10),
    )
  })

  test('mirrored with volumes: to 1e-12', () => {
    fc.assert(
      fc.property(seeds, (seed) => {
        const body = randomBody(seed, { dimensions: 3, isAlive: true })
        const [one, other] = [body, imageOf(body, mirror(2), mirror(2), true)].map((spec) =>
          buildLattice(spec),
        )
        advance(one!, 1_000)
        advance(other!, 1_000)
        const truth = stateOf(one!).map((value, i) => (i % 3 === 2 ? -value : value))
        for (const [i, value] of stateOf(other!).entries())
          expect(Math.abs(value - truth[i]!)).toBeLessThan(1e-12)
      }),
      runs(10),
    )
  })

  test('turned by 90 degrees in the plane', () => {
    const quarter = ([x, y]: readonly number[]) => [-y!, x!]
    fc.assert(
      fc.property(seeds, (seed) => {
        const body = randomBody(seed, { dimensions: 2, isAlive: true })
        expectImage(body, imageOf(body, quarter, quarter, false), quarter)
      }),
      runs(10),
    )
  })

  test.each(dimensions)('a crawl on flat ground with directional feet, mirrored, in %d dimensions', (d) => {
    const across = d === 2 ? [0] : [0, 2]
    fc.assert(
      fc.property(seeds, (seed) => {
        const body = { ...randomBody(seed, { dimensions: d, isAlive: true }), volumes: [] }
        const foot = { forward: 0.3, backward: 0.9, sideways: 0.5 }
        const walking: LatticeSpec = {
          ...body,
          nodes: body.nodes.map((n, i) => ({
            ...n,
            velocityMps: n.positionM.map(() => 0),
            friction: foot,
            // Without a heading forwards is +x, which a mirror turns round.
            ...(d === 3 ? { headingNode: (i + 1) % body.nodes.length } : {}),
          })),
          gravityMps2: d === 2 ? [0, -9.81] : [0, -9.81, 0],
          ground: { firstXM: -2, spacingM: 4, heightsM: [0, 0] },
          contact: { stiffness: 2000, damping: 2000, exponent: 1, depthLimitM: 0.02 },
        }
        for (const axis of across) {
          const image = imageOf(walking, mirror(axis), mirror(axis), true)
          const swapped = image.nodes.map((n) => ({ ...n, friction: { forward: 0.9, backward: 0.3 } }))
          expectImage(walking, d === 2 ? { ...image, nodes: swapped } : image, mirror(axis))
        }
      }),
      runs(8),
    )
  })
})

describe.each(dimensions)('elsewhere, in %d dimensions', (d) => {
  test('a body moved away does the same, up to rounding', () => {
    fc.assert(
      fc.property(seeds, (seed) => {
        const body = randomBody(seed, { dimensions: d, isAlive: true })
        const moved = imageOf(
          body,
          (v) => v.map((value, i) => value + [3, -2, 5][i]!),
          (v) => v,
          false,
        )
        const [one, other] = [buildLattice(body), buildLattice(moved)]
        advance(one, 500)
        advance(other, 500)
        for (let o = 0; o < one.nodes.length; o += one.stride) {
          for (let axis = 0; axis < d; axis++) {
            const shift = other.nodes[o + axis]! - one.nodes[o + axis]!
            expect(Math.abs(shift - [3, -2, 5][axis]!)).toBeLessThan(1e-11)
          }
        }
      }),
      runs(10),
    )
  })

  test('a body turned by any angle does the same, up to rounding', () => {
    fc.assert(
      fc.property(seeds, (seed) => {
        const angle = 1 + (seed % 1000) / 300
        const [s, c] = [Math.sin(angle), Math.cos(angle)]
        const turn = ([x, y, z]: readonly number[]) => {
          return d === 2 ? [c * x! - s * y!, s * x! + c * y!] : [c * x! - s * z!, y!, s * x! + c * z!]
        }
        const body = randomBody(seed, { dimensions: d, isAlive: true })
        const [one, other] = [buildLattice(body), buildLattice(imageOf(body, turn, turn, false))]
        advance(one, 500)
        advance(other, 500)
        for (let o = 0; o < one.nodes.length; o += one.stride) {
          const truth = turn(Array.from(one.nodes.slice(o, o + d)))
          for (let axis = 0; axis < d; axis++) {
            expect(Math.abs(other.nodes[o + axis]! - truth[axis]!)).toBeLessThan(1e-11)
          }
        }
      }),
      runs(10),
    )
  })
})
