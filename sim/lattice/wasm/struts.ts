// Strut forces. The formulas stand in ../reference/plane-struts.ts; here every lane is one replicate, and the order of
// all operations in a lane is that of the reference, so that every lane gives its bits.
//
// What is the same for all struts of a list is read from memory before the loop: a compiler of WebAssembly may
// move pure arithmetic into a loop, but not a load.

import {
  activeEnd, activeFirst, apartEnd, apartFirst, dragEnd, dragFirst, guidedEnd, guidedFirst, oneAt, passiveEnd,
  passiveFirst, perSixAt, twoAt,
} from '../lanes/header'
import {
  activeBytes, activeEnds, activeStrain, apartBytes, apartMaterial, dot, dragBytes, dragMaterial, from, fx, fy, fz,
  give, guidedBytes, guidedMaterial, guidedStrain, material, number, passiveBytes, passiveEnds, take, vx, vy, vz,
  wide, word, x, y, z,
} from './record'
import { dimensions, vectors } from './variant'
import {
  add, anyOf, atLeast, atMost, choose, div, less, mul, neg, only, read, sqrt, sub, Vec, vectorBytes,
} from './vector'

/** Adds scale * d to the force on a and takes it from the force on b. */
@inline function pull(a: usize, b: usize, lane: usize, scale: Vec, dx: Vec, dy: Vec, dz: Vec): void {
  const sx = mul(scale, dx)
  const sy = mul(scale, dy)
  if (dimensions == 3) {
    const sz = mul(scale, dz)
    give(a, fx, lane, sx)
    give(a, fy, lane, sy)
    give(a, fz, lane, sz)
    take(b, fx, lane, sx)
    take(b, fy, lane, sy)
    take(b, fz, lane, sz)
  } else {
    give(a, fx, lane, sx)
    give(a, fy, lane, sy)
    take(b, fx, lane, sx)
    take(b, fy, lane, sy)
  }
}

@inline function passive(p: usize, a: usize, b: usize, lane: usize, one: Vec): void {
  const dx = from(a, b, x, lane)
  const dy = from(a, b, y, lane)
  const dz = dimensions == 3 ? from(a, b, z, lane) : dx
  const q = dot(dx, dy, dz, dx, dy, dz)
  const perQ = div(one, q)
  const dvx = from(a, b, vx, lane)
  const dvy = from(a, b, vy, lane)
  const dvz = dimensions == 3 ? from(a, b, vz, lane) : dvx
  const along = dot(dx, dy, dz, dvx, dvy, dvz)
  const stiffness = material(p, 0, 0, lane)
  const stiffnessRest = material(p, 0, 1, lane)
  const damping = material(p, 0, 2, lane)
  const scale = add(stiffness, mul(sub(mul(damping, along), mul(stiffnessRest, sqrt(q))), perQ))
  pull(a, b, lane, scale, dx, dy, dz)
}

@inline function onePassive(p: usize, one: Vec): void {
  const a = word(p + passiveEnds)
  const b = word(p + passiveEnds + 4)
  passive(p, a, b, 0, one)
  if (vectors > 1) passive(p, a, b, vectorBytes, one)
}

/** Two struts a turn, here and in addActive(): a little less is spent on turning. */
export function addPassive(): void {
  const one = number(oneAt, 0)
  const end = word(passiveEnd)
  let p = word(passiveFirst)
  for (; p + passiveBytes < end; p += 2 * passiveBytes) {
    onePassive(p, one)
    onePassive(p + passiveBytes, one)
  }
  if (p < end) onePassive(p, one)
}

/**
 * T / |d| scaled down to the power that the strut has, where T dL/dt is more. Mostly it is not, in any lane: then the
 * division is spared.
 */
@inline export function withinPower(held: Vec, along: Vec, most: Vec): Vec {
  const power = mul(neg(held), along)
  const over = less(most, power)
  return anyOf(over) ? choose(over, mul(held, div(most, power)), held) : held
}

@inline function active(p: usize, a: usize, b: usize, group: usize, lane: usize, one: Vec): void {
  const dx = from(a, b, x, lane)
  const dy = from(a, b, y, lane)
  const dz = dimensions == 3 ? from(a, b, z, lane) : dx
  const q = dot(dx, dy, dz, dx, dy, dz)
  const perQ = div(one, q)
  const perLength = mul(sqrt(q), perQ)
  const dvx = from(a, b, vx, lane)
  const dvy = from(a, b, vy, lane)
  const dvz = dimensions == 3 ? from(a, b, vz, lane) : dvx
  const along = dot(dx, dy, dz, dvx, dvy, dvz)
  const drive = add(
    mul(read(group, lane), read(p, activeStrain + lane)),
    mul(read(group, wide + lane), read(p, activeStrain + wide + lane)),
  )
  const commanded = mul(material(p, 0, 1, lane), add(one, drive))
  const most = mul(material(p, 0, 3, lane), perLength)
  const stiffness = material(p, 0, 0, lane)
  const damping = material(p, 0, 2, lane)
  const free = add(sub(stiffness, mul(commanded, perLength)), mul(mul(damping, along), perQ))
  const held = atMost(atLeast(free, neg(most)), most)
  pull(a, b, lane, withinPower(held, along, material(p, 0, 4, lane)), dx, dy, dz)
}

@inline function oneActive(p: usize, one: Vec): void {
  const a = word(p + activeEnds)
  const b = word(p + activeEnds + 4)
  const group = word(p + activeEnds + 8)
  active(p, a, b, group, 0, one)
  if (vectors > 1) active(p, a, b, group, vectorBytes, one)
}

