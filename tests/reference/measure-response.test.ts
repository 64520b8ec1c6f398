// Steady answers in the frequency domain against closed forms. Transmissibility: Ogata, System dynamics, 2004, eq. 9-14 (as
// cited by others), Den Hartog, Mechanical vibrations, 1956 (from memory); chains: Kittel, Introduction to solid state
// physics, and Brillouin, Wave propagation in periodic structures, 1946 (both from memory). All numbers were recomputed
// independently of this code.

import { describe, expect, test } from 'vitest'
import { Refusal } from '../../shared/refusals.js'
import type { LatticeSpec, NodeSpec, StrutSpec } from '../../sim/lattice/spec.js'
import { linearModel } from '../../sim/measure/linear-model.js'
import { amplitudeOf, harmonicResponse, phaseTurnsOf } from '../../sim/measure/response.js'

const turn = 2 * Math.PI
const near = (value: number | undefined, truth: number, within = 1e-10) =>
  expect(Math.abs(value! - truth)).toBeLessThan(within * Math.max(1, Math.abs(truth)))
const strut = (a: number, b: number, stiffnessNpm = 1, dampingNspm = 0): StrutSpec => {
  return { a, b, stiffnessNpm, dampingNspm }
}
const still = { gravityMps2: [0, 0], stepSeconds: 'auto' } as const

