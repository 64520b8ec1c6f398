// Promises of the frameworks: sound descriptions only, forces that are the slope of nothing but energy, no force from
// rigid motion, solvers that agree with plain algebra, the same bits twice. Published values: tests/reference.

import { describe, expect, test } from 'vitest'
import { type Stream, stream } from '../../shared/streams.js'
import { condense } from '../measure/condense.js'
import { addInto, assemble } from './assemble.js'
import { buildFramework } from './build.js'
import { envelope, factorise, solveFactorised } from './envelope.js'
import { equilibrate, situationOf } from './equilibrium.js'
import { homogenise } from './homogenise.js'
import { consistentMass, geometricStiffness, lumpedMass, stiffnessMatrix } from './matrices.js'
import { moduliOf, turned } from './moduli.js'
import { inPieces } from './pieces.js'
import type { FrameworkSpec } from './spec.js'
import { squeeze } from './squeeze.js'

const draws = (number: number) => stream(20_261_201, 'spare', 5, number)

/** A welded periodic cell with a pin-jointed bar, a hinge and a bar that shears. */
function sample(draw: Stream): FrameworkSpec {
  const jitter = () => 0.1 * (draw.uniform() - 0.5)
  const wall = { axialN: 5, bendingNm2: 0.05 }
  return {
    nodes: [
      [jitter(), jitter()],
      [0.5 + jitter(), jitter()],
      [0.25 + jitter(), 0.5 + jitter()],
    ],
    periods: [
      [1, 0.05],
      [0.1, 0.9],
    ],
    bars: [
      { a: 0, b: 1, ...wall },
      { a: 1, b: 0, shift: [1, 0], ...wall, shearN: 0.7 },
      { a: 0, b: 2, ...wall, turnA: 1 },
      { a: 1, b: 2, ...wall },
      { a: 2, b: 0, shift: [0, 1], ...wall },
      { a: 2, b: 1, shift: [-1, 1], axialN: 2 },
      { a: 2, b: 2, shift: [1, 0], ...wall },
    ],
    hinges: [{ node: 0, turns: [0, 1], stiffnessNmprad: 0.03 }],
  }
}

describe('descriptions', () => {
  const good = sample(draws(0))
  test.each([
    [{ ...good, bars: [] }, 'bars'],
    [{ ...good, bars: [{ a: 0, b: 7, axialN: 1 }] }, 'bars[0].b'],
    [{ ...good, bars: [{ a: 0, b: 0, axialN: 1 }] }, 'bars[0]'],
    [{ ...good, bars: [{ a: 0, b: 1, axialN: -1 }] }, 'bars[0].axialN'],
    [{ ...good, bars: [{ a: 0, b: 1, axialN: Number.NaN }] }, 'bars[0].axialN'],
    [{ ...good, bars: [{ a: 0, b: 1, axialN: 1, bendingNm2: -1 }] }, 'bars[0].bendingNm2'],
    [{ ...good, bars: [{ a: 0, b: 1, axialN: 1, bendingNm2: 1, shearN: 0 }] }, 'bars[0].shearN'],
    [{ ...good, nodes: [[0, Number.NaN]] }, 'nodes[0]'],
    [{ ...good, hinges: [{ node: 9, turns: [0, 1], stiffnessNmprad: 1 }] }, 'hinges[0].node'],
    [
      {
        ...good,
        periods: [
          [1, 0],
          [2, 0],
        ],
      },
      'periods',
    ],
    [{ nodes: good.nodes, bars: [{ a: 0, b: 1, shift: [1, 0], axialN: 1 }] }, 'bars[0].shift'],
  ] as const)('number %# is refused, naming the field', (spec, field) => {
    const refusal = expect.objectContaining({
      code: 'impossible-value',
      where: { field: `framework.${field}` },
    })
    expect(() => buildFramework(spec as FrameworkSpec)).toThrow(refusal)
  })
})

