// Nodes: node drag, contact, friction and one step of symplectic Euler. Formulas: ../reference/plane-nodes.ts and
// space-nodes.ts. The free step is in the loop; a vector with some lane below the highest ground goes to touch(), where
// lanes without contact get the results of the free step, bit for bit.

import {
  dragAt, gravityAt, nodesEnd, nodesFirst, nodeTable, stepAt, topAt, touchingFirst,
} from '../lanes/header'
import { touchPlane } from './plane-touch'
import {
  fx, fy, fz, material, nodeBytes, nodeRowBytes, number, vx, vy, vz, wide, word, x, y, z,
} from './record'
import { touchSpace } from './space-touch'
import { dimensions, vectors } from './variant'
import { add, anyOf, less, mul, numberBytes, read, sub, Vec, vectorBytes, write } from './vector'

/** v += h (f / m + g), x += h v of one component, f without the drag of the node. */
@inline function free(o: usize, c: usize, lane: usize, h: Vec, drag: Vec, perKg: Vec, zero: Vec): void {
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

@inline function move(o: usize, row: usize, touching: usize, lane: usize): void {
  if (anyOf(less(read(o, y + lane), number(topAt, lane)))) {
    if (dimensions == 3) touchSpace(o + lane, row, touching, lane)
    else touchPlane(o + lane, row, touching, lane)
    return
  }
  const h = number(stepAt, lane)
  const zero = sub(h, h)
  const drag = number(dragAt, lane)
  const perKg = material(row, 0, 0, lane)
  free(o, 0, lane, h, drag, perKg, zero)
  free(o, 1, lane, h, drag, perKg, zero)
  if (dimensions == 3) free(o, 2, lane, h, drag, perKg, zero)
  if (touching != 0) write(touching, lane, zero)
}

@inline function clearForces(o: usize, lane: usize): void {
  const zero = sub(number(stepAt, lane), number(stepAt, lane))
  write(o, fx + lane, zero)
  write(o, fy + lane, zero)
  if (dimensions == 3) write(o, fz + lane, zero)
}

@inline function isHeld(row: usize): bool {
  return numberBytes == 8 ? load<f64>(row) == 0 : load<f32>(row) == 0
}

/** One step for every node by index; forces are 0 afterwards. */
export function integrate(): void {
  const end = word(nodesEnd)
  let row = word(nodeTable)
  let touching = word(touchingFirst)
  const each: usize = touching == 0 ? 0 : wide
  for (let o = word(nodesFirst); o < end; o += nodeBytes) {
    if (isHeld(row)) {
      clearForces(o, 0)
      if (vectors > 1) clearForces(o, vectorBytes)
    } else {
      move(o, row, touching, 0)
      if (vectors > 1) move(o, row, touching, vectorBytes)
    }
    row += nodeRowBytes
    touching += each
  }
}
