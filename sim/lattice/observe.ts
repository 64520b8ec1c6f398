// What can be read off a lattice between steps: energies, momenta, tensions. Nothing here changes it.

import { groundHeightM } from './ground.js'
import type { Lattice } from './layout.js'

/** Kinetic energy of all nodes that may move, J. */
export function kineticJ({ nodes, nodeCount, stride, dimensions, massKg, inverseMass }: Lattice): number {
  let sum = 0
  for (let i = 0; i < nodeCount; i++) {
    if (inverseMass[i] === 0) continue
    let squared = 0
    for (let axis = 0; axis < dimensions; axis++) {
      const v = nodes[i * stride + dimensions + axis]!
      squared += v * v
    }
    sum += 0.5 * massKg[i]! * squared
  }
  return sum
}

/** Square of the length of strut i (passive, active, guided), m^2. */
function squaredLength({ nodes, ends, dimensions }: Lattice, strut: number): number {
  const a = ends[2 * strut]!
  const b = ends[2 * strut + 1]!
  let squared = 0
  for (let axis = 0; axis < dimensions; axis++) {
    const d = nodes[b + axis]! - nodes[a + axis]!
    squared += d * d
  }
  return squared
}

/** d . dv of strut i: its length times the rate of it, m^2/s. */
function lengthTimesRate({ nodes, ends, dimensions }: Lattice, strut: number): number {
  const a = ends[2 * strut]!
  const b = ends[2 * strut + 1]!
  let sum = 0
  for (let axis = 0; axis < dimensions; axis++) {
    sum +=
      (nodes[b + axis]! - nodes[a + axis]!) * (nodes[b + dimensions + axis]! - nodes[a + dimensions + axis]!)
  }
  return sum
}

/** Present length of strut i (passive ones first), m. */
export function lengthM(lattice: Lattice, strut: number): number {
  return Math.sqrt(squaredLength(lattice, strut))
}

/** Rate of the length of strut i, m/s. */
export function lengthRateMps(lattice: Lattice, strut: number): number {
  return lengthTimesRate(lattice, strut) / lengthM(lattice, strut)
}

/**
 * Commanded relative change of the rest length of driven strut j (active, then guided): sin(wt + phi) times strain, as
 * grown; of a guided strut its state.
 */
export function commandedStrain(lattice: Lattice, driven: number): number {
  const { group, strainCos, strainSin, activeCount, guidedStrain } = lattice
  if (driven >= activeCount) return guidedStrain[driven - activeCount]!
  const g = group[driven]!
  return lattice.driven[g]! * strainCos[driven]! + lattice.driven[g + 1]! * strainSin[driven]!
}

/** Commanded rest length of strut i, m. */
export function commandedRestM(lattice: Lattice, strut: number): number {
  const rest = lattice.restM[strut]!
  const driven = strut - lattice.passiveCount
  return driven < 0 ? rest : rest * (1 + commandedStrain(lattice, driven))
}

/** Tension of strut i, N; thrust is negative. With the limits of actuators. */
export function tensionN(lattice: Lattice, strut: number): number {
  const stretchM = lengthM(lattice, strut) - commandedRestM(lattice, strut)
  const rate = lengthRateMps(lattice, strut)
  const free = lattice.stiffnessNpm[strut]! * stretchM + lattice.dampingNspm[strut]! * rate
  const driven = strut - lattice.passiveCount
  if (driven < 0) return free
  const most = lattice.limitN[driven]!
  const limited = Math.min(most, Math.max(-most, free))
  const powerW = -limited * rate
  const mostW = lattice.powerMostW[driven]!
  return powerW > mostW ? (limited * mostW) / powerW : limited
}

/** Mechanical power that strut i gives to its nodes, W. */
export function powerW(lattice: Lattice, strut: number): number {
  return -tensionN(lattice, strut) * lengthRateMps(lattice, strut)
}

/** Energy in all springs of struts, J (rest lengths as commanded). */
export function elasticJ(lattice: Lattice): number {
  let sum = 0
  for (let i = 0; i < lattice.passiveCount + lattice.activeCount + lattice.guidedCount; i++) {
    const stretch = lengthM(lattice, i) - commandedRestM(lattice, i)
    sum += 0.5 * lattice.stiffnessNpm[i]! * stretch * stretch
  }
  return sum
}

