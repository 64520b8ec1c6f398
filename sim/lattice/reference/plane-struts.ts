// Strut forces in the plane. Free functions over flat arrays, without allocation, closures or objects in the loops, only
// + - * / and square root, which IEEE 754 rounds the same way on every processor. Everything was checked when the
// lattice was built. What runs in every body takes its arrays one by one: reading them off objects of many shapes in
// every step costs more than a small body's forces. Node record: x y | vx vy | fx fy, stride 6; struts hold offsets of records.
// space-struts.ts is the same with one more component in every sum.
//
// A strut of zero length is not patched: it yields a force that is no number, and the choke point in advance.ts
// ends the simulation as failed.

import type { Lattice } from '../layout.js'

const perSix = 1 / 6

/**
 * Spring and dashpot of the passive struts; C = |pb - pa| - rest,
 *   tension T = stiffness * C + damping * dC/dt,   force on a = +T n,  on b = -T n,  n from a to b.
 * With d = pb - pa, q = d.d:  T / |d| = k - k rest / |d| + c (d . dv) / q = k + (c (d . dv) - k rest |d|) / q: one
 * product less, and square root and 1 / q do not wait for each other.
 */
export function addPassivePlane(
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
    const dvx = nodes[b + 2]! - nodes[a + 2]!
    const dvy = nodes[b + 3]! - nodes[a + 3]!
    const q = dx * dx + dy * dy
    const along = dx * dvx + dy * dvy
    const scale = stiffnessNpm[i]! + (dampingNspm[i]! * along - stiffnessRestN[i]! * Math.sqrt(q)) * (1 / q)
    const fx = scale * dx
    const fy = scale * dy
    nodes[a + 4]! += fx
    nodes[a + 5]! += fy
    nodes[b + 4]! -= fx
    nodes[b + 5]! -= fy
  }
}

/**
 * As passive struts, for struts whose rest length is commanded: rest (1 + strain sin(wt + phi)), by angle addition
 * from sin wt and cos wt of its group, sin(wt + phi) = sin wt cos phi + cos wt sin phi. Tension is kept within
 * +-limit; then, where the strut would give its nodes more power than it has, p = -T dL/dt > limit, its tension is
 * scaled down to that power. `first` is the number of the first of them in the list of struts.
 */
export function addActivePlane(
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
    const dvx = nodes[b + 2]! - nodes[a + 2]!
    const dvy = nodes[b + 3]! - nodes[a + 3]!
    const q = dx * dx + dy * dy
    const perQ = 1 / q
    const perLength = Math.sqrt(q) * perQ
    const commandedN = stiffnessRestN[i]! * (1 + drive)
    const most = limitN[j]! * perLength
    const along = dx * dvx + dy * dvy
    const free = stiffnessNpm[i]! - commandedN * perLength + dampingNspm[i]! * along * perQ
    let scale = Math.min(most, Math.max(-most, free))
    const powerW = -scale * along
    if (powerW > powerMostW[j]!) scale *= powerMostW[j]! / powerW
    const fx = scale * dx
    const fy = scale * dy
    nodes[a + 4]! += fx
    nodes[a + 5]! += fy
    nodes[b + 4]! -= fx
    nodes[b + 5]! -= fy
  }
}

/**
 * Guided struts: as active ones, the commanded strain being state (guide.ts).
 */
export function addGuidedPlane(lattice: Lattice): void {
  const { passiveCount, activeCount, guidedCount, ends, nodes } = lattice
  const { stiffnessNpm, stiffnessRestN, dampingNspm, limitN, guidedStrain, powerMostW } = lattice
  for (let j = 0; j < guidedCount; j++) {
    const i = passiveCount + activeCount + j
    const a = ends[2 * i]!
    const b = ends[2 * i + 1]!
    const dx = nodes[b]! - nodes[a]!
    const dy = nodes[b + 1]! - nodes[a + 1]!
    const dvx = nodes[b + 2]! - nodes[a + 2]!
    const dvy = nodes[b + 3]! - nodes[a + 3]!
    const q = dx * dx + dy * dy
    const perQ = 1 / q
    const perLength = Math.sqrt(q) * perQ
    const along = dx * dvx + dy * dvy
    const commandedN = stiffnessRestN[i]! * (1 + guidedStrain[j]!)
    const most = limitN[activeCount + j]! * perLength
    const free = stiffnessNpm[i]! - commandedN * perLength + dampingNspm[i]! * along * perQ
    let scale = Math.min(most, Math.max(-most, free))
    const powerW = -scale * along
    const mostW = powerMostW[activeCount + j]!
    if (powerW > mostW) scale *= mostW / powerW
    const fx = scale * dx
    const fy = scale * dy
    nodes[a + 4]! += fx
    nodes[a + 5]! += fy
    nodes[b + 4]! -= fx
    nodes[b + 5]! -= fy
  }
}

/**
 * Viscous drag of a straight rod whose velocity goes linearly from va to vb: per length C u = cn u - (cn - ct)(u.n) n.
 * Shared out to the two nodes consistently (the integral of the linear shape functions along the rod):
 *   force on a = -(L/6) C (2 va + vb),   force on b = -(L/6) C (va + 2 vb),   L the present length.
 */
export function addDragPlane(lattice: Lattice): void {
  const { dragCount, dragEnds: ends, dragNormal, dragDifference, nodes } = lattice
  for (let i = 0; i < dragCount; i++) {
    const a = ends[2 * i]!
    const b = ends[2 * i + 1]!
    const dx = nodes[b]! - nodes[a]!
    const dy = nodes[b + 1]! - nodes[a + 1]!
    const uax = 2 * nodes[a + 2]! + nodes[b + 2]!
    const uay = 2 * nodes[a + 3]! + nodes[b + 3]!
    const ubx = nodes[a + 2]! + 2 * nodes[b + 2]!
    const uby = nodes[a + 3]! + 2 * nodes[b + 3]!
    const q = dx * dx + dy * dy
    const sixth = Math.sqrt(q) * perSix
    const normal = dragNormal[i]!
    const perQ = dragDifference[i]! / q
    const alongA = perQ * (uax * dx + uay * dy)
    const alongB = perQ * (ubx * dx + uby * dy)
    nodes[a + 4]! -= sixth * (normal * uax - alongA * dx)
    nodes[a + 5]! -= sixth * (normal * uay - alongA * dy)
    nodes[b + 4]! -= sixth * (normal * ubx - alongB * dx)
    nodes[b + 5]! -= sixth * (normal * uby - alongB * dy)
  }
}

/** Pushes the nodes of a pair apart where they are closer than `least`: T / |d| = min(0, k - k least / |d|). */
export function addApartPlane(lattice: Lattice): void {
  const { apartCount, apartEnds: ends, apartStiffnessNpm, apartStiffnessLeastN, nodes } = lattice
  for (let i = 0; i < apartCount; i++) {
    const a = ends[2 * i]!
    const b = ends[2 * i + 1]!
    const dx = nodes[b]! - nodes[a]!
    const dy = nodes[b + 1]! - nodes[a + 1]!
    const q = dx * dx + dy * dy
    const perLength = Math.sqrt(q) * (1 / q)
    const scale = Math.min(0, apartStiffnessNpm[i]! - apartStiffnessLeastN[i]! * perLength)
    const fx = scale * dx
    const fy = scale * dy
    nodes[a + 4]! += fx
    nodes[a + 5]! += fy
    nodes[b + 4]! -= fx
    nodes[b + 5]! -= fy
  }
}
