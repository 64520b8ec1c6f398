// Strut forces in space. Free functions over flat arrays, without allocation, closures or objects in the loops, only
// + - * / and square root, which IEEE 754 rounds the same way on every processor. Everything was checked when the
// lattice was built. What runs in every body takes its arrays one by one: reading them off objects of many shapes in
// every step costs more than a small body's forces. Node record: x y z | vx vy vz | fx fy fz, stride 9; struts hold offsets of records.
// The formulas stand in plane-struts.ts; here every sum has one more component.

import type { Lattice } from '../layout.js'

const perSix = 1 / 6

export function addPassiveSpace(
  count: number,
  ends: Int32Array,
  stiffnessNpm: Float64Array,
  stiffnessRestN: Float64Array,
  dampingNspm: Float64Array,
  nodes: Float64Array,
): void {
  for (let i = 0; i < count; i++) {
    const a = ends[2 * i]!
    const b = ends[2 * i + 1]!
    const dx = nodes[b]! - nodes[a]!
    const dy = nodes[b + 1]! - nodes[a + 1]!
    const dz = nodes[b + 2]! - nodes[a + 2]!
    const dvx = nodes[b + 3]! - nodes[a + 3]!
    const dvy = nodes[b + 4]! - nodes[a + 4]!
    const dvz = nodes[b + 5]! - nodes[a + 5]!
    const q = dx * dx + dy * dy + dz * dz
    const along = dx * dvx + dy * dvy + dz * dvz
    const scale = stiffnessNpm[i]! + (dampingNspm[i]! * along - stiffnessRestN[i]! * Math.sqrt(q)) * (1 / q)
    const fx = scale * dx
    const fy = scale * dy
    const fz = scale * dz
    nodes[a + 6]! += fx
    nodes[a + 7]! += fy
    nodes[a + 8]! += fz
    nodes[b + 6]! -= fx
    nodes[b + 7]! -= fy
    nodes[b + 8]! -= fz
  }
}

export function addActiveSpace(
  first: number,
  count: number,
  ends: Int32Array,
  stiffnessNpm: Float64Array,
  stiffnessRestN: Float64Array,
  dampingNspm: Float64Array,
  group: Int32Array,
  strainCos: Float64Array,
  strainSin: Float64Array,
  limitN: Float64Array,
  powerMostW: Float64Array,
  driven: Float64Array,
  nodes: Float64Array,
): void {
  for (let j = 0; j < count; j++) {
    const i = first + j
    const a = ends[2 * i]!
    const b = ends[2 * i + 1]!
    const g = group[j]!
    const drive = driven[g]! * strainCos[j]! + driven[g + 1]! * strainSin[j]!
    const dx = nodes[b]! - nodes[a]!
    const dy = nodes[b + 1]! - nodes[a + 1]!
    const dz = nodes[b + 2]! - nodes[a + 2]!
    const dvx = nodes[b + 3]! - nodes[a + 3]!
    const dvy = nodes[b + 4]! - nodes[a + 4]!
    const dvz = nodes[b + 5]! - nodes[a + 5]!
    const q = dx * dx + dy * dy + dz * dz
    const perQ = 1 / q
    const perLength = Math.sqrt(q) * perQ
    const commandedN = stiffnessRestN[i]! * (1 + drive)
    const most = limitN[j]! * perLength
    const along = dx * dvx + dy * dvy + dz * dvz
    const free = stiffnessNpm[i]! - commandedN * perLength + dampingNspm[i]! * along * perQ
    let scale = Math.min(most, Math.max(-most, free))
    const powerW = -scale * along
    if (powerW > powerMostW[j]!) scale *= powerMostW[j]! / powerW
    const fx = scale * dx
    const fy = scale * dy
    const fz = scale * dz
    nodes[a + 6]! += fx
    nodes[a + 7]! += fy
    nodes[a + 8]! += fz
    nodes[b + 6]! -= fx
    nodes[b + 7]! -= fy
    nodes[b + 8]! -= fz
  }
}