/** Signed area (m^2) or volume (m^3) of element i. */
export function fillSize({ nodes, fillEnds, dimensions }: Lattice, fill: number): number {
  const at = (corner: number, axis: number) => nodes[fillEnds[(dimensions + 1) * fill + corner]! + axis]!
  const edge = (corner: number, axis: number) => at(corner, axis) - at(0, axis)
  if (dimensions === 2) return 0.5 * (edge(1, 0) * edge(2, 1) - edge(1, 1) * edge(2, 0))
  const cross = (m: number, n: number) => edge(2, m) * edge(3, n) - edge(2, n) * edge(3, m)
  return (edge(1, 0) * cross(1, 2) + edge(1, 1) * cross(2, 0) + edge(1, 2) * cross(0, 1)) / 6
}

/** Energy in all areas or volumes, J: (1/2) kappa (A - A0)^2 / A0. */
export function fillJ(lattice: Lattice): number {
  let sum = 0
  for (let i = 0; i < lattice.fillCount; i++) {
    const change = fillSize(lattice, i) - lattice.fillRest[i]!
    sum += 0.5 * lattice.fillStiffness[i]! * change * change
  }
  return sum
}

/** Energy in all keep-apart pairs, J: (1/2) k (least - L)^2 where closer. */
export function apartJ(lattice: Lattice): number {
  const { apartCount, apartEnds, apartStiffnessNpm, apartStiffnessLeastN } = lattice
  const asStruts = { ...lattice, ends: apartEnds }
  let sum = 0
  for (let i = 0; i < apartCount; i++) {
    const k = apartStiffnessNpm[i]!
    const missing = k > 0 ? apartStiffnessLeastN[i]! / k - lengthM(asStruts, i) : 0
    if (missing > 0) sum += 0.5 * k * missing * missing
  }
  return sum
}

/** Energy of height, J, relative to the origin. */
export function gravitationalJ(lattice: Lattice): number {
  const { nodes, nodeCount, stride, dimensions, massKg, gravity, inverseMass } = lattice
  let sum = 0
  for (let i = 0; i < nodeCount; i++) {
    if (inverseMass[i] === 0) continue
    let work = 0
    for (let axis = 0; axis < dimensions; axis++) work += gravity[axis]! * nodes[i * stride + axis]!
    sum -= massKg[i]! * work
  }
  return sum
}

/** Depth of node i in the ground, m; negative above it. */
export function depthM(lattice: Lattice, node: number): number {
  const { nodes, stride, dimensions } = lattice
  const o = node * stride
  return groundHeightM(lattice, nodes[o]!, dimensions === 3 ? nodes[o + 2]! : 0) - nodes[o + 1]!
}

/** Energy in all contacts, J: k d^(n+1) / (n+1). */
export function contactJ(lattice: Lattice): number {
  const [stiffness, , rooted] = lattice.contact
  let sum = 0
  for (let i = 0; i < lattice.nodeCount; i++) {
    const depth = depthM(lattice, i)
    if (!(depth > 0) || lattice.inverseMass[i] === 0) continue
    sum += rooted ? (stiffness! * depth * depth * Math.sqrt(depth)) / 2.5 : (stiffness! * depth * depth) / 2
  }
  return sum
}

export interface Momenta {
  readonly px: number
  readonly py: number
  /** 0 in 2-D. */
  readonly pz: number
  /** About the origin, along z: the only one in 2-D. */
  readonly angular: number
  /** About the origin, along x and y; 0 in 2-D. */
  readonly angularX: number
  readonly angularY: number
}

/** Momentum and angular momentum of all nodes about the origin, kg m/s and kg m^2/s. */
export function momenta({ nodes, nodeCount, stride, dimensions, massKg }: Lattice): Momenta {
  let [px, py, pz, angular, angularX, angularY] = [0, 0, 0, 0, 0, 0]
  for (let i = 0; i < nodeCount; i++) {
    const o = i * stride
    const m = massKg[i]!
    const [x, y, z] = [nodes[o]!, nodes[o + 1]!, dimensions === 3 ? nodes[o + 2]! : 0]
    const v = o + dimensions
    const [vx, vy, vz] = [nodes[v]!, nodes[v + 1]!, dimensions === 3 ? nodes[v + 2]! : 0]
    px += m * vx
    py += m * vy
    pz += m * vz
    angular += m * (x * vy - y * vx)
    angularX += m * (y * vz - z * vy)
    angularY += m * (z * vx - x * vz)
  }
  return { px, py, pz, angular, angularX, angularY }
}
