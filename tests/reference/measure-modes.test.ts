// Natural frequencies and mechanisms against closed forms. Chains: Kittel, Introduction to solid state physics, and
// Brillouin, Wave propagation in periodic structures, 1946 (both from memory). All numbers were recomputed independently
// of this code. Closed forms hold to 1e-10.

import { Matrix, SingularValueDecomposition } from 'ml-matrix'
import { describe, expect, test } from 'vitest'
import type { LatticeSpec, NodeSpec, StrutSpec } from '../../sim/lattice/spec.js'
import { linearModel } from '../../sim/measure/linear-model.js'
import { naturalModes } from '../../sim/measure/modes.js'

const turn = 2 * Math.PI
const near = (value: number | undefined, truth: number, within = 1e-10) =>
  expect(Math.abs(value! - truth)).toBeLessThan(within * Math.max(1, Math.abs(truth)))
const strut = (a: number, b: number, stiffnessNpm = 1, dampingNspm = 0): StrutSpec => {
  return { a, b, stiffnessNpm, dampingNspm }
}
const still = { gravityMps2: [0, 0], stepSeconds: 'auto' } as const

/** Masses in a row along x; nothing resists their motion across it. */
function row(
  masses: readonly number[],
  springs: readonly StrutSpec[],
  pinned: readonly number[],
): LatticeSpec {
  const nodes = masses.map((massKg, i) => ({ positionM: [i, 0], massKg, pinned: pinned.includes(i) }))
  return { ...still, nodes, struts: springs }
}

describe('chains of n equal masses', () => {
  const chain = (n: number, ends: 'fixed-fixed' | 'fixed-free' | 'free-free') => {
    const before = ends === 'free-free' ? 0 : 1
    const after = ends === 'fixed-fixed' ? 1 : 0
    const total = n + before + after
    const springs = Array.from({ length: total - 1 }, (_, i) => strut(i, i + 1))
    const pinned = [...(before ? [0] : []), ...(after ? [total - 1] : [])]
    return row(new Array<number>(total).fill(1), springs, pinned)
  }
  const closed = {
    'fixed-fixed': (p: number, n: number) => 2 * Math.sin((p * Math.PI) / (2 * (n + 1))),
    'free-free': (p: number, n: number) => 2 * Math.sin(((p - 1) * Math.PI) / (2 * n)),
    'fixed-free': (p: number, n: number) => 2 * Math.sin(((2 * p - 1) * Math.PI) / (2 * (2 * n + 1))),
  }

  test.each(['fixed-fixed', 'free-free', 'fixed-free'] as const)('%s', (ends) => {
    for (const n of [3, 5, 10]) {
      // The zero modes across the row come first, in no order: only resisted motions are compared.
      const found = naturalModes(chain(n, ends)).modes.filter(({ radps }) => radps > 0)
      const truths = Array.from({ length: n }, (_, i) => closed[ends](i + 1, n)).filter((w) => w > 0)
      expect(found).toHaveLength(truths.length)
      for (const [i, truth] of truths.entries()) near(found[i]!.radps, truth)
    }
  })

  test('published samples', () => {
    const fast = (n: number, ends: 'fixed-fixed' | 'free-free' | 'fixed-free') =>
      naturalModes(chain(n, ends))
        .modes.map(({ radps }) => radps)
        .filter((w) => w > 0)
    const samples = [
      [3, 'fixed-fixed', [0.76536686473018, Math.SQRT2, 1.847759065022573]],
      [3, 'free-free', [1, 1.732050807568877]],
      [3, 'fixed-free', [0.445041867912629, 1.246979603717467, 1.801937735804838]],
      [5, 'fixed-fixed', [0.517638090205041, 1, Math.SQRT2, 1.732050807568877, 1.931851652578137]],
      [5, 'free-free', [0.618033988749895, 1.175570504584946, 1.618033988749895, 1.902113032590307]],
    ] as const
    for (const [n, ends, truths] of samples) {
      const found = fast(n, ends)
      expect(found).toHaveLength(truths.length)
      for (const [i, truth] of truths.entries()) near(found[i], truth)
    }
    near(fast(10, 'fixed-fixed')[0], 0.28462967654657)
    near(fast(10, 'fixed-fixed')[9], 1.979642883761865)
  })

  test('a ring of n has 2 sin(pi q / n), each but the ends twice', () => {
    const n = 7
    // A ring as a straight row whose last mass is tied back: lengths do not matter, directions do.
    const springs = [...Array.from({ length: n - 1 }, (_, i) => strut(i, i + 1)), strut(n - 1, 0)]
    const found = naturalModes(row(new Array<number>(n).fill(1), springs, [])).modes.filter(
      (m) => m.radps > 0,
    )
    const truths = Array.from({ length: n }, (_, q) => 2 * Math.sin((Math.PI * q) / n)).sort((a, b) => a - b)
    for (const [i, truth] of truths.slice(1).entries()) near(found[i]!.radps, truth)
  })

  test('Kelvin-Voigt struts damp in proportion to stiffness, drag in proportion to mass', () => {
    // n = 5, k = 100, m = 1: zeta = c w / (2 k) for struts of c = 0.5; b / (2 m w) for drag b.
    const zetas = [0.01294095, 0.025, 0.03535534, 0.04330127, 0.04829629]
    const stiff = Array.from({ length: 6 }, (_, i) => strut(i, i + 1, 100, 0.5))
    const spec = row(new Array<number>(7).fill(1), stiff, [0, 6])
    const found = naturalModes(spec).modes.filter((mode) => mode.radps > 0)
    for (const [i, zeta] of zetas.entries()) near(found[i]!.dampingRatio, zeta, 1e-8)
    const plain = { ...spec, struts: stiff.map((s) => ({ ...s, dampingNspm: 0 })), dragNspm: 0.3 }
    for (const mode of naturalModes(plain).modes.filter((m) => m.radps > 0)) {
      near(mode.dampingRatio, 0.3 / (2 * mode.radps))
    }
  })
})

