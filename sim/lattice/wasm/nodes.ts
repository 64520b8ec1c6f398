// Nodes: node drag, contact, friction and one step of symplectic Euler. Formulas: ../reference/plane-nodes.ts and
// space-nodes.ts. The loop holds the free step; whatever is more than that (held, watched by a sensor, in the ground in
// some lane) goes to special(), where lanes without contact get the results of the free step, bit for bit.

import { dragAt, gravityAt, nodesEnd, nodesFirst, nodeTable, stepAt } from '../lanes/header'
import { touchPlane } from './plane-touch'
import {
  fx, fy, fz, insideAt, isHeld, material, nodeBytes, nodeRowBytes, number, specialAt, touchingAt, vx, wide, word, x,
} from './record'
import { touchSpace } from './space-touch'
import { dimensions, vectors } from './variant'
import { add, mul, read, sub, Vec, vectorBytes, write } from './vector'

/** v += h (f / m + g), x += h v of one component, f without the drag of the node. */
@inline function component(o: usize, c: usize, lane: usize, h: Vec, drag: Vec, perKg: Vec, zero: Vec): void {
  const position = x + c * wide + lane
  const velocity = vx + c * wide + lane
  const force = fx + c * wide + lane
  const v0 = read(o, velocity)
  const f = sub(read(o, force), mul(drag, v0))
  const v = add(v0, mul(h, add(mul(f, perKg), number(<usize>gravityAt + c, lane))))
  write(o, force, zero)
  write(o, velocity, v)
  write(o, position, add(read(o, position), mul(h, v)))
}

@inline function free(o: usize, row: usize, lane: usize, h: Vec, zero: Vec): void {
  const drag = number(dragAt, lane)
  const perKg = material(row, 0, 0, lane)
  component(o, 0, lane, h, drag, perKg, zero)
  component(o, 1, lane, h, drag, perKg, zero)
  if (dimensions == 3) component(o, 2, lane, h, drag, perKg, zero)
}

@inline function clearForces(o: usize, lane: usize, zero: Vec): void {
  write(o, fx + lane, zero)
  write(o, fy + lane, zero)
  if (dimensions == 3) write(o, fz + lane, zero)
}

/** The step of one vector of a node that moves and is in the ground or watched by a sensor. */
@inline function move(o: usize, row: usize, touching: usize, inside: bool, lane: usize, h: Vec, zero: Vec): void {
  if (inside) {
    if (dimensions == 3) touchSpace(o + lane, row, touching, lane)
    else touchPlane(o + lane, row, touching, lane)
  } else {
    free(o, row, lane, h, zero)
    if (touching != 0) write(touching, lane, zero)
  }
}

export function special(o: usize, row: usize): void {
  const h = number(stepAt, 0)
  const zero = sub(h, h)
  if (word(row + specialAt) & isHeld) {
    clearForces(o, 0, zero)
    if (vectors > 1) clearForces(o, vectorBytes, zero)
    return
  }
  const inside = word(row + insideAt) != 0
  const touching = word(row + touchingAt)
  move(o, row, touching, inside, 0, h, zero)
  if (vectors > 1) move(o, row, touching, inside, vectorBytes, h, zero)
}

/** One step for every node by index, feelGround() having marked those in the ground; forces are 0 afterwards. */
export function integrate(): void {
  const end = word(nodesEnd)
  let row = word(nodeTable)
  for (let o = word(nodesFirst); o < end; o += nodeBytes) {
    // Both words at once: special and inside.
    if (load<u64>(row + specialAt) != 0) {
      special(o, row)
    } else {
      const h = number(stepAt, 0)
      const zero = sub(h, h)
      free(o, row, 0, h, zero)
      if (vectors > 1) free(o, row, vectorBytes, h, zero)
    }
    row += nodeRowBytes
  }
}