describe('forces and tangent', () => {
  test('the tangent is the derivative of the forces, and symmetric, at large displacements', () => {
    for (let round = 0; round < 5; round++) {
      const draw = draws(10 + round)
      const framework = buildFramework(sample(draw))
      const n = framework.unknownCount
      const u = Float64Array.from({ length: n }, () => 0.4 * (draw.uniform() - 0.5))
      const tangent = new Float64Array(n * n)
      assemble(framework, u, new Float64Array(n), addInto(tangent, n))
      const forces = (at: number, by: number) => {
        const moved = Float64Array.from(u)
        moved[at] = moved[at]! + by
        const f = new Float64Array(n)
        assemble(framework, moved, f)
        return f
      }
      for (let j = 0; j < n; j++) {
        const [plus, minus] = [forces(j, 1e-6), forces(j, -1e-6)]
        for (let i = 0; i < n; i++) {
          expect(Math.abs((plus[i]! - minus[i]!) / 2e-6 - tangent[i * n + j]!)).toBeLessThan(1e-6)
          expect(Math.abs(tangent[i * n + j]! - tangent[j * n + i]!)).toBeLessThan(1e-12)
        }
      }
    }
  })

  test('a framework that is turned and moved as a whole feels nothing', () => {
    const { periods: _, ...finite } = sample(draws(1))
    const bars = finite.bars.map(({ shift: __, ...bar }) => bar).filter(({ a, b }) => a !== b)
    const framework = buildFramework({ ...finite, bars })
    const u = new Float64Array(framework.unknownCount)
    const angle = 1.1
    for (const [node, [x, y]] of finite.nodes.entries()) {
      const at = framework.nodeUnknown[node]!
      u[at] = Math.cos(angle) * x - Math.sin(angle) * y - x + 0.3
      u[at + 1] = Math.sin(angle) * x + Math.cos(angle) * y - y - 0.7
      for (const turn of [0, 1]) {
        const unknown = framework.turnOf(node, turn)
        if (unknown >= 0) u[unknown] = angle
      }
    }
    const forces = new Float64Array(u.length)
    assemble(framework, u, forces)
    for (const force of forces) expect(Math.abs(force)).toBeLessThan(1e-12)
  })

  test('forces balance: nothing is left over along x, along y', () => {
    const framework = buildFramework(sample(draws(2)))
    const draw = draws(3)
    const u = Float64Array.from({ length: framework.unknownCount }, () => 0.2 * draw.uniform())
    const forces = new Float64Array(u.length)
    assemble(framework, u, forces)
    for (const axis of [0, 1]) {
      const sum = Array.from(framework.nodeUnknown).reduce((total, at) => total + forces[at + axis]!, 0)
      expect(Math.abs(sum)).toBeLessThan(1e-12)
    }
  })
})

