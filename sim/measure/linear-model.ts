// A lattice for small motions about the positions of its description: M u'' + C u' + K u = f, as dense matrices over
// all coordinates (node by node, x first). Struts, actuators and guided struts are springs at their passive rest
// lengths; a strut under tension T adds T / L across its axis (the string's stiffness); areas, volumes and pairs that are
// too close are springs too. Ground contact, friction, force limits and feedback are not linear and left out.
//
//   strut        K = (k - T/L) n n' + (T/L) I on the difference of its ends, T = k (L - rest), C = c n n'
//   area, volume K = (stiffness / rest) g g' + stiffness (A - rest) / rest * second derivative of A; g = gradient of A
//   drag         on the diagonal of C; drag struts by the lumping of a linear profile of speed, L/6 (2 1; 1 2)
// Source: tangent stiffness of pin-jointed structures, e.g. Pellegrino, Structural computations with the singular value
// decomposition of the equilibrium matrix, 1993 (from memory); the rest derived.

import { refuse } from '../../shared/refusals.js'
import { checkSpec } from '../lattice/build-checks.js'
import type { AreaSpec, LatticeSpec, StrutSpec, VolumeSpec } from '../lattice/spec.js'

/** Dense matrices: this many coordinates take 72 MB a matrix. */
export const coordinatesMost = 3000

export interface LinearModel {
  readonly dimensions: number
  /** Coordinates, nodes * dimensions. */
  readonly size: number
  /** Of every node. */
  readonly massKg: Float64Array
  /** Node by node, x first; where the model was made. */
  readonly positionsM: Float64Array
  /** Row-major, N/m. */
  readonly stiffness: Float64Array
  /** Row-major, N s/m. */
  readonly damping: Float64Array
  /** Coordinates that move by themselves, in order: those of nodes neither pinned nor prescribed. */
  readonly free: readonly number[]
  /** Coordinates of prescribed nodes, in order. */
  readonly moved: readonly number[]
}

/** Refuses more coordinates than dense matrices are good for. */
export function demandDense(field: string, size: number): void {
  if (size <= coordinatesMost) return
  throw refuse('impossible-value', {
    detail: `found ${size} coordinates, expected at most ${coordinatesMost}: the matrices are dense.`,
    where: { field },
  })
}

/** Where a pair of matrices is put together. */
interface Assembly {
  readonly dimensions: number
  readonly size: number
  readonly stiffness: Float64Array
  readonly damping: Float64Array
  readonly positionsM: Float64Array
}

/**
 * The linear model of a description. Refuses ('impossible-value') what buildLattice refuses of nodes and parts, and more
 * than `coordinatesMost` coordinates.
 */
export function linearModel(spec: LatticeSpec): LinearModel {
  checkSpec(spec)
  const dimensions = spec.dimensions ?? 2
  const size = spec.nodes.length * dimensions
  demandDense('lattice.nodes', size)
  const stiffness = new Float64Array(size * size)
  const damping = new Float64Array(size * size)
  const positionsM = Float64Array.from(spec.nodes.flatMap((node) => node.positionM))
  const assembly: Assembly = { dimensions, size, stiffness, damping, positionsM }
  const struts: readonly StrutSpec[] = [...spec.struts, ...(spec.actuators ?? []), ...(spec.guided ?? [])]
  for (const strut of struts) addStrut(assembly, strut)
  for (const pair of spec.keepApart ?? []) addPair(assembly, pair)
  for (const area of spec.areas ?? []) addArea(assembly, area)
  for (const volume of spec.volumes ?? []) addVolume(assembly, volume)
  for (const rod of spec.dragStruts ?? []) addRodDrag(assembly, rod)
  for (let i = 0; i < size; i++) damping[i * size + i]! += spec.dragNspm ?? 0
  const prescribed = new Set((spec.prescribed ?? []).map(({ node }) => node))
  const coordinates = (wanted: (node: number) => boolean) =>
    spec.nodes.flatMap((_, node) =>
      wanted(node) ? Array.from({ length: dimensions }, (_, axis) => node * dimensions + axis) : [],
    )
  return {
    dimensions,
    size,
    massKg: Float64Array.from(spec.nodes, ({ massKg }) => massKg),
    positionsM,
    stiffness,
    damping,
    free: coordinates((node) => !prescribed.has(node) && spec.nodes[node]!.pinned !== true),
    moved: coordinates((node) => prescribed.has(node)),
  }
}

