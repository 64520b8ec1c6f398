// The step of a node in space that is lower than the highest ground in some lane (../reference/space-nodes.ts).
// `o` is the node's record plus `lane`, the offset of the vector in hand.

import {
  columnsAt, contactDampingAt, contactStiffnessAt, dragAt, firstXAt, firstZAt, gravityAt, lastColumnAt, lastRowAt,
  lowColumnAt, lowRowAt, oneAt, perSpacingXAt, perSpacingZAt, rooted, rowsFirst, stepAt, tinyAt, topAt,
} from '../lanes/header'
import { cellOf } from './ground'
import {
  dot, frictionAt, fx, fy, fz, headingAt, material, number, vx, vy, vz, wide, word, x, y, z,
} from './record'
import {
  add, anyOf, atLeast, atMost, both, choose, differ, div, either, gather, less, Mask, mul, numberBytes,
  only, read, sqrt, sub, Vec, write,
} from './vector'

/** v + h (f / m + g) */
@inline function driven(v: Vec, h: Vec, force: Vec, perKg: Vec, gravity: Vec): Vec {
  return add(v, mul(h, add(mul(force, perKg), gravity)))
}

export function touchSpace(o: usize, row: usize, touching: usize, lane: usize): void {
  const perSpacingX = number(perSpacingXAt, lane)
  const perSpacingZ = number(perSpacingZAt, lane)
  const alongX = mul(sub(read(o, x), number(firstXAt, lane)), perSpacingX)
  const alongZ = mul(sub(read(o, z), number(firstZAt, lane)), perSpacingZ)
  const column = cellOf(alongX, number(lowColumnAt, lane), number(lastColumnAt, lane))
  const line = cellOf(alongZ, number(lowRowAt, lane), number(lastRowAt, lane))
  const columns = number(columnsAt, lane)
  const rows = word(rowsFirst) + (lane / numberBytes) * 4
  const corner = add(mul(line, columns), column)
  const opposite = add(corner, columns)
  const near = gather(rows, corner, 0)
  const far = gather(rows, opposite, 0)
  const nearRise = sub(gather(rows, corner, numberBytes), near)
  const farRise = sub(gather(rows, opposite, numberBytes), far)
  const u = sub(alongX, column)
  const w = sub(alongZ, line)
  const zero = sub(number(oneAt, lane), number(oneAt, lane))
  const nearHeight = add(near, mul(nearRise, u))
  const across = sub(add(far, mul(farRise, u)), nearHeight)
  const depth = sub(add(nearHeight, mul(across, w)), read(o, y))
  const below = less(read(o, y), number(topAt, lane))
  const inside = both(below, less(zero, depth))
  const sx = only(inside, mul(add(nearRise, mul(sub(farRise, nearRise), w)), perSpacingX))
  const sz = only(inside, mul(across, perSpacingZ))
  const power = word(rooted) != 0 ? mul(depth, sqrt(depth)) : depth
  const vx0 = read(o, vx)
  const vy0 = read(o, vy)
  const vz0 = read(o, vz)
  const rate = sub(add(mul(sx, vx0), mul(sz, vz0)), vy0)
  const law = add(number(contactStiffnessAt, lane), mul(number(contactDampingAt, lane), rate))
  const f = only(inside, atLeast(mul(power, law), zero))
  const pushed = less(zero, f)
  const h = number(stepAt, lane)
  const perKg = material(row, 0, 0, lane)
  const drag = number(dragAt, lane)
  const freeX = sub(read(o, fx), mul(drag, vx0))
  const freeY = sub(read(o, fy), mul(drag, vy0))
  const freeZ = sub(read(o, fz), mul(drag, vz0))
  write(o, fx, zero)
  write(o, fy, zero)
  write(o, fz, zero)
  write(o, vx, driven(vx0, h, sub(freeX, mul(f, sx)), perKg, number(gravityAt, lane)))
  write(o, vy, driven(vy0, h, choose(below, add(freeY, f), freeY), perKg, number(gravityAt + 1, lane)))
  write(o, vz, driven(vz0, h, sub(freeZ, mul(f, sz)), perKg, number(gravityAt + 2, lane)))
  if (touching != 0) write(touching, lane, only(pushed, number(oneAt, lane)))
  if (anyOf(pushed)) rub(o, row, lane, f, sx, sz, pushed)
  write(o, x, add(read(o, x), mul(h, read(o, vx))))
  write(o, y, add(read(o, y), mul(h, read(o, vy))))
  write(o, z, add(read(o, z), mul(h, read(o, vz))))
}

/** Friction of the lanes in `pushed`. */
@inline function rub(o: usize, row: usize, lane: usize, f: Vec, sx: Vec, sz: Vec, pushed: Mask): void {
  const one = number(oneAt, lane)
  const vx1 = read(o, vx)
  const vy1 = read(o, vy)
  const vz1 = read(o, vz)
  const squared = add(add(one, mul(sx, sx)), mul(sz, sz))
  const lift = div(sub(sub(vy1, mul(sx, vx1)), mul(sz, vz1)), squared)
  const tx = add(vx1, mul(lift, sx))
  const ty = sub(vy1, lift)
  const tz = add(vz1, mul(lift, sz))
  const speed = add(sqrt(dot(tx, ty, tz, tx, ty, tz)), number(tinyAt, lane))
  const forward = read(row + lane, frictionAt)
  const backward = read(row + lane, frictionAt + wide)
  const sideways = read(row + lane, frictionAt + 2 * wide)
  let mu = forward
  const directed = either(differ(forward, backward), differ(forward, sideways))
  if (anyOf(directed)) {
    mu = choose(directed, directedMu(o, row, lane, tx, tz, forward, backward, sideways, one), forward)
  }
  const drop = mul(mul(mul(number(stepAt, lane), mu), mul(f, sqrt(squared))), material(row, 0, 0, lane))
  const change = atMost(div(drop, speed), one)
  write(o, vx, sub(vx1, only(pushed, mul(change, tx))))
  write(o, vy, sub(vy1, only(pushed, mul(change, ty))))
  write(o, vz, sub(vz1, only(pushed, mul(change, tz))))
}

/** mu between the coefficients of the node's heading. */
@inline function directedMu(
  o: usize, row: usize, lane: usize, tx: Vec, tz: Vec, forward: Vec, backward: Vec, sideways: Vec, one: Vec,
): Vec {
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
  const lengthwise = mul(choose(less(zero, c), forward, backward), c)
  const rest = atLeast(sub(one, mul(c, c)), zero)
  return sqrt(add(mul(lengthwise, lengthwise), mul(mul(sideways, sideways), rest)))
}
