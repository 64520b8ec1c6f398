// The step of a node in the plane that is in the ground in some lane (../reference/plane-nodes.ts).
// `o` is the node's record plus `lane`, the offset of the vector in hand; feelGround() has measured depth and slope.

import { contactDampingAt, contactStiffnessAt, dragAt, gravityAt, oneAt, rooted, stepAt, tinyAt } from '../lanes/header'
import { depthAt, frictionAt, fx, fy, material, number, slopeXAt, vx, vy, wide, word, x, y } from './record'
import { add, anyOf, atMost, both, choose, div, less, mul, only, read, sqrt, sub, Vec, write } from './vector'

/** v + h (f / m + g) */
@inline function driven(v: Vec, h: Vec, force: Vec, perKg: Vec, gravity: Vec): Vec {
  return add(v, mul(h, add(mul(force, perKg), gravity)))
}

export function touchPlane(o: usize, row: usize, touching: usize, lane: usize): void {
  const h = number(stepAt, lane)
  const zero = sub(h, h)
  const depth = read(row + lane, depthAt)
  const slope = read(row + lane, slopeXAt)
  const vx0 = read(o, vx)
  const vy0 = read(o, vy)
  const power = word(rooted) != 0 ? mul(depth, sqrt(depth)) : depth
  const rate = sub(mul(slope, vx0), vy0)
  const f = mul(power, add(number(contactStiffnessAt, lane), mul(number(contactDampingAt, lane), rate)))
  const pushed = both(less(zero, depth), less(zero, f))
  const perKg = material(row, 0, 0, lane)
  const drag = number(dragAt, lane)
  let forceX = sub(read(o, fx), mul(drag, vx0))
  let forceY = sub(read(o, fy), mul(drag, vy0))
  write(o, fx, zero)
  write(o, fy, zero)
  forceX = sub(forceX, only(pushed, mul(f, slope)))
  forceY = choose(pushed, add(forceY, f), forceY)
  let v = driven(vx0, h, forceX, perKg, number(gravityAt, lane))
  let w = driven(vy0, h, forceY, perKg, number(gravityAt + 1, lane))
  if (touching != 0) write(touching, lane, only(pushed, number(oneAt, lane)))
  if (anyOf(pushed)) {
    const one = number(oneAt, lane)
    const squared = add(one, mul(slope, slope))
    const perLength = div(one, squared)
    const sliding = add(v, mul(slope, w))
    const forward = read(row + lane, frictionAt)
    const backward = read(row + lane, frictionAt + wide)
    const mu = choose(less(zero, sliding), forward, backward)
    const speed = add(sqrt(mul(mul(sliding, sliding), perLength)), number(tinyAt, lane))
    const drop = mul(mul(mul(mul(h, mu), f), sqrt(squared)), perKg)
    // Minus the change: taking away +0 leaves -0 what it is, adding +0 does not.
    const lost = mul(mul(atMost(div(drop, speed), one), sliding), perLength)
    v = sub(v, only(pushed, lost))
    w = sub(w, only(pushed, mul(lost, slope)))
  }
  write(o, vx, v)
  write(o, vy, w)
  write(o, x, add(read(o, x), mul(h, v)))
  write(o, y, add(read(o, y), mul(h, w)))
}