/** From a to b: unit vector and length. */
function direction({ dimensions, positionsM }: Assembly, a: number, b: number) {
  const d = Array.from(
    { length: dimensions },
    (_, axis) => positionsM[b * dimensions + axis]! - positionsM[a * dimensions + axis]!,
  )
  const lengthM = Math.sqrt(d.reduce((sum, x) => sum + x * x, 0))
  return { along: d.map((x) => x / lengthM), lengthM }
}

/** Adds a matrix block of the two ends: +block on each, -block between them. */
function addBetween(
  { dimensions, size }: Assembly,
  into: Float64Array,
  a: number,
  b: number,
  block: (i: number, j: number) => number,
): void {
  for (let i = 0; i < dimensions; i++) {
    for (let j = 0; j < dimensions; j++) {
      const value = block(i, j)
      into[(a * dimensions + i) * size + a * dimensions + j]! += value
      into[(b * dimensions + i) * size + b * dimensions + j]! += value
      into[(a * dimensions + i) * size + b * dimensions + j]! -= value
      into[(b * dimensions + i) * size + a * dimensions + j]! -= value
    }
  }
}

function addStrut(assembly: Assembly, { a, b, restM, stiffnessNpm, dampingNspm }: StrutSpec): void {
  const { along: n, lengthM } = direction(assembly, a, b)
  const perLength = (stiffnessNpm * (lengthM - (restM ?? lengthM))) / lengthM
  const tangent = (i: number, j: number) =>
    (stiffnessNpm - perLength) * n[i]! * n[j]! + (i === j ? perLength : 0)
  addBetween(assembly, assembly.stiffness, a, b, tangent)
  addBetween(assembly, assembly.damping, a, b, (i, j) => dampingNspm * n[i]! * n[j]!)
}

function addPair(
  assembly: Assembly,
  { a, b, leastM, stiffnessNpm }: { a: number; b: number; leastM: number; stiffnessNpm: number },
): void {
  const { lengthM } = direction(assembly, a, b)
  if (lengthM < leastM) addStrut(assembly, { a, b, restM: leastM, stiffnessNpm, dampingNspm: 0 })
}

/** Adds factor * g g' for a gradient over some coordinates. */
function addSquare(
  { size, stiffness }: Assembly,
  coordinates: readonly number[],
  gradient: readonly number[],
  factor: number,
): void {
  for (const [i, row] of coordinates.entries()) {
    for (const [j, column] of coordinates.entries()) {
      stiffness[row * size + column]! += factor * gradient[i]! * gradient[j]!
    }
  }
}

function addArea(assembly: Assembly, { nodes, stiffnessNpm, restM2 }: AreaSpec): void {
  const { positionsM: x, size, stiffness } = assembly
  const [p, q, r] = nodes
  const cross = (a: number, b: number) => x[2 * a]! * x[2 * b + 1]! - x[2 * a + 1]! * x[2 * b]!
  const area = (cross(p, q) + cross(q, r) + cross(r, p)) / 2
  const rest = restM2 ?? area
  const coordinates = nodes.flatMap((node) => [2 * node, 2 * node + 1])
  const gradient = nodes.flatMap((_, i) => {
    const [next, last] = [nodes[(i + 1) % 3]!, nodes[(i + 2) % 3]!]
    return [(x[2 * next + 1]! - x[2 * last + 1]!) / 2, (x[2 * last]! - x[2 * next]!) / 2]
  })
  addSquare(assembly, coordinates, gradient, stiffnessNpm / rest)
  const pull = (stiffnessNpm * (area - rest)) / rest
  for (const [i, node] of nodes.entries()) {
    const next = nodes[(i + 1) % 3]!
    // A is bilinear in the corners: d2A / dx_node dy_next = 1/2, d2A / dy_node dx_next = -1/2.
    const half = pull / 2
    stiffness[2 * node * size + 2 * next + 1]! += half
    stiffness[(2 * next + 1) * size + 2 * node]! += half
    stiffness[(2 * node + 1) * size + 2 * next]! -= half
    stiffness[2 * next * size + 2 * node + 1]! -= half
  }
}