describe('solvers', () => {
  /** A random symmetric matrix with a band, positive definite when `shift` is large. */
  function random(draw: Stream, size: number, shift: number) {
    const first = Int32Array.from({ length: size }, (_, i) => Math.max(0, i - 1 - draw.below(4)))
    const matrix = envelope(first)
    const full = new Float64Array(size * size)
    for (let i = 0; i < size; i++) {
      for (let j = first[i]!; j <= i; j++) {
        const value = draw.uniform() - 0.5 + (i === j ? shift : 0)
        matrix.values[matrix.base[i]! + j] = value
        full[i * size + j] = full[j * size + i] = value
      }
    }
    return { matrix, full }
  }

  test('an envelope solves what the full matrix says', () => {
    for (let round = 0; round < 20; round++) {
      const draw = draws(100 + round)
      const size = 3 + draw.below(20)
      const { matrix, full } = random(draw, size, 5)
      const x = Float64Array.from({ length: size }, () => draw.normal())
      const right = Float64Array.from({ length: size }, (_, i) => {
        return x.reduce((sum, value, j) => sum + full[i * size + j]! * value, 0)
      })
      expect(factorise(matrix)).toEqual({ negative: 0, lost: -1 })
      solveFactorised(matrix, right)
      for (const [i, value] of right.entries()) expect(Math.abs(value - x[i]!)).toBeLessThan(1e-12 * size)
    }
  })

  test('negative pivots count what is unstable, a lost pivot is said', () => {
    const diagonal = (values: readonly number[]) => {
      const matrix = envelope(Int32Array.from(values, (_, i) => i))
      matrix.values.set(values)
      return factorise(matrix)
    }
    expect(diagonal([1, -2, 3, -4])).toEqual({ negative: 2, lost: -1 })
    expect(diagonal([1, 0, 3])).toEqual({ negative: 0, lost: 1 })
    expect(diagonal([1, Number.NaN])).toEqual({ negative: 0, lost: 1 })
  })

  test('condensation leaves the Schur complement and counts what nothing holds', () => {
    // Two springs in a row and a free unknown: eliminate the middle one, keep the ends. k1 k2 / (k1 + k2) = 2/3.
    const matrix = Float64Array.from(
      [
        [3, 0, -1, -2],
        [0, 0, 0, 0],
        [-1, 0, 1, 0],
        [-2, 0, 0, 2],
      ].flat(),
    )
    const { kept, mechanisms } = condense(matrix, 4, 2)
    expect(mechanisms).toBe(1)
    for (const [i, value] of [2 / 3, -2 / 3, -2 / 3, 2 / 3].entries()) expect(kept[i]).toBeCloseTo(value, 12)
  })

  test('a framework that can move freely is not solved', () => {
    const framework = buildFramework({
      nodes: [
        [0, 0],
        [1, 0],
      ],
      bars: [{ a: 0, b: 1, axialN: 1 }],
    })
    const situation = situationOf(framework, [0, 1])
    situation.loads[3] = 1
    expect(equilibrate(situation)).toEqual({ reason: 'the framework has lost its stiffness' })
    expect(Array.from(situation.u)).toEqual([0, 0, 0, 0])
  })
})

