// Areas (2-D) and volumes (3-D) that resist being squeezed: U = (1/2) kappa (A - A0)^2 / A0, force = -grad U. With them
// a lattice can be nearly incompressible, which springs alone cannot. `fillStiffness` is kappa / A0.
//
// The force on the first node is minus the sum of the others, so that the forces of one element cancel to rounding.

import type { Lattice } from '../layout.js'

const perSix = 1 / 6

/** A = (e1 x e2) / 2, e1 = pj - pi, e2 = pk - pi;  dA/dpj = (e2y, -e2x) / 2,  dA/dpk = (-e1y, e1x) / 2. */
export function addAreas({ fillCount, fillEnds, fillRest, fillStiffness, nodes }: Lattice): void {
  for (let n = 0; n < fillCount; n++) {
    const i = fillEnds[3 * n]!
    const j = fillEnds[3 * n + 1]!
    const k = fillEnds[3 * n + 2]!
    const e1x = nodes[j]! - nodes[i]!
    const e1y = nodes[j + 1]! - nodes[i + 1]!
    const e2x = nodes[k]! - nodes[i]!
    const e2y = nodes[k + 1]! - nodes[i + 1]!
    const area = 0.5 * (e1x * e2y - e1y * e2x)
    const half = -0.5 * (fillStiffness[n]! * (area - fillRest[n]!))
    const fjx = half * e2y
    const fjy = -(half * e2x)
    const fkx = -(half * e1y)
    const fky = half * e1x
    nodes[i + 4]! -= fjx + fkx
    nodes[i + 5]! -= fjy + fky
    nodes[j + 4]! += fjx
    nodes[j + 5]! += fjy
    nodes[k + 4]! += fkx
    nodes[k + 5]! += fky
  }
}

/**
 * V = e1 . (e2 x e3) / 6, e from the first node to the others;  dV/dp2 = (e2 x e3) / 6,  dV/dp3 = (e3 x e1) / 6,
 * dV/dp4 = (e1 x e2) / 6.
 */
export function addVolumes({ fillCount, fillEnds, fillRest, fillStiffness, nodes }: Lattice): void {
  for (let n = 0; n < fillCount; n++) {
    const i = fillEnds[4 * n]!
    const j = fillEnds[4 * n + 1]!
    const k = fillEnds[4 * n + 2]!
    const l = fillEnds[4 * n + 3]!
    const e1x = nodes[j]! - nodes[i]!
    const e1y = nodes[j + 1]! - nodes[i + 1]!
    const e1z = nodes[j + 2]! - nodes[i + 2]!
    const e2x = nodes[k]! - nodes[i]!
    const e2y = nodes[k + 1]! - nodes[i + 1]!
    const e2z = nodes[k + 2]! - nodes[i + 2]!
    const e3x = nodes[l]! - nodes[i]!
    const e3y = nodes[l + 1]! - nodes[i + 1]!
    const e3z = nodes[l + 2]! - nodes[i + 2]!
    const c1x = e2y * e3z - e2z * e3y
    const c1y = e2z * e3x - e2x * e3z
    const c1z = e2x * e3y - e2y * e3x
    const volume = (e1x * c1x + e1y * c1y + e1z * c1z) * perSix
    const sixth = -(fillStiffness[n]! * (volume - fillRest[n]!)) * perSix
    const f1x = sixth * c1x
    const f1y = sixth * c1y
    const f1z = sixth * c1z
    const f2x = sixth * (e3y * e1z - e3z * e1y)
    const f2y = sixth * (e3z * e1x - e3x * e1z)
    const f2z = sixth * (e3x * e1y - e3y * e1x)
    const f3x = sixth * (e1y * e2z - e1z * e2y)
    const f3y = sixth * (e1z * e2x - e1x * e2z)
    const f3z = sixth * (e1x * e2y - e1y * e2x)
    nodes[i + 6]! -= f1x + f2x + f3x
    nodes[i + 7]! -= f1y + f2y + f3y
    nodes[i + 8]! -= f1z + f2z + f3z
    nodes[j + 6]! += f1x
    nodes[j + 7]! += f1y
    nodes[j + 8]! += f1z
    nodes[k + 6]! += f2x
    nodes[k + 7]! += f2y
    nodes[k + 8]! += f2z
    nodes[l + 6]! += f3x
    nodes[l + 7]! += f3y
    nodes[l + 8]! += f3z
  }
}