export function addGuidedSpace(lattice: Lattice): void {
  const { passiveCount, activeCount, guidedCount, ends, nodes } = lattice
  const { stiffnessNpm, stiffnessRestN, dampingNspm, limitN, guidedStrain, powerMostW } = lattice
  for (let j = 0; j < guidedCount; j++) {
    const i = passiveCount + activeCount + j
    const a = ends[2 * i]!
    const b = ends[2 * i + 1]!
    const dx = nodes[b]! - nodes[a]!
    const dy = nodes[b + 1]! - nodes[a + 1]!
    const dz = nodes[b + 2]! - nodes[a + 2]!
    const dvx = nodes[b + 3]! - nodes[a + 3]!
    const dvy = nodes[b + 4]! - nodes[a + 4]!
    const dvz = nodes[b + 5]! - nodes[a + 5]!
    const q = dx * dx + dy * dy + dz * dz
    const perQ = 1 / q
    const perLength = Math.sqrt(q) * perQ
    const along = dx * dvx + dy * dvy + dz * dvz
    const commandedN = stiffnessRestN[i]! * (1 + guidedStrain[j]!)
    const most = limitN[activeCount + j]! * perLength
    const free = stiffnessNpm[i]! - commandedN * perLength + dampingNspm[i]! * along * perQ
    let scale = Math.min(most, Math.max(-most, free))
    const powerW = -scale * along
    const mostW = powerMostW[activeCount + j]!
    if (powerW > mostW) scale *= mostW / powerW
    const fx = scale * dx
    const fy = scale * dy
    const fz = scale * dz
    nodes[a + 6]! += fx
    nodes[a + 7]! += fy
    nodes[a + 8]! += fz
    nodes[b + 6]! -= fx
    nodes[b + 7]! -= fy
    nodes[b + 8]! -= fz
  }
}

export function addDragSpace(lattice: Lattice): void {
  const { dragCount, dragEnds: ends, dragNormal, dragDifference, nodes } = lattice
  for (let i = 0; i < dragCount; i++) {
    const a = ends[2 * i]!
    const b = ends[2 * i + 1]!
    const dx = nodes[b]! - nodes[a]!
    const dy = nodes[b + 1]! - nodes[a + 1]!
    const dz = nodes[b + 2]! - nodes[a + 2]!
    const uax = 2 * nodes[a + 3]! + nodes[b + 3]!
    const uay = 2 * nodes[a + 4]! + nodes[b + 4]!
    const uaz = 2 * nodes[a + 5]! + nodes[b + 5]!
    const ubx = nodes[a + 3]! + 2 * nodes[b + 3]!
    const uby = nodes[a + 4]! + 2 * nodes[b + 4]!
    const ubz = nodes[a + 5]! + 2 * nodes[b + 5]!
    const q = dx * dx + dy * dy + dz * dz
    const sixth = Math.sqrt(q) * perSix
    const normal = dragNormal[i]!
    const perQ = dragDifference[i]! / q
    const alongA = perQ * (uax * dx + uay * dy + uaz * dz)
    const alongB = perQ * (ubx * dx + uby * dy + ubz * dz)
    nodes[a + 6]! -= sixth * (normal * uax - alongA * dx)
    nodes[a + 7]! -= sixth * (normal * uay - alongA * dy)
    nodes[a + 8]! -= sixth * (normal * uaz - alongA * dz)
    nodes[b + 6]! -= sixth * (normal * ubx - alongB * dx)
    nodes[b + 7]! -= sixth * (normal * uby - alongB * dy)
    nodes[b + 8]! -= sixth * (normal * ubz - alongB * dz)
  }
}

export function addApartSpace(lattice: Lattice): void {
  const { apartCount, apartEnds: ends, apartStiffnessNpm, apartStiffnessLeastN, nodes } = lattice
  for (let i = 0; i < apartCount; i++) {
    const a = ends[2 * i]!
    const b = ends[2 * i + 1]!
    const dx = nodes[b]! - nodes[a]!
    const dy = nodes[b + 1]! - nodes[a + 1]!
    const dz = nodes[b + 2]! - nodes[a + 2]!
    const q = dx * dx + dy * dy + dz * dz
    const perLength = Math.sqrt(q) * (1 / q)
    const scale = Math.min(0, apartStiffnessNpm[i]! - apartStiffnessLeastN[i]! * perLength)
    const fx = scale * dx
    const fy = scale * dy
    const fz = scale * dz
    nodes[a + 6]! += fx
    nodes[a + 7]! += fy
    nodes[a + 8]! += fz
    nodes[b + 6]! -= fx
    nodes[b + 7]! -= fy
    nodes[b + 8]! -= fz
  }
}