test('one mass, m = 1, k = 100: 10 rad/s, 1.5915494309189535 Hz; its dashpot gives c / (2 sqrt(k m))', () => {
  // c, damped frequency.
  for (const [c, damped] of [
    [0, 10],
    [0.2, 9.999499987499],
    [1, 9.987492177719],
    [2, 9.949874371066],
    [10, 8.660254037844],
  ] as const) {
    const mode = naturalModes(row([1, 1], [strut(0, 1, 100, c)], [0])).modes.at(-1)!
    near(mode.radps, 10)
    near(mode.radps / turn, 1.5915494309189535)
    near(mode.dampingRatio, c / 20)
    near(mode.radps * Math.sqrt(1 - mode.dampingRatio ** 2), damped)
  }
})

describe('two masses', () => {
  test('wall-100-m-50-m-100-wall: in phase at 10, in opposite phase at 14.142135623731 rad/s', () => {
    const spec = row([1, 1, 1, 1], [strut(0, 1, 100), strut(1, 2, 50), strut(2, 3, 100)], [0, 3])
    const [slow, fast] = naturalModes(spec).modes.filter(({ radps }) => radps > 0)
    near(slow!.radps, 10)
    near(fast!.radps, 14.142135623731)
    near(slow!.shape[2]! / slow!.shape[4]!, 1)
    near(fast!.shape[2]! / fast!.shape[4]!, -1)
    near(turn / (fast!.radps - slow!.radps), 1.51689511835)
  })

  test('a free pair of 1 and 2 kg, and a pair that hangs on one wall', () => {
    near(naturalModes(row([1, 2], [strut(0, 1, 100)], [])).modes.at(-1)!.radps, 12.247448713916)
    const hanging = row([1, 1, 1], [strut(0, 1, 100), strut(1, 2, 100)], [0])
    const [slow, fast] = naturalModes(hanging).modes.filter(({ radps }) => radps > 0)
    near(slow!.radps, 6.180339887499)
    near(fast!.radps, 16.180339887499)
  })

  test("shapes are scaled to v'Mv = 1 and orthogonal in mass", () => {
    const { modes } = naturalModes(row([1, 2, 3], [strut(0, 1, 7), strut(1, 2, 9)], []))
    const product = (a: Float64Array, b: Float64Array) =>
      a.reduce((sum, x, i) => sum + x * b[i]! * [1, 2, 3][Math.floor(i / 2)]!, 0)
    for (const [i, a] of modes.entries()) {
      for (const [j, b] of modes.entries()) near(product(a.shape, b.shape), i === j ? 1 : 0, 1e-12)
    }
  })
})

describe('struts under tension', () => {
  test('a mass between two strings of tension T swings across at sqrt(2 T / (m L))', () => {
    // k = 50, rest 0.8 of a length of 1: T = 10, so w = sqrt(20 / 2) across and sqrt(100 / 2) along.
    const tight = { restM: 0.8, stiffnessNpm: 50, dampingNspm: 0 }
    const spec = row([1, 2, 1], [], [0, 2])
    const struts = [
      { a: 0, b: 1, ...tight },
      { a: 1, b: 2, ...tight },
    ]
    const { modes, zeroModes } = naturalModes({ ...spec, struts })
    near(modes[0]!.radps, Math.sqrt(10))
    near(modes[1]!.radps, Math.sqrt(50))
    expect(zeroModes).toBe(0)
  })

  test('struts under thrust buckle: the growth rate is that of the same formula', () => {
    const pressed = { restM: 1.2, stiffnessNpm: 50, dampingNspm: 0 }
    const struts = [
      { a: 0, b: 1, ...pressed },
      { a: 1, b: 2, ...pressed },
    ]
    const found = naturalModes({ ...row([1, 2, 1], [], [0, 2]), struts })
    expect(found.unstableModes).toBe(1)
    near(found.modes[0]!.growthPerSecond, Math.sqrt(10))
  })
})

