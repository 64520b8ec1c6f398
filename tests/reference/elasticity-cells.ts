// Periodic cells whose moduli are published, as frameworks; and the honeycomb's closed forms.

import type { BarSpec, FrameworkSpec, HingeSpec, Point } from '../../sim/frames/index.js'

const root3 = Math.sqrt(3)

/** A central-force spring of stiffness k between a node and a copy of a node; its length is put in by `springs`. */
interface Spring {
  readonly a: number
  readonly b: number
  readonly shift?: readonly [number, number]
  readonly k: number
}

/** A cell of springs: a bar of E A = k L is a spring of stiffness k. */
export function springs(
  nodes: readonly Point[],
  periods: readonly [Point, Point],
  list: readonly Spring[],
): FrameworkSpec {
  const bars = list.map(({ a, b, shift = [0, 0], k }): BarSpec => {
    const x = nodes[b]![0] + shift[0] * periods[0][0] + shift[1] * periods[1][0] - nodes[a]![0]
    const y = nodes[b]![1] + shift[0] * periods[0][1] + shift[1] * periods[1][1] - nodes[a]![1]
    return { a, b, shift, axialN: k * Math.hypot(x, y) }
  })
  return { nodes, periods, bars }
}

/** One node, six neighbours at distance 1. */
export function triangular(k: number): FrameworkSpec {
  const near = [
    [1, 0],
    [0, 1],
    [-1, 1],
  ] as const
  const list = near.map((shift) => ({ a: 0, b: 0, shift, k }))
  return springs(
    [[0, 0]],
    [
      [1, 0],
      [0.5, root3 / 2],
    ],
    list,
  )
}

/** One node, edges k1, both diagonals k2. */
export function squareWithDiagonals(k1: number, k2: number): FrameworkSpec {
  const list: Spring[] = [
    { a: 0, b: 0, shift: [1, 0], k: k1 },
    { a: 0, b: 0, shift: [0, 1], k: k1 },
  ]
  const diagonals: Spring[] = [
    { a: 0, b: 0, shift: [1, 1], k: k2 },
    { a: 0, b: 0, shift: [-1, 1], k: k2 },
  ]
  return springs(
    [[0, 0]],
    [
      [1, 0],
      [0, 1],
    ],
    k2 > 0 ? [...list, ...diagonals] : list,
  )
}

/** n by n kagome cells, bonds of length 1, spring k. */
export function kagome(k: number, n = 1): FrameworkSpec {
  const nodes: Point[] = []
  const list: Spring[] = []
  for (let j = 0; j < n; j++) {
    for (let i = 0; i < n; i++) {
      const [x, y] = [2 * i + j, j * root3]
      nodes.push([x, y], [x + 1, y], [x + 0.5, root3 / 2 + y])
      const here = 3 * (j * n + i)
      const from = (di: number, dj: number, which: number) => {
        const [p, q] = [i + di, j + dj]
        const [pn, qn] = [((p % n) + n) % n, ((q % n) + n) % n]
        return { node: 3 * (qn * n + pn) + which, shift: [(p - pn) / n, (q - qn) / n] as const }
      }
      const join = (a: number, to: { node: number; shift: readonly [number, number] }) =>
        list.push({ a: here + a, b: to.node, shift: to.shift, k })
      join(0, from(0, 0, 1))
      join(1, from(0, 0, 2))
      join(2, from(0, 0, 0))
      join(1, from(1, 0, 0))
      join(2, from(0, 1, 0))
      join(2, from(-1, 1, 1))
    }
  }
  return springs(
    nodes,
    [
      [2 * n, 0],
      [n, n * root3],
    ],
    list,
  )
}

export interface Honeycomb {
  readonly slantDegrees: number
  /** Length of the upright walls over that of the slanting ones, which is 1. */
  readonly upright: number
}

/** Upright walls 0-1 and 2-3, slanting ones between; 4 nodes a cell. */
function honeycombWalls({ slantDegrees, upright }: Honeycomb, wall: Omit<BarSpec, 'a' | 'b'>): FrameworkSpec {
  const angle = (slantDegrees * Math.PI) / 180
  const [c, s] = [Math.cos(angle), Math.sin(angle)]
  return {
    nodes: [
      [0, 0],
      [0, upright],
      [c, upright + s],
      [c, 2 * upright + s],
    ],
    periods: [
      [2 * c, 0],
      [0, 2 * (upright + s)],
    ],
    bars: [
      { a: 0, b: 1, ...wall },
      { a: 1, b: 2, ...wall },
      { a: 1, b: 2, shift: [-1, 0], ...wall },
      { a: 2, b: 3, ...wall },
      { a: 3, b: 0, shift: [0, 1], ...wall },
      { a: 3, b: 0, shift: [1, 1], ...wall },
    ],
  }
}

