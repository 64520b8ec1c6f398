// The step of a node in space that is in the ground in some lane (../reference/space-nodes.ts).
// `o` is the node's record plus `lane`, the offset of the vector in hand; feelGround() has measured depth and slopes.

import {
  contactDampingAt, contactStiffnessAt, dragAt, gravityAt, oneAt, rooted, stepAt, tinyAt,
} from '../lanes/header'
import {
  depthAt, dot, frictionAt, fx, fy, fz, headingAt, material, number, slopeXAt, slopeZAt, vx, vy, vz, wide, word, x, y, z,
} from './record'
import {
  add, anyOf, atLeast, atMost, choose, differ, div, either, less, mul, only, read, sqrt, sub, Vec, write,
} from './vector'

/** v + h (f / m + g) */
@inline function driven(v: Vec, h: Vec, force: Vec, perKg: Vec, gravity: Vec): Vec {
  return add(v, mul(h, add(mul(force, perKg), gravity)))
}

export function touchSpace(o: usize, row: usize, touching: usize, lane: usize): void {
  const h = number(stepAt, lane)
  const zero = sub(h, h)
  const depth = read(row + lane, depthAt)
  const inside = less(zero, depth)
  const sx = only(inside, read(row + lane, slopeXAt))
  const sz = only(inside, read(row + lane, slopeZAt))
  const vx0 = read(o, vx)
  const vy0 = read(o, vy)
  const vz0 = read(o, vz)
  const power = word(rooted) != 0 ? mul(depth, sqrt(depth)) : depth
  const rate = sub(add(mul(sx, vx0), mul(sz, vz0)), vy0)
  const law = add(number(contactStiffnessAt, lane), mul(number(contactDampingAt, lane), rate))
  const f = only(inside, atLeast(mul(power, law), zero))
  const pushed = less(zero, f)
  const perKg = material(row, 0, 0, lane)
  const drag = number(dragAt, lane)
  const freeX = sub(read(o, fx), mul(drag, vx0))
  const freeY = sub(read(o, fy), mul(drag, vy0))
  const freeZ = sub(read(o, fz), mul(drag, vz0))
  write(o, fx, zero)
  write(o, fy, zero)
  write(o, fz, zero)
  let v = driven(vx0, h, sub(freeX, mul(f, sx)), perKg, number(gravityAt, lane))
  let u = driven(vy0, h, add(freeY, f), perKg, number(gravityAt + 1, lane))
  let w = driven(vz0, h, sub(freeZ, mul(f, sz)), perKg, number(gravityAt + 2, lane))
  if (touching != 0) write(touching, lane, only(pushed, number(oneAt, lane)))
  if (anyOf(pushed)) {
    const one = number(oneAt, lane)
    const squared = add(add(one, mul(sx, sx)), mul(sz, sz))
    const lift = div(sub(sub(u, mul(sx, v)), mul(sz, w)), squared)
    const tx = add(v, mul(lift, sx))
    const ty = sub(u, lift)
    const tz = add(w, mul(lift, sz))
    const speed = add(sqrt(dot(tx, ty, tz, tx, ty, tz)), number(tinyAt, lane))
    const forward = read(row + lane, frictionAt)
    let mu = forward
    const directed = either(
      differ(forward, read(row + lane, frictionAt + wide)),
      differ(forward, read(row + lane, frictionAt + 2 * wide)),
    )
    if (anyOf(directed)) mu = choose(directed, directedMu(o, row, lane, tx, tz), forward)
    const drop = mul(mul(mul(h, mu), mul(f, sqrt(squared))), perKg)
    const change = atMost(div(drop, speed), one)
    v = sub(v, only(pushed, mul(change, tx)))
    u = sub(u, only(pushed, mul(change, ty)))
    w = sub(w, only(pushed, mul(change, tz)))
  }
  write(o, vx, v)
  write(o, vy, u)
  write(o, vz, w)
  write(o, x, add(read(o, x), mul(h, v)))
  write(o, y, add(read(o, y), mul(h, u)))
  write(o, z, add(read(o, z), mul(h, w)))
}

/** mu between the coefficients of the node's heading. */
@inline function directedMu(o: usize, row: usize, lane: usize, tx: Vec, tz: Vec): Vec {
  const one = number(oneAt, lane)
  const zero = sub(one, one)
  let hx = one
  let hz = zero
  const ahead = word(row + headingAt)
  if (ahead != 0) {
    const dx = sub(read(ahead + lane, x), read(o, x))
    const dz = sub(read(ahead + lane, z), read(o, z))
    const distance = add(sqrt(add(mul(dx, dx), mul(dz, dz))), number(tinyAt, lane))
    hx = div(dx, distance)
    hz = div(dz, distance)
  }
  const level = add(sqrt(add(mul(tx, tx), mul(tz, tz))), number(tinyAt, lane))
  const c = div(add(mul(tx, hx), mul(tz, hz)), level)
  const muF = choose(less(zero, c), read(row + lane, frictionAt), read(row + lane, frictionAt + wide))
  const lengthwise = mul(muF, c)
  const sideways = read(row + lane, frictionAt + 2 * wide)
  const rest = atLeast(sub(one, mul(c, c)), zero)
  return sqrt(add(mul(lengthwise, lengthwise), mul(mul(sideways, sideways), rest)))
}
