// What can be read off a lattice between steps: energies, momenta, tensions. Nothing here changes it.

import { groundHeightM } from './advance.js'
import type { Lattice } from './build.js'
import { stride } from './kernel.js'

/** Kinetic energy of all nodes that may move, J. */
export function kineticJ({ nodes, nodeCount, massKg, inverseMass }: Lattice): number {
  let sum = 0
  for (let i = 0; i < nodeCount; i++) {
    const vx = nodes[i * stride + 2]!
    const vy = nodes[i * stride + 3]!
    if (inverseMass[i] !== 0) sum += 0.5 * massKg[i]! * (vx * vx + vy * vy)
  }
  return sum
}

/** Present length of strut i (passive ones first), m. */
export function lengthM({ nodes, ends }: Lattice, strut: number): number {
  const a = ends[2 * strut]!
  const b = ends[2 * strut + 1]!
  const dx = nodes[b]! - nodes[a]!
  const dy = nodes[b + 1]! - nodes[a + 1]!
  return Math.sqrt(dx * dx + dy * dy)
}

/** Rate of the length of strut i, m/s. */
export function lengthRateMps({ nodes, ends }: Lattice, strut: number): number {
  const a = ends[2 * strut]!
  const b = ends[2 * strut + 1]!
  const dx = nodes[b]! - nodes[a]!
  const dy = nodes[b + 1]! - nodes[a + 1]!
  const dvx = nodes[b + 2]! - nodes[a + 2]!
  const dvy = nodes[b + 3]! - nodes[a + 3]!
  return (dx * dvx + dy * dvy) / Math.sqrt(dx * dx + dy * dy)
}

/** sin(wt + phi) times strain of active strut j, as grown: the commanded relative change of its rest length. */
export function commandedStrain({ driven, group, strainCos, strainSin }: Lattice, active: number): number {
  const g = group[active]!
  return driven[g]! * strainCos[active]! + driven[g + 1]! * strainSin[active]!
}

/** Commanded rest length of strut i, m. */
export function commandedRestM(lattice: Lattice, strut: number): number {
  const rest = lattice.restM[strut]!
  const active = strut - lattice.passiveCount
  return active < 0 ? rest : rest * (1 + commandedStrain(lattice, active))
}

/** Tension of strut i, N; thrust is negative. */
export function tensionN(lattice: Lattice, strut: number): number {
  const stretchM = lengthM(lattice, strut) - commandedRestM(lattice, strut)
  const free =
    lattice.stiffnessNpm[strut]! * stretchM + lattice.dampingNspm[strut]! * lengthRateMps(lattice, strut)
  const active = strut - lattice.passiveCount
  if (active < 0) return free
  const most = lattice.limitN[active]!
  return Math.min(most, Math.max(-most, free))
}

/** Energy in all springs, J (rest lengths as commanded). */
export function elasticJ(lattice: Lattice): number {
  let sum = 0
  for (let i = 0; i < lattice.passiveCount + lattice.activeCount; i++) {
    const stretch = lengthM(lattice, i) - commandedRestM(lattice, i)
    sum += 0.5 * lattice.stiffnessNpm[i]! * stretch * stretch
  }
  return sum
}

/** Energy of height, J, relative to the origin. */
export function gravitationalJ({ nodes, nodeCount, massKg, gravity, inverseMass }: Lattice): number {
  let sum = 0
  for (let i = 0; i < nodeCount; i++) {
    if (inverseMass[i] === 0) continue
    sum -= massKg[i]! * (gravity[0]! * nodes[i * stride]! + gravity[1]! * nodes[i * stride + 1]!)
  }
  return sum
}

/** Energy in all contacts, J: k d^(n+1) / (n+1). */
export function contactJ(lattice: Lattice): number {
  const [stiffness, , rooted] = lattice.contact
  let sum = 0
  for (let i = 0; i < lattice.nodeCount; i++) {
    const depth = groundHeightM(lattice, lattice.nodes[i * stride]!) - lattice.nodes[i * stride + 1]!
    if (!(depth > 0) || lattice.inverseMass[i] === 0) continue
    sum += rooted ? (stiffness! * depth * depth * Math.sqrt(depth)) / 2.5 : (stiffness! * depth * depth) / 2
  }
  return sum
}

/** Momentum px, py and angular momentum about the origin, kg m/s and kg m^2/s. */
export function momenta({ nodes, nodeCount, massKg }: Lattice): { px: number; py: number; angular: number } {
  let px = 0
  let py = 0
  let angular = 0
  for (let i = 0; i < nodeCount; i++) {
    const o = i * stride
    const m = massKg[i]!
    px += m * nodes[o + 2]!
    py += m * nodes[o + 3]!
    angular += m * (nodes[o]! * nodes[o + 3]! - nodes[o + 1]! * nodes[o + 2]!)
  }
  return { px, py, angular }
}
