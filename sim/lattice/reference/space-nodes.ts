// Nodes in space: as plane-nodes.ts, over a ground of bilinear patches y = s(x, z).

import { tiny } from '../layout.js'
import { coefficientSpace } from './friction.js'

/**
 * One step for every node by index; forces are 0 afterwards. `world`: step, node drag, gravity. `senses`: whether to
 * keep `touching`.
 */
export function integrateSpace(
  count: number,
  world: Float64Array,
  inverseMass: Float64Array,
  heightsM: Float64Array,
  columns: number,
  rows: number,
  terrain: Float64Array,
  contact: Float64Array,
  friction: Float64Array,
  heading: Int32Array,
  senses: boolean,
  touching: Float64Array,
  nodes: Float64Array,
): void {
  const stepSeconds = world[0]!
  const dragNspm = world[1]!
  const gx = world[2]!
  const gy = world[3]!
  const gz = world[4]!
  const top = terrain[2]!
  for (let i = 0; i < count; i++) {
    const perKg = inverseMass[i]!
    const o = i * 9
    if (perKg === 0) {
      nodes[o + 6] = 0
      nodes[o + 7] = 0
      nodes[o + 8] = 0
      continue
    }
    if (nodes[o + 1]! < top) {
      touch(i, world, inverseMass, heightsM, columns, rows, terrain, contact, nodes)
      const pushed = nodes[o + 6]! > 0
      if (pushed) rub(i, world, inverseMass, friction, heading, nodes)
      nodes[o]! += stepSeconds * nodes[o + 3]!
      nodes[o + 1]! += stepSeconds * nodes[o + 4]!
      nodes[o + 2]! += stepSeconds * nodes[o + 5]!
      nodes[o + 6] = 0
      nodes[o + 7] = 0
      nodes[o + 8] = 0
      if (senses) touching[i] = pushed ? 1 : 0
      continue
    }
    if (senses) touching[i] = 0
    const vx0 = nodes[o + 3]!
    const vy0 = nodes[o + 4]!
    const vz0 = nodes[o + 5]!
    const vx = vx0 + stepSeconds * ((nodes[o + 6]! - dragNspm * vx0) * perKg + gx)
    const vy = vy0 + stepSeconds * ((nodes[o + 7]! - dragNspm * vy0) * perKg + gy)
    const vz = vz0 + stepSeconds * ((nodes[o + 8]! - dragNspm * vz0) * perKg + gz)
    nodes[o + 3] = vx
    nodes[o + 4] = vy
    nodes[o + 5] = vz
    nodes[o]! += stepSeconds * vx
    nodes[o + 1]! += stepSeconds * vy
    nodes[o + 2]! += stepSeconds * vz
    nodes[o + 6] = 0
    nodes[o + 7] = 0
    nodes[o + 8] = 0
  }
}

/**
 * The velocity of a node that is lower than the highest ground, without friction; then its force fields hold f, sx, sz.
 * With the slopes sx = ds/dx, sz = ds/dz:  dd/dt = sx vx + sz vz - vy,  force = f (-sx, 1, -sz),
 * N = f sqrt(1 + sx^2 + sz^2).
 */
function touch(
  i: number,
  world: Float64Array,
  inverseMass: Float64Array,
  heightsM: Float64Array,
  columns: number,
  rows: number,
  terrain: Float64Array,
  contact: Float64Array,
  nodes: Float64Array,
): void {
  const stepSeconds = world[0]!
  const dragNspm = world[1]!
  const o = i * 9
  const perKg = inverseMass[i]!
  const vx0 = nodes[o + 3]!
  const vy0 = nodes[o + 4]!
  const vz0 = nodes[o + 5]!
  const lastColumn = columns - 2
  const lastRow = rows - 2
  const alongX = (nodes[o]! - terrain[0]!) * terrain[1]!
  const alongZ = (nodes[o + 2]! - terrain[3]!) * terrain[4]!
  const column = alongX > 0 ? (alongX < lastColumn ? Math.floor(alongX) : lastColumn) : 0
  const row = alongZ > 0 ? (alongZ < lastRow ? Math.floor(alongZ) : lastRow) : 0
  const corner = row * columns + column
  const near = heightsM[corner]!
  const far = heightsM[corner + columns]!
  const nearRise = heightsM[corner + 1]! - near
  const farRise = heightsM[corner + columns + 1]! - far
  const u = alongX - column
  const w = alongZ - row
  const nearHeight = near + nearRise * u
  const across = far + farRise * u - nearHeight
  const depth = nearHeight + across * w - nodes[o + 1]!
  let f = 0
  let sx = 0
  let sz = 0
  if (depth > 0) {
    sx = (nearRise + (farRise - nearRise) * w) * terrain[1]!
    sz = across * terrain[4]!
    const power = contact[2]! !== 0 ? depth * Math.sqrt(depth) : depth
    f = Math.max(0, power * (contact[0]! + contact[1]! * (sx * vx0 + sz * vz0 - vy0)))
  }
  const vx = vx0 + stepSeconds * ((nodes[o + 6]! - dragNspm * vx0 - f * sx) * perKg + world[2]!)
  const vy = vy0 + stepSeconds * ((nodes[o + 7]! - dragNspm * vy0 + f) * perKg + world[3]!)
  const vz = vz0 + stepSeconds * ((nodes[o + 8]! - dragNspm * vz0 - f * sz) * perKg + world[4]!)
  nodes[o + 3] = vx
  nodes[o + 4] = vy
  nodes[o + 5] = vz
  nodes[o + 6] = f
  nodes[o + 7] = sx
  nodes[o + 8] = sz
}

/**
 * Friction on the velocity of a node that the ground pushes, f, sx and sz in its force fields: with n = (-sx, 1, -sz) / sqrt(1 + sx^2 + sz^2) the
 * part along the ground is v_t = v - (v . n) n, and v_t *= max(0, 1 - h mu N / (m |v_t|)).
 */
function rub(
  i: number,
  world: Float64Array,
  inverseMass: Float64Array,
  friction: Float64Array,
  heading: Int32Array,
  nodes: Float64Array,
): void {
  const o = i * 9
  const f = nodes[o + 6]!
  const sx = nodes[o + 7]!
  const sz = nodes[o + 8]!
  const squared = 1 + sx * sx + sz * sz
  const lift = (nodes[o + 4]! - sx * nodes[o + 3]! - sz * nodes[o + 5]!) / squared
  const tx = nodes[o + 3]! + lift * sx
  const ty = nodes[o + 4]! - lift
  const tz = nodes[o + 5]! + lift * sz
  const speed = Math.sqrt(tx * tx + ty * ty + tz * tz) + tiny
  const mu = coefficientSpace(i, tx, tz, friction, heading, nodes)
  const drop = world[0]! * mu * (f * Math.sqrt(squared)) * inverseMass[i]!
  const change = Math.min(1, drop / speed)
  nodes[o + 3]! -= change * tx
  nodes[o + 4]! -= change * ty
  nodes[o + 5]! -= change * tz
}
