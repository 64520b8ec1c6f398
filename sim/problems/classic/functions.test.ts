// Closed-form values of the classic functions.

import { describe, expect, test } from 'vitest'
import {
  dtlz1,
  dtlz2,
  leadingOnes,
  onemax,
  rastrigin,
  rosenbrock,
  sphere,
  zdt1,
  zdt2,
  zdt3,
  zdt4,
  zdt6,
} from './functions.js'

const on = (first: number, n: number) => [first, ...new Array<number>(n - 1).fill(0)]

describe('one objective', () => {
  test('optima are where the definitions put them', () => {
    expect(onemax([1, 0, 1, 1])).toBe(3)
    expect(leadingOnes([1, 1, 0, 1])).toBe(2)
    expect(leadingOnes([1, 1])).toBe(2)
    expect(sphere([3, -4])).toBe(25)
    expect(rastrigin([0, 0, 0])).toBe(0)
    expect(rosenbrock([1, 1, 1, 1])).toBe(0)
  })

  test('values away from the optimum', () => {
    // Definition, by hand: whole numbers give cos = 1; half numbers give cos = -1.
    expect(rastrigin([1, -2])).toBeCloseTo(5, 12)
    expect(rastrigin([0.5])).toBeCloseTo(20.25, 12)
    // The usual start of the 2-D function (Rosenbrock 1960, from memory): f(-1.2, 1) = 24.2.
    expect(rosenbrock([-1.2, 1])).toBeCloseTo(24.2, 12)
  })
})

describe('fronts in closed form', () => {
  // Zitzler, Deb, Thiele, 2000: g = 1 at x_2 .. x_n = 0.
  test('zdt1, zdt2 and zdt4 on their fronts', () => {
    for (const f1 of [0, 0.25, 1]) {
      expect(zdt1(on(f1, 30))[1]).toBeCloseTo(1 - Math.sqrt(f1), 14)
      expect(zdt2(on(f1, 30))[1]).toBeCloseTo(1 - f1 * f1, 14)
      expect(zdt4(on(f1, 10))[1]).toBeCloseTo(1 - Math.sqrt(f1), 14)
    }
  })

  test('zdt3 at the ends of its five segments', () => {
    // Recomputed independently with high-precision arithmetic from the definition.
    const ends = [
      [0.08300153492691163, 0.6696523565498149],
      [0.2577623633878302, 0.2421610854767787],
      [0.4538821040888302, -0.12421844474858552],
      [0.6525117038046625, -0.4582633256726058],
      [0.8518328654364139, -0.7733690123266405],
    ] as const
    // Where a segment ends, f2 has a minimum; the next segment starts where f2 falls below it.
    const starts = [0.18222872802939977, 0.4093136748086568, 0.6183967944392658, 0.8233317983266327]
    for (const [i, [f1, f2]] of ends.entries()) {
      expect(zdt3(on(f1, 30))[1]).toBeCloseTo(f2, 13)
      if (i < starts.length) expect(zdt3(on(starts[i]!, 30))[1]).toBeCloseTo(f2, 13)
    }
  })

  test('zdt6 has its smallest f1 where the derivative vanishes', () => {
    // Recomputed: x_1 = atan(9 pi) / (6 pi).
    expect(zdt6(on(0.08145779687998356, 10))[0]).toBeCloseTo(0.2807753188153697, 14)
  })

  test('dtlz1 lies on the plane, dtlz2 on the sphere, for 2 to 5 objectives', () => {
    // Deb, Thiele, Laumanns, Zitzler, 2005: x_M .. x_n = 0.5 is on the front.
    for (let m = 2; m <= 5; m++) {
      const x = Array.from({ length: m + 6 }, (_, i) => (i < m - 1 ? 0.1 + 0.17 * i : 0.5))
      expect(dtlz1(x, m).reduce((a, b) => a + b)).toBeCloseTo(0.5, 12)
      expect(dtlz2(x, m).reduce((a, b) => a + b * b, 0)).toBeCloseTo(1, 14)
    }
  })

  test('g grows off the front', () => {
    expect(zdt1([0.5, 1, 1])[1]).toBeCloseTo(10 * (1 - Math.sqrt(0.05)), 12)
    expect(dtlz2([0, 0, 1, 1], 3).reduce((a, b) => a + b * b, 0)).toBeCloseTo(2.25, 12)
    // g = 100 (k + k ((1/2)^2 - cos 10 pi)) = 100 (2 + 2 (0.25 - 1)) = 50.
    expect(dtlz1([0, 0, 1, 1], 3).reduce((a, b) => a + b)).toBeCloseTo(0.5 * 51, 9)
  })
})