/** Welded walls of thickness t and modulus 1, unit depth. */
export function weldedHoneycomb(shape: Honeycomb, t: number): FrameworkSpec {
  return honeycombWalls(shape, { axialN: t, bendingNm2: (t * t * t) / 12 })
}

/** Walls `stiffness` times as stiff as the hinges (1 N m / rad between every two of three walls) that join them. */
export function hingedHoneycomb(shape: Honeycomb, stiffness: number): FrameworkSpec {
  const welded = honeycombWalls(shape, { axialN: stiffness, bendingNm2: stiffness })
  const taken = [0, 0, 0, 0]
  const bars = welded.bars.map((bar) => ({ ...bar, turnA: taken[bar.a]!++, turnB: taken[bar.b]!++ }))
  const hinges = [0, 1, 2, 3].flatMap((node) =>
    (
      [
        [0, 1],
        [1, 2],
        [0, 2],
      ] as const
    ).map((turns): HingeSpec => ({ node, turns, stiffnessNmprad: 1 })),
  )
  return { ...welded, bars, hinges }
}

/** Gibson and Ashby's honeycomb with walls that bend and stretch (modulus 1), in closed form. */
export function gibsonAshby({ slantDegrees, upright: h }: Honeycomb, t: number) {
  const angle = (slantDegrees * Math.PI) / 180
  const [c, s] = [Math.cos(angle), Math.sin(angle)]
  const cot2 = (c * c) / (s * s)
  return {
    e1: (t ** 3 * c) / ((h + s) * s * s) / (1 + cot2 * t * t),
    e2: (t ** 3 * (h + s)) / c ** 3 / (1 + ((s * s) / (c * c) + (2 * h) / (c * c)) * t * t),
    bending: {
      e1: (t ** 3 * c) / ((h + s) * s * s),
      e2: (t ** 3 * (h + s)) / c ** 3,
      nu12: (c * c) / ((h + s) * s),
      g12: (t ** 3 * (h + s)) / (h * h * (1 + 2 * h) * c),
    },
  }
}

/** Triangles of welded walls, length 1, thickness t, modulus 1. */
export function weldedTriangles(t: number): FrameworkSpec {
  const spec = triangular(1)
  return { ...spec, bars: spec.bars.map((bar) => ({ ...bar, axialN: t, bendingNm2: (t * t * t) / 12 })) }
}

/**
 * Rotating squares of side 1 joined at their corners by hinges of 1 N m / rad, opened by `degrees`: four squares and
 * eight corners a cell of side 2 (cos(a/2) + sin(a/2)). The squares are welded walls, `stiffness` times the hinges.
 */
export function rotatingSquares(degrees: number, stiffness: number): FrameworkSpec {
  const half = (degrees * Math.PI) / 360
  const d = Math.cos(half) + Math.sin(half)
  const beta = Math.PI / 4 - half
  const nodes: Point[] = []
  const turns: number[] = []
  const bars: BarSpec[] = []
  const corner = (x: number, y: number) => {
    const shift = [Math.floor(x / (2 * d) + 1e-9), Math.floor(y / (2 * d) + 1e-9)] as const
    const at = [x - shift[0] * 2 * d, y - shift[1] * 2 * d] as const
    let node = nodes.findIndex(([p, q]) => Math.abs(p - at[0]) + Math.abs(q - at[1]) < 1e-9)
    if (node < 0) {
      node = nodes.push(at) - 1
      turns.push(0)
    }
    return { node, shift, turn: turns[node]!++ }
  }
  for (const i of [0, 1]) {
    for (const j of [0, 1]) {
      const corners = [0, 1, 2, 3].map((k) => {
        const mirrored = (i + j) % 2 === 1
        const angle = (mirrored ? Math.PI - beta : beta) + (k * Math.PI) / 2
        // Moved off the cell's edges, so that no corner lies on one.
        const x = 0.3 * d + i * d + Math.SQRT1_2 * Math.cos(angle)
        const y = 0.4 * d + j * d + Math.SQRT1_2 * Math.sin(angle)
        return corner(x, y)
      })
      for (let k = 0; k < 4; k++) {
        const [p, q] = [corners[k]!, corners[(k + 1) % 4]!]
        bars.push({
          a: p.node,
          b: q.node,
          shift: [q.shift[0] - p.shift[0], q.shift[1] - p.shift[1]],
          turnA: p.turn,
          turnB: q.turn,
          axialN: stiffness,
          bendingNm2: stiffness,
        })
      }
    }
  }
  const hinges = nodes.map((_, node): HingeSpec => ({ node, turns: [0, 1], stiffnessNmprad: 1 }))
  return {
    nodes,
    bars,
    hinges,
    periods: [
      [2 * d, 0],
      [0, 2 * d],
    ],
  }
}