describe('hanging chains of masses on stiff struts, each under the weight below it', () => {
  /** Angular frequencies of the swinging motions, rad/s; gravity enters through the tensions only. */
  const swings = (masses: readonly number[], lengths: readonly number[], gravity: number) => {
    const k = 1e4
    const nodes: NodeSpec[] = [{ positionM: [0, 0], massKg: 1, pinned: true }]
    for (const [i, massKg] of masses.entries()) {
      nodes.push({ positionM: [0, nodes[i]!.positionM[1]! - lengths[i]!], massKg })
    }
    const struts = lengths.map((length, i) => {
      const tension = gravity * masses.slice(i).reduce((a, b) => a + b, 0)
      return { a: i, b: i + 1, restM: length - tension / k, stiffnessNpm: k, dampingNspm: 0 }
    })
    return naturalModes({ ...still, nodes, struts }).modes.map(({ radps }) => radps)
  }

  // N equal pendulums: w^2 = x g / l, x the zeros of the Laguerre polynomial L_N (from memory, recomputed to
  // eight decimals or more).
  test.each([
    [2, [0.76536686473, 1.84775906502]],
    [3, [0.64480583, 1.51468821, 2.50797629]],
    [10, [0.37120543, 0.85408111, 1.34474641]],
  ])('%d equal ones', (count, truths) => {
    const ones = new Array<number>(count).fill(1)
    const found = swings(ones, ones, 1)
    for (const [i, truth] of truths.entries()) expect(Math.abs(found[i]! - truth)).toBeLessThan(1e-7)
  })

  test('double pendulums of 1 and 1 kg, 1 and 1 m, and of 2 and 1 kg, 1 and 0.5 m', () => {
    const rows = [
      [[1, 1], [1, 1], 2.3971994, 5.7873513],
      [[2, 1], [1, 0.5], 2.82559022, 6.01340502],
    ] as const
    for (const [masses, lengths, slow, fast] of rows) {
      const found = swings(masses, lengths, 9.81)
      expect(Math.abs(found[0]! - slow)).toBeLessThan(1e-7)
      expect(Math.abs(found[1]! - fast)).toBeLessThan(1e-7)
    }
  })
})

describe('rigid motions and mechanisms', () => {
  const corners = (size: number, dimensions: 2 | 3) => {
    const one = Array.from({ length: size }, (_, i) => i)
    if (dimensions === 2) return one.flatMap((x) => one.map((y) => [x, y]))
    return one.flatMap((x) => one.flatMap((y) => one.map((z) => [x, y, z])))
  }
  /** Unit-cell lattice with struts between all nodes at most `reach` apart. */
  const lattice = (size: number, dimensions: 2 | 3, reach: number): LatticeSpec => {
    const nodes = corners(size, dimensions).map((positionM): NodeSpec => ({ positionM, massKg: 1 }))
    const struts = nodes.flatMap((p, a) =>
      nodes.slice(a + 1).flatMap((q, i) => {
        const squared = p.positionM.reduce((sum, x, axis) => sum + (x - q.positionM[axis]!) ** 2, 0)
        return squared <= reach * reach + 1e-9 ? [strut(a, a + 1 + i)] : []
      }),
    )
    return { ...still, dimensions, nodes, struts, gravityMps2: new Array<number>(dimensions).fill(0) }
  }

  test.each([
    [2, 3, 3],
    [3, 2, 6],
  ] as const)(
    'a braced free body in %d dimensions of %d nodes a side has %d zero modes',
    (dimensions, size, zero) => {
      const found = naturalModes(lattice(size, dimensions, Math.SQRT2))
      expect([found.zeroModes, found.rigidModes, found.mechanisms]).toEqual([zero, zero, 0])
    },
  )

  test('a square grid without diagonals has the 2 (n - 1) - 1 mechanisms of its rows and columns', () => {
    // n x n nodes: each row and each column of cells shears by itself, 2 (n - 1), less one that is the rigid turn.
    for (const n of [2, 3, 4]) {
      const { mechanisms, rigidModes } = naturalModes(lattice(n, 2, 1))
      expect([mechanisms, rigidModes]).toEqual([2 * (n - 1) - 1, 3])
    }
  })

  test('the count agrees with the rank of the compatibility matrix, by ml-matrix (Calladine 1978, from memory)', () => {
    const spec = lattice(3, 3, 1)
    const compatibility = Matrix.zeros(spec.struts.length, spec.nodes.length * 3)
    for (const [s, { a, b }] of spec.struts.entries()) {
      for (let axis = 0; axis < 3; axis++) {
        const d = spec.nodes[b]!.positionM[axis]! - spec.nodes[a]!.positionM[axis]!
        compatibility.set(s, 3 * a + axis, -d)
        compatibility.set(s, 3 * b + axis, d)
      }
    }
    const { rank } = new SingularValueDecomposition(compatibility, { autoTranspose: true })
    const found = naturalModes(spec)
    expect(found.zeroModes).toBe(spec.nodes.length * 3 - rank)
    expect(found.mechanisms).toBe(found.zeroModes - 6)
  })

  test('pins take rigid motions away: two pinned nodes in space leave the turn about their axis', () => {
    const spec = lattice(2, 3, Math.SQRT2)
    const nodes = spec.nodes.map((node, i) => ({ ...node, pinned: i === 0 || i === 7 }))
    const found = naturalModes({ ...spec, nodes })
    expect([found.rigidModes, found.zeroModes]).toEqual([1, 1])
  })
})