describe('homogenisation and squeezing', () => {
  test('the first step of a small squeeze has the modulus and ratio of small strain, along both axes', () => {
    const spec = sample(draws(4))
    const moduli = moduliOf(homogenise(spec).stiffness)
    for (const [axis, e, nu] of [
      [0, moduli.e1, moduli.nu12],
      [1, moduli.e2, moduli.nu21],
    ] as const) {
      const end = squeeze(buildFramework(spec), { axis, strain: -1e-6, steps: 1 })
      if ('reason' in end) throw new Error(end.reason)
      expect(-end.across / end.along).toBeCloseTo(nu, 4)
      expect(end.stress / end.along / e).toBeCloseTo(1, 4)
    }
  })

  test('bars in pieces have the same moduli, and the same frameworks give the same bits', () => {
    const spec = sample(draws(6))
    const one = homogenise(spec).stiffness
    const three = homogenise(inPieces(spec, 3)).stiffness
    for (const key of ['c11', 'c22', 'c12', 'c66', 'c16', 'c26'] as const) {
      expect(Math.abs(three[key] - one[key])).toBeLessThan(1e-10 * one.c11)
    }
    expect(homogenise(spec).stiffness).toEqual(one)
  })

  test('a turned cell has the turned stiffness', () => {
    const spec = sample(draws(7))
    const angle = 0.7
    const turn = ([x, y]: readonly [number, number]) =>
      [Math.cos(angle) * x + Math.sin(angle) * y, -Math.sin(angle) * x + Math.cos(angle) * y] as const
    const moved = {
      ...spec,
      nodes: spec.nodes.map(turn),
      periods: [turn(spec.periods![0]), turn(spec.periods![1])] as const,
    }
    const there = turned(homogenise(spec).stiffness, angle)
    const here = homogenise(moved).stiffness
    for (const key of ['c11', 'c22', 'c12', 'c66', 'c16', 'c26'] as const) {
      expect(Math.abs(there[key] - here[key])).toBeLessThan(1e-10 * here.c11)
    }
  })

  test('stability is watched on request', () => {
    // A slender upright wall pressed along its length buckles in its cell.
    const spec: FrameworkSpec = inPieces(
      {
        nodes: [[0, 0]],
        periods: [
          [1, 0],
          [0, 1],
        ],
        bars: [
          { a: 0, b: 0, shift: [0, 1], axialN: 1, bendingNm2: 1e-4 },
          { a: 0, b: 0, shift: [1, 0], axialN: 1, bendingNm2: 1e-4 },
        ],
      },
      8,
    )
    const end = squeeze(buildFramework(spec), { axis: 1, strain: -0.02, steps: 8, stableOnly: true })
    expect(end).toMatchObject({ reason: 'the framework snaps through' })
    // Sway of a wall between turning-stiff joints at pi^2 EI / L^2 at most: strain 1e-3.
    expect(-end.along).toBeLessThan(0.0051)
  })

  test('between plates that hold the mean shear, leaning is still seen', () => {
    // An upright wall between soft crossbars: the cell has next to no stiffness against shear, and leans before it bows.
    const spec: FrameworkSpec = {
      nodes: [[0, 0]],
      periods: [
        [1, 0],
        [0, 1],
      ],
      bars: [
        { a: 0, b: 0, shift: [0, 1], axialN: 1, bendingNm2: 1e-3 },
        { a: 0, b: 0, shift: [1, 0], axialN: 1, bendingNm2: 1e-5 },
      ],
    }
    const options = { axis: 1, strain: -0.02, steps: 40, holdShear: true } as const
    const watched = squeeze(buildFramework(spec), { ...options, stableOnly: true })
    expect(watched).toMatchObject({ reason: 'rows of cells lean over' })
    // It leans when the thrust 1 e reaches the shear stiffness of the welded cross, 12 EI EI' / (EI + EI') at most.
    expect(-watched.along).toBeLessThan(1.3e-4 + 0.02 / 40)
    const held = squeeze(buildFramework(spec), options)
    expect(held).toMatchObject({ unstable: 0 })
  })
})

describe('matrices', () => {
  const { periods: _, ...open } = sample(draws(8))
  const bars = open.bars
    .map(({ shift: __, ...bar }) => ({ ...bar, massKgpm: 3 }))
    .filter(({ a, b }) => a !== b)
  const framework = buildFramework({ ...open, bars })
  const n = framework.unknownCount
  const along = (axis: number) => {
    const v = new Float64Array(n)
    for (const at of framework.nodeUnknown) v[at + axis] = 1
    return v
  }
  const product = (a: Float64Array, matrix: Float64Array, b: Float64Array) =>
    a.reduce((sum, x, i) => sum + x * b.reduce((row, y, j) => row + matrix[i * n + j]! * y, 0), 0)

  test('a shift of the whole has all the mass, along x and along y', () => {
    const massKg = framework.bars.reduce((sum, bar) => sum + 3 * bar.lengthM, 0)
    for (const axis of [0, 1]) {
      for (const mass of [consistentMass(framework), lumpedMass(framework)]) {
        expect(product(along(axis), mass, along(axis))).toBeCloseTo(massKg, 12)
        expect(product(along(axis), mass, along(1 - axis))).toBeCloseTo(0, 12)
      }
    }
  })

  test('a shift of the whole meets no stiffness, neither elastic nor geometric', () => {
    for (const axis of [0, 1]) {
      expect(product(along(axis), stiffnessMatrix(framework), along(axis))).toBeCloseTo(0, 12)
      expect(
        product(
          along(axis),
          geometricStiffness(framework, () => [1, 2]),
          along(axis),
        ),
      ).toBeCloseTo(0, 12)
    }
  })
})
