// Small bodies for the physics reference tests, and what is read off their motion.

import { addForces, advance } from '../../sim/lattice/advance.js'
import { buildLattice, type Lattice } from '../../sim/lattice/build.js'
import { planeStride as stride } from '../../sim/lattice/layout.js'
import type { LatticeSpec, NodeSpec, StrutSpec } from '../../sim/lattice/spec.js'

export const x = 0
export const y = 1
export const vx = 2
export const vy = 3

/** One number of one node. */
export function at(lattice: Lattice, node: number, axis: number): number {
  return lattice.nodes[node * stride + axis]!
}
export function put(lattice: Lattice, node: number, axis: number, value: number): void {
  lattice.nodes[node * stride + axis] = value
}

export interface ChainOptions {
  readonly masses: readonly number[]
  readonly stiffnessNpm: number
  readonly dampingNspm?: number
  readonly stepSeconds: number
  readonly ends: 'fixed-fixed' | 'fixed-free' | 'free-free'
  readonly rest?: Partial<LatticeSpec>
}

/** Masses in a row along x, 1 m apart, joined by equal struts; fixed ends are pinned nodes. */
export function chain({
  masses,
  stiffnessNpm,
  dampingNspm = 0,
  stepSeconds,
  ends,
  rest,
}: ChainOptions): Lattice {
  const nodes: NodeSpec[] = masses.map((massKg, i) => ({ positionM: [i, 0], massKg }))
  if (ends !== 'free-free') nodes.unshift({ positionM: [-1, 0], massKg: 1, pinned: true })
  if (ends === 'fixed-fixed') nodes.push({ positionM: [masses.length, 0], massKg: 1, pinned: true })
  const struts: StrutSpec[] = nodes
    .slice(1)
    .map((_, i) => ({ a: i, b: i + 1, restM: 1, stiffnessNpm, dampingNspm }))
  return buildLattice({ nodes, struts, gravityMps2: [0, 0], stepSeconds, ...rest })
}

/** One mass on one strut along x, node 1, its rest position x = 0. */
export function oscillator(
  massKg: number,
  stiffnessNpm: number,
  dampingNspm: number,
  stepSeconds: number,
  rest?: Partial<LatticeSpec>,
): Lattice {
  return chain({
    masses: [massKg],
    stiffnessNpm,
    dampingNspm,
    stepSeconds,
    ends: 'fixed-free',
    rest: rest ?? {},
  })
}

/** Values of `read` after 0, 1, 2, ... steps. */
export function record(lattice: Lattice, steps: number, read: (lattice: Lattice) => number): Float64Array {
  const values = new Float64Array(steps + 1)
  values[0] = read(lattice)
  for (let i = 1; i <= steps; i++) {
    const fault = advance(lattice, 1)
    if (fault) throw new Error(`${fault.reason} at ${fault.seconds} s`)
    values[i] = read(lattice)
  }
  return values
}

/** Places (in samples, by straight lines) where the signal passes zero upwards. */
export function upwardZeros(values: Float64Array): number[] {
  const zeros: number[] = []
  for (let i = 1; i < values.length; i++) {
    const [before, after] = [values[i - 1]!, values[i]!]
    if (before < 0 && after >= 0) zeros.push(i - 1 + before / (before - after))
  }
  return zeros
}

/** Mean angular frequency between the first and the last upward zero, rad/s. */
export function angularFrequency(values: Float64Array, stepSeconds: number): number {
  const zeros = upwardZeros(values)
  const periods = zeros.length - 1
  return (2 * Math.PI * periods) / ((zeros[periods]! - zeros[0]!) * stepSeconds)
}

/** Heights of the maxima above zero, by a parabola through three samples. */
export function peaks(values: Float64Array): number[] {
  const heights: number[] = []
  for (let i = 1; i + 1 < values.length; i++) {
    const [l, m, r] = [values[i - 1]!, values[i]!, values[i + 1]!]
    if (m > 0 && m >= l && m > r) heights.push(m - ((r - l) * (r - l)) / (8 * (l - 2 * m + r)))
  }
  return heights
}

/** Damping ratio behind a logarithmic decrement, zeta = delta / sqrt(4 pi^2 + delta^2). */
export function dampingRatio(decrement: number): number {
  return decrement / Math.sqrt(4 * Math.PI * Math.PI + decrement * decrement)
}

/** Mean logarithmic decrement over the first `count` successive peaks. */
export function decrement(values: Float64Array, count: number): number {
  const heights = peaks(values)
  return Math.log(heights[0]! / heights[count]!) / count
}

/**
 * Stiffness matrix of the free nodes, both axes, by moving every coordinate by +-delta in the simulator's own force
 * routine; divided by sqrt(m_i m_j), so that its eigenvalues are squares of angular frequencies.
 */
export function massScaledStiffness(lattice: Lattice, axes: readonly number[], deltaM = 1e-4): number[][] {
  const free = Array.from({ length: lattice.nodeCount }, (_, i) => i).filter(
    (i) => lattice.inverseMass[i] !== 0,
  )
  const places = free.flatMap((node) => axes.map((axis) => node * stride + axis))
  const force = () => {
    addForces(lattice)
    const f = places.map((place) => lattice.nodes[place + 4]!)
    for (let i = 0; i < lattice.nodeCount; i++) lattice.nodes.fill(0, i * stride + 4, i * stride + 6)
    return f
  }
  const columns = places.map((place) => {
    const start = lattice.nodes[place]!
    lattice.nodes[place] = start + deltaM
    const plus = force()
    lattice.nodes[place] = start - deltaM
    const minus = force()
    lattice.nodes[place] = start
    return plus.map((f, i) => -(f - minus[i]!) / (2 * deltaM))
  })
  const perRootKg = places.map((place) => Math.sqrt(lattice.inverseMass[Math.floor(place / stride)]!))
  return places.map((_, i) => places.map((_, j) => columns[j]![i]! * perRootKg[i]! * perRootKg[j]!))
}

/** Observed order of convergence from the errors at h and h/2. */
export function orderOf(errorAtH: number, errorAtHalf: number): number {
  return Math.log2(errorAtH / errorAtHalf)
}