describe('areas and volumes', () => {
  /** Second derivatives of an energy by central differences. */
  const hessian = (energy: (x: Float64Array) => number, at: Float64Array, h: number) => {
    const moved = (i: number, j: number, a: number, b: number) => {
      const x = at.slice()
      x[i]! += a * h
      x[j]! += b * h
      return energy(x)
    }
    return Array.from(at, (_, i) =>
      Array.from(
        at,
        (_, j) =>
          (moved(i, j, 1, 1) - moved(i, j, 1, -1) - moved(i, j, -1, 1) + moved(i, j, -1, -1)) / (4 * h * h),
      ),
    )
  }
  const compare = (spec: LatticeSpec, energy: (x: Float64Array) => number) => {
    const model = linearModel(spec)
    for (const [i, line] of hessian(energy, model.positionsM, 1e-3).entries()) {
      for (const [j, value] of line.entries()) near(model.stiffness[i * model.size + j], value, 1e-5)
    }
  }

  test.each([undefined, 0.3])(
    'the stiffness of a triangle with rest area %s is its energy twice derived',
    (rest) => {
      const at = [
        [0, 0],
        [1.1, 0.2],
        [0.3, 0.9],
      ]
      const nodes = at.map((positionM) => ({ positionM, massKg: 1 }))
      const area = (x: Float64Array) => {
        return ((x[2]! - x[0]!) * (x[5]! - x[1]!) - (x[3]! - x[1]!) * (x[4]! - x[0]!)) / 2
      }
      const rest0 = rest ?? area(Float64Array.from(at.flat()))
      const areas = [{ nodes: [0, 1, 2] as const, stiffnessNpm: 3, ...(rest ? { restM2: rest } : {}) }]
      compare({ ...still, nodes, struts: [], areas }, (x) => (1.5 * (area(x) - rest0) ** 2) / rest0)
    },
  )

  test.each([undefined, 0.1])('the stiffness of a tetrahedron with rest volume %s likewise', (rest) => {
    const at = [
      [0, 0, 0],
      [1.1, 0.2, -0.1],
      [0.3, 0.9, 0.2],
      [0.1, -0.2, 1.2],
    ]
    const nodes = at.map((positionM) => ({ positionM, massKg: 1 }))
    const volume = (x: Float64Array) => {
      const e = (n: number) => [0, 1, 2].map((axis) => x[3 * n + axis]! - x[axis]!)
      const [a, b, c] = [e(1), e(2), e(3)]
      const cross = [
        b[1]! * c[2]! - b[2]! * c[1]!,
        b[2]! * c[0]! - b[0]! * c[2]!,
        b[0]! * c[1]! - b[1]! * c[0]!,
      ]
      return a.reduce((sum, v, i) => sum + v * cross[i]!, 0) / 6
    }
    const rest0 = rest ?? volume(Float64Array.from(at.flat()))
    const volumes = [{ nodes: [0, 1, 2, 3] as const, stiffnessPa: 3, ...(rest ? { restM3: rest } : {}) }]
    const spec: LatticeSpec = { ...still, dimensions: 3, gravityMps2: [0, 0, 0], nodes, struts: [], volumes }
    compare(spec, (x) => (1.5 * (volume(x) - rest0) ** 2) / rest0)
  })
})