export function addActive(): void {
  const one = number(oneAt, 0)
  const end = word(activeEnd)
  let p = word(activeFirst)
  for (; p + activeBytes < end; p += 2 * activeBytes) {
    oneActive(p, one)
    oneActive(p + activeBytes, one)
  }
  if (p < end) oneActive(p, one)
}

@inline function guided(p: usize, a: usize, b: usize, lane: usize, one: Vec): void {
  const dx = from(a, b, x, lane)
  const dy = from(a, b, y, lane)
  const dz = dimensions == 3 ? from(a, b, z, lane) : dx
  const q = dot(dx, dy, dz, dx, dy, dz)
  const perQ = div(one, q)
  const perLength = mul(sqrt(q), perQ)
  const dvx = from(a, b, vx, lane)
  const dvy = from(a, b, vy, lane)
  const dvz = dimensions == 3 ? from(a, b, vz, lane) : dvx
  const along = dot(dx, dy, dz, dvx, dvy, dvz)
  const strain = read(p, guidedStrain + 5 * wide + lane)
  const commanded = mul(material(p, guidedMaterial, 1, lane), add(one, strain))
  const most = mul(material(p, guidedMaterial, 3, lane), perLength)
  const stiffness = material(p, guidedMaterial, 0, lane)
  const damping = material(p, guidedMaterial, 2, lane)
  const free = add(sub(stiffness, mul(commanded, perLength)), mul(mul(damping, along), perQ))
  const held = atMost(atLeast(free, neg(most)), most)
  pull(a, b, lane, withinPower(held, along, material(p, guidedMaterial, 4, lane)), dx, dy, dz)
}

export function addGuided(): void {
  const one = number(oneAt, 0)
  const end = word(guidedEnd)
  for (let p = word(guidedFirst); p < end; p += guidedBytes) {
    const a = word(p)
    const b = word(p + 4)
    guided(p, a, b, 0, one)
    if (vectors > 1) guided(p, a, b, vectorBytes, one)
  }
}

/** One component of the drag of a rod: sixth * (normal * u - along * d). */
@inline function resist(a: usize, c: usize, lane: usize, sixth: Vec, normal: Vec, u: Vec, along: Vec, d: Vec): void {
  take(a, c, lane, mul(sixth, sub(mul(normal, u), mul(along, d))))
}
/** 2 va + vb of component c. */
@inline function firstHeavy(a: usize, b: usize, c: usize, lane: usize, two: Vec): Vec {
  return add(mul(two, read(a, c + lane)), read(b, c + lane))
}
/** va + 2 vb of component c. */
@inline function secondHeavy(a: usize, b: usize, c: usize, lane: usize, two: Vec): Vec {
  return add(read(a, c + lane), mul(two, read(b, c + lane)))
}

@inline function drag(p: usize, a: usize, b: usize, lane: usize, two: Vec, perSix: Vec): void {
  const dx = from(a, b, x, lane)
  const dy = from(a, b, y, lane)
  const dz = dimensions == 3 ? from(a, b, z, lane) : dx
  const uax = firstHeavy(a, b, vx, lane, two)
  const uay = firstHeavy(a, b, vy, lane, two)
  const uaz = dimensions == 3 ? firstHeavy(a, b, vz, lane, two) : uax
  const ubx = secondHeavy(a, b, vx, lane, two)
  const uby = secondHeavy(a, b, vy, lane, two)
  const ubz = dimensions == 3 ? secondHeavy(a, b, vz, lane, two) : ubx
  const q = dot(dx, dy, dz, dx, dy, dz)
  const sixth = mul(sqrt(q), perSix)
  const normal = material(p, dragMaterial, 0, lane)
  const perQ = div(material(p, dragMaterial, 1, lane), q)
  const alongA = mul(perQ, dot(uax, uay, uaz, dx, dy, dz))
  const alongB = mul(perQ, dot(ubx, uby, ubz, dx, dy, dz))
  resist(a, fx, lane, sixth, normal, uax, alongA, dx)
  resist(a, fy, lane, sixth, normal, uay, alongA, dy)
  if (dimensions == 3) resist(a, fz, lane, sixth, normal, uaz, alongA, dz)
  resist(b, fx, lane, sixth, normal, ubx, alongB, dx)
  resist(b, fy, lane, sixth, normal, uby, alongB, dy)
  if (dimensions == 3) resist(b, fz, lane, sixth, normal, ubz, alongB, dz)
}

export function addDrag(): void {
  const two = number(twoAt, 0)
  const perSix = number(perSixAt, 0)
  const end = word(dragEnd)
  for (let p = word(dragFirst); p < end; p += dragBytes) {
    const a = word(p)
    const b = word(p + 4)
    drag(p, a, b, 0, two, perSix)
    if (vectors > 1) drag(p, a, b, vectorBytes, two, perSix)
  }
}

@inline function apart(p: usize, a: usize, b: usize, lane: usize, one: Vec): void {
  const dx = from(a, b, x, lane)
  const dy = from(a, b, y, lane)
  const dz = dimensions == 3 ? from(a, b, z, lane) : dx
  const q = dot(dx, dy, dz, dx, dy, dz)
  const perLength = mul(sqrt(q), div(one, q))
  const stiffness = material(p, apartMaterial, 0, lane)
  const stiffnessLeast = material(p, apartMaterial, 1, lane)
  const zero = sub(one, one)
  pull(a, b, lane, atMost(sub(stiffness, mul(stiffnessLeast, perLength)), zero), dx, dy, dz)
}

export function addApart(): void {
  const one = number(oneAt, 0)
  const end = word(apartEnd)
  for (let p = word(apartFirst); p < end; p += apartBytes) {
    const a = word(p)
    const b = word(p + 4)
    apart(p, a, b, 0, one)
    if (vectors > 1) apart(p, a, b, vectorBytes, one)
  }
}