function addVolume(assembly: Assembly, { nodes, stiffnessPa, restM3 }: VolumeSpec): void {
  const { positionsM: x, size, stiffness } = assembly
  const from = (node: number) => [0, 1, 2].map((axis) => x[3 * node + axis]! - x[3 * nodes[0] + axis]!)
  const edges = [from(nodes[1]), from(nodes[2]), from(nodes[3])] as const
  const faces = [crossed(edges[1], edges[2]), crossed(edges[2], edges[0]), crossed(edges[0], edges[1])]
  const volume = edges[0].reduce((sum, e, axis) => sum + e * faces[0]![axis]!, 0) / 6
  const rest = restM3 ?? volume
  const outer = faces.flatMap((face) => face.map((f) => f / 6))
  const first = [0, 1, 2].map((axis) => -outer[axis]! - outer[3 + axis]! - outer[6 + axis]!)
  const coordinates = nodes.flatMap((node) => [3 * node, 3 * node + 1, 3 * node + 2])
  addSquare(assembly, coordinates, [...first, ...outer], stiffnessPa / rest)
  const pull = (stiffnessPa * (volume - rest)) / rest
  if (pull === 0) return
  // V is trilinear in the edges: d2V / de_i de_j = +-[e_k]x / 6, corner 0 moving all three edges backwards.
  const signs = (corner: number) =>
    corner === 0 ? [-1, -1, -1] : [1, 2, 3].map((c) => (c === corner ? 1 : 0))
  for (let a = 0; a < 4; a++) {
    for (let b = 0; b < 4; b++) {
      const block = secondOfVolume(edges, signs(a), signs(b))
      for (let i = 0; i < 9; i++) {
        const row = 3 * nodes[a]! + Math.floor(i / 3)
        stiffness[row * size + 3 * nodes[b]! + (i % 3)]! += pull * block[i]!
      }
    }
  }
}

function crossed(a: readonly number[], b: readonly number[]): number[] {
  return [a[1]! * b[2]! - a[2]! * b[1]!, a[2]! * b[0]! - a[0]! * b[2]!, a[0]! * b[1]! - a[1]! * b[0]!]
}

/** Second derivative of the volume by two corners that move the edges with the signs given, 3 x 3 row-major. */
function secondOfVolume(
  edges: readonly (readonly number[])[],
  rows: readonly number[],
  columns: readonly number[],
): Float64Array {
  const block = new Float64Array(9)
  for (let i = 0; i < 3; i++) {
    for (let j = 0; j < 3; j++) {
      if (i === j || rows[i] === 0 || columns[j] === 0) continue
      const k = 3 - i - j
      const cyclic = (i + 1) % 3 === j ? 1 : -1
      const factor = (cyclic * rows[i]! * columns[j]!) / 6
      const [ex, ey, ez] = edges[k] as [number, number, number]
      // 6 V = (e_i x e_j) . e_k for cyclic i, j, k = e_i . (e_j x e_k); as a bilinear form in e_i, e_j: -[e_k]x.
      const minusCross = [0, ez, -ey, -ez, 0, ex, ey, -ex, 0]
      for (let entry = 0; entry < 9; entry++) block[entry]! += factor * minusCross[entry]!
    }
  }
  return block
}

function addRodDrag(
  assembly: Assembly,
  {
    a,
    b,
    normalNspm2: normal,
    tangentNspm2: tangent,
  }: { a: number; b: number; normalNspm2: number; tangentNspm2: number },
): void {
  const { dimensions, size, damping } = assembly
  const { along: n, lengthM } = direction(assembly, a, b)
  for (const [from, to, share] of [
    [a, a, 2],
    [a, b, 1],
    [b, a, 1],
    [b, b, 2],
  ] as const) {
    for (let i = 0; i < dimensions; i++) {
      for (let j = 0; j < dimensions; j++) {
        const drag = (i === j ? normal : 0) - (normal - tangent) * n[i]! * n[j]!
        damping[(from * dimensions + i) * size + to * dimensions + j]! += (share * lengthM * drag) / 6
      }
    }
  }
}

/** The rows and columns named, row-major. */
export function part(
  matrix: Float64Array,
  size: number,
  rows: readonly number[],
  columns: readonly number[],
): Float64Array {
  const block = new Float64Array(rows.length * columns.length)
  for (const [i, row] of rows.entries()) {
    for (const [j, column] of columns.entries()) block[i * columns.length + j] = matrix[row * size + column]!
  }
  return block
}
