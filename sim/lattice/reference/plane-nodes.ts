// Nodes in the plane: node drag, contact, friction and one step of symplectic Euler, v += h (f/m + g), x += h v.

import { tiny } from '../layout.js'
import { coefficientPlane } from './friction.js'

/**
 * One step for every node by index; forces are 0 afterwards. `world`: step, node drag, gravity. `senses`: whether to
 * keep `touching`. (Numbers travel in arrays, because V8 boxes those it passes to another function.)
 *
 * Contact. Height field y = s(x), slope s'. The depth d = s(x) - y (vertical) is the generalised coordinate of
 * the contact, dd/dt = s' vx - vy:
 *   f = max(0, k d^n + lambda d^n dd/dt),   force = f * (-s', 1).
 * The elastic part is the gradient of a potential that is continuous where slopes change, and the rest only
 * takes energy out: no body gains energy from a kink of the ground. Its size along the normal is f sqrt(1 + s'^2).
 *
 * Friction is implicit Coulomb friction in one step, after the velocity has been advanced without it: with v* the
 * speed along the ground and N the normal force,  v = v* max(0, 1 - h mu N / (m |v*|)).  The foot sticks exactly as
 * long as friction can hold it, at every step size; friction never turns the velocity round, and two states never
 * drift apart through it. (The smoother v* q / (q + h mu N / m), q = sqrt(v*^2 + eps^2), lets a held foot creep at about
 * 2 s^2 h F / (m (1 - s^2)), s = F / (mu N): centimetres a second for light nodes.) mu follows the direction of v*.
 */
export function integratePlane(
  count: number,
  world: Float64Array,
  inverseMass: Float64Array,
  heightsM: Float64Array,
  terrain: Float64Array,
  contact: Float64Array,
  friction: Float64Array,
  senses: boolean,
  touching: Float64Array,
  nodes: Float64Array,
): void {
  const stepSeconds = world[0]!
  const dragNspm = world[1]!
  const gx = world[2]!
  const gy = world[3]!
  const top = terrain[2]!
  for (let i = 0; i < count; i++) {
    const perKg = inverseMass[i]!
    const o = i * 6
    if (perKg === 0) {
      nodes[o + 4] = 0
      nodes[o + 5] = 0
      continue
    }
    if (nodes[o + 1]! < top) {
      const pushed = touch(i, world, inverseMass, heightsM, terrain, contact, friction, nodes)
      if (senses) touching[i] = pushed
      continue
    }
    if (senses) touching[i] = 0
    const vx0 = nodes[o + 2]!
    const vy0 = nodes[o + 3]!
    const vx = vx0 + stepSeconds * ((nodes[o + 4]! - dragNspm * vx0) * perKg + gx)
    const vy = vy0 + stepSeconds * ((nodes[o + 5]! - dragNspm * vy0) * perKg + gy)
    nodes[o + 2] = vx
    nodes[o + 3] = vy
    nodes[o]! += stepSeconds * vx
    nodes[o + 1]! += stepSeconds * vy
    nodes[o + 4] = 0
    nodes[o + 5] = 0
  }
}

/** The step of a node that is lower than the highest ground; 1 when the ground pushes it, else 0. */
function touch(
  i: number,
  world: Float64Array,
  inverseMass: Float64Array,
  heightsM: Float64Array,
  terrain: Float64Array,
  contact: Float64Array,
  friction: Float64Array,
  nodes: Float64Array,
): number {
  const stepSeconds = world[0]!
  const dragNspm = world[1]!
  const o = i * 6
  const perKg = inverseMass[i]!
  const vx0 = nodes[o + 2]!
  const vy0 = nodes[o + 3]!
  let fx = nodes[o + 4]! - dragNspm * vx0
  let fy = nodes[o + 5]! - dragNspm * vy0
  nodes[o + 4] = 0
  nodes[o + 5] = 0
  const perSpacing = terrain[1]!
  const lastCell = heightsM.length - 2
  let normalN = 0
  const along = (nodes[o]! - terrain[0]!) * perSpacing
  const cell = along > 0 ? (along < lastCell ? Math.floor(along) : lastCell) : 0
  const left = heightsM[cell]!
  const rise = heightsM[cell + 1]! - left
  const slope = rise * perSpacing
  // Before the first and after the last height the ground goes on as it began or ended.
  const depth = left + rise * (along - cell) - nodes[o + 1]!
  if (depth > 0) {
    const power = contact[2]! !== 0 ? depth * Math.sqrt(depth) : depth
    const f = power * (contact[0]! + contact[1]! * (slope * vx0 - vy0))
    if (f > 0) {
      fx -= f * slope
      fy += f
      normalN = f
    }
  }
  let vx = vx0 + stepSeconds * (fx * perKg + world[2]!)
  let vy = vy0 + stepSeconds * (fy * perKg + world[3]!)
  if (normalN > 0) {
    const perLength = 1 / (1 + slope * slope)
    // v* along the ground is (vx + slope vy) / sqrt(1 + slope^2).
    const sliding = vx + slope * vy
    const mu = coefficientPlane(i, sliding, friction)
    const speed = Math.sqrt(sliding * sliding * perLength) + tiny
    const drop = stepSeconds * mu * normalN * Math.sqrt(1 + slope * slope) * perKg
    const change = -Math.min(1, drop / speed) * sliding * perLength
    vx += change
    vy += change * slope
  }
  nodes[o + 2] = vx
  nodes[o + 3] = vy
  nodes[o]! += stepSeconds * vx
  nodes[o + 1]! += stepSeconds * vy
  return normalN > 0 ? 1 : 0
}