describe('steady answers in the frequency domain', () => {
  /** Base (prescribed, node 0), then masses along x; springs as given; motion along x only. */
  const driven = (masses: readonly number[], springs: readonly (readonly [number, number])[]) => {
    const nodes: NodeSpec[] = [1, ...masses].map((massKg, i) => ({ positionM: [i, 0], massKg }))
    const struts = springs.map(([k, c], i) => strut(i, i + 1, k, c))
    const spec: LatticeSpec = {
      ...still,
      nodes,
      struts,
      groups: [{ frequencyHz: 1 }],
      prescribed: [{ node: 0, group: 0, amplitudeM: [1, 0], phaseTurns: 0 }],
    }
    const model = linearModel(spec)
    return { ...model, free: model.free.filter((coordinate) => coordinate % 2 === 0) }
  }
  const base = { motionM: [1] }
  const endOf = (model: ReturnType<typeof driven>) => model.size - 2

  // r, then T for zeta = 0.01, 0.05, 0.1, 0.2, 0.5, 1.
  test.each([
    [0.1, 1.010100969, 1.010099985, 1.01009691, 1.010084629, 1.009999495, 1.009706834],
    [0.5, 1.33328149, 1.332042148, 1.328228949, 1.313826883, 1.240347346, 1.13137085],
    [0.8, 2.775393533, 2.720294102, 2.570651167, 2.17984498, 1.459786673, 1.150485504],
    [0.9, 5.240545858, 4.775739975, 3.882207213, 2.610965225, 1.462609668, 1.13763869],
    [1, 50.009999, 10.049875621, 5.099019514, 2.692582404, Math.SQRT2, 1.118033989],
    [1.2, 2.270007361, 2.208375665, 2.051875016, 1.703492528, 1.222143074, 1.06557377],
    [Math.SQRT2, 1, 1, 1, 1, 1, 1],
    [1.5, 0.800129515, 0.803187656, 0.812161718, 0.841078013, 0.923287071, 0.973008511],
    [2, 0.333570244, 0.339181733, 0.355861707, 0.412461491, 0.620173673, 0.824621125],
    [3, 0.125221276, 0.130412168, 0.14536553, 0.193095996, 0.370116605, 0.608276253],
    [5, 0.041874118, 0.046574643, 0.058874481, 0.092847669, 0.207993344, 0.386533678],
    [10, 0.010301029, 0.014284257, 0.022581938, 0.041613579, 0.10099995, 0.198267172],
  ])('base motion at r = %d is transmitted as the table says', (r, ...truths) => {
    for (const [i, zeta] of [0.01, 0.05, 0.1, 0.2, 0.5, 1].entries()) {
      const model = driven([1], [[100, 20 * zeta]])
      const value = amplitudeOf(harmonicResponse(model, (10 * r) / turn, base), endOf(model))
      // The table has nine decimals.
      expect(Math.abs(value - truths[i]!)).toBeLessThan(6e-10)
    }
  })

  // The same without damping: 1 / |1 - r^2|; at r = 1 it is refused (below).
  test.each([
    [0.1, 1.01010101],
    [0.5, 1.333333333],
    [0.8, 2.777777778],
    [0.9, 5.263157895],
    [1.2, 2.272727273],
    [Math.SQRT2, 1],
    [1.5, 0.8],
    [2, 0.333333333],
    [3, 0.125],
    [5, 0.041666667],
    [10, 0.01010101],
  ])('base motion at r = %d, undamped, is transmitted by %d', (r, truth) => {
    const model = driven([1], [[100, 0]])
    const value = amplitudeOf(harmonicResponse(model, (10 * r) / turn, base), endOf(model))
    expect(Math.abs(value - truth)).toBeLessThan(6e-10)
  })

  test.each([
    [0.05, 0.997521620628, 10.062213725341],
    [0.1, 0.990334344317, 5.122773579639],
    [0.2, 0.964729655485, 2.733921110726],
    [0.5, 0.855599677167, 1.467889825014],
  ])('zeta %d: the peak lies at r = %d and is %d', (zeta, r, peak) => {
    const model = driven([1], [[100, 20 * zeta]])
    const at = (ratio: number) =>
      amplitudeOf(harmonicResponse(model, (10 * ratio) / turn, base), endOf(model))
    near(at(r), peak)
    expect(at(r * 0.999)).toBeLessThan(peak)
    expect(at(r * 1.001)).toBeLessThan(peak)
  })

  test.each([
    [0.01, 0.333303708],
    [0.05, 0.332595053],
    [0.1, 0.3304093],
    [0.2, 0.322078313],
  ])('a force at zeta %d: 1/(2 zeta) and a quarter turn late at r = 1, %d at r = 2', (zeta, atTwo) => {
    const model = driven([1], [[100, 20 * zeta]])
    const push = { forceN: [0, 0, 100, 0] }
    const resonant = harmonicResponse(model, 10 / turn, push)
    near(amplitudeOf(resonant, 2), 1 / (2 * zeta))
    near(phaseTurnsOf(resonant, 2), -0.25)
    expect(Math.abs(amplitudeOf(harmonicResponse(model, 20 / turn, push), 2) - atTwo)).toBeLessThan(6e-10)
    const peakAt = Math.sqrt(1 - 2 * zeta * zeta)
    const peak = amplitudeOf(harmonicResponse(model, (10 * peakAt) / turn, push), 2)
    near(peak, 1 / (2 * zeta * Math.sqrt(1 - zeta * zeta)))
  })

  test.each([
    [0.1, 0.989949493661, 5.025189076296],
    [0.2, 0.959166304663, 2.551551815399],
  ])('a force at zeta %d: the peak lies at r = %d and is %d', (zeta, r, peak) => {
    const model = driven([1], [[100, 20 * zeta]])
    const at = (ratio: number) =>
      amplitudeOf(harmonicResponse(model, (10 * ratio) / turn, { forceN: [0, 0, 100, 0] }), 2)
    near(at(r), peak)
    for (const beside of [0.999, 1.001]) expect(at(r * beside)).toBeLessThan(peak)
  })

  test('a finite chain driven at its base, far end free', () => {
    const chain = (n: number, w: number) => {
      const model = driven(new Array<number>(n).fill(1), new Array<[number, number]>(n).fill([1, 0]))
      return harmonicResponse(model, w / turn, base).real[endOf(model)]!
    }
    near(chain(5, 0.7), -1.33317791163)
    near(chain(10, 1.3), -1.149731485727)
    expect(Math.abs(chain(10, 2.2) / 8.254969952274e-5 - 1)).toBeLessThan(1e-10)
  })

  test.each([
    [1.1, 0.41183334711],
    [1.25, 0.25],
    [1.5, 0.14589803375],
    [2, 0.071796769724],
  ])('above the cut-off by %d the motion falls to %d a mass, in alternation', (ratio, factor) => {
    // Long enough that the far end is not felt by the first masses.
    const n = 60
    const model = driven(new Array<number>(n).fill(1), new Array<[number, number]>(n).fill([1, 0]))
    const { real } = harmonicResponse(model, (2 * ratio) / turn, base)
    near(real[2]! / real[0]!, -factor)
    near(real[4]! / real[2]!, -factor)
  })

  describe('the gap of a two-mass chain, 1 and 2 kg', () => {
    /** The base moves the first light mass through a spring; a heavy one ends the chain. */
    const ends = (w: number, cells: number, c = 0) => {
      const masses = Array.from({ length: 2 * cells }, (_, i) => (i % 2 === 0 ? 1 : 2))
      const model = driven(
        masses,
        masses.map((): [number, number] => [1, c]),
      )
      return amplitudeOf(harmonicResponse(model, w / turn, base), endOf(model))
    }

    test.each([
      [1.2, 4, 0.06116141424496],
      [1.2, 8, 3.896358264068e-3],
      [1.2, 16, 1.581840602811e-5],
      [1.3, 4, 0.08668823124],
      [1.3, 8, 6.628450044e-3],
    ])('w = %d, %d cells: %d of the base arrives', (w, cells, truth) => {
      expect(Math.abs(ends(w, cells) / truth - 1)).toBeLessThan(1e-9)
    })

    test.each([
      [1.2, 0.502415484, -5.97874],
      [1.3, 0.525747975, undefined],
    ])('w = %d: each cell passes on %d of the motion, %s dB', (w, factor, decibels) => {
      // e^-arcosh |cos qa|, cos qa = 1 - (2 C (m1 + m2) w^2 - m1 m2 w^4) / (2 C^2). A chain so long that its end is not felt.
      const masses = Array.from({ length: 60 }, (_, i) => (i % 2 === 0 ? 1 : 2))
      const model = driven(
        masses,
        masses.map((): [number, number] => [1, 0]),
      )
      const { real } = harmonicResponse(model, w / turn, base)
      const found = Math.abs(real[2 * 3]! / real[2 * 1]!)
      near(found, Math.exp(-Math.acosh(Math.abs(1 - (6 * w * w - 2 * w ** 4) / 2))))
      expect(Math.abs(found - factor)).toBeLessThan(1e-9)
      if (decibels) expect(Math.abs(20 * Math.log10(found) - decibels)).toBeLessThan(1e-6)
    })

    test.each([
      [4, -24.27045],
      [8, -48.186822],
      [16, -96.016746],
    ])('w = 1.2, %d cells: %d dB', (cells, decibels) => {
      expect(Math.abs(20 * Math.log10(ends(1.2, cells)) - decibels)).toBeLessThan(1e-6)
    })

    test('dashpots of c = 2 zeta change it a little', () => {
      const plain = ends(1.2, 4)
      expect(ends(1.2, 4, 0.002) / plain - 1).toBeCloseTo(-6e-5, 5)
      expect(ends(1.2, 4, 0.02) / plain - 1).toBeCloseTo(-0.006, 4)
      expect(ends(1.2, 4, 0.1) / plain - 1).toBeCloseTo(-0.13, 2)
    })
  })

  test('an undamped resonance is refused', () => {
    // m = k = 1: w = 1 exactly in binary.
    const model = driven([1], [[4 * Math.PI * Math.PI, 0]])
    expect(() => harmonicResponse(model, 1, base)).toThrow(Refusal)
  })
})
