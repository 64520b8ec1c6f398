// Areas (2-D) and volumes (3-D) that resist being squeezed; formulas: ../reference/fills.ts.

import { fillEnd, fillFirst, halfAt, perSixAt } from '../lanes/header'
import { fillBytes, fillMaterial, from, fx, fy, fz, give, material, number, take, word, x, y, z } from './record'
import { dimensions, vectors } from './variant'
import { add, mul, neg, sub, Vec, vectorBytes } from './vector'

@inline function area(p: usize, i: usize, j: usize, k: usize, lane: usize, half: Vec): void {
  const e1x = from(i, j, x, lane)
  const e1y = from(i, j, y, lane)
  const e2x = from(i, k, x, lane)
  const e2y = from(i, k, y, lane)
  const size = mul(half, sub(mul(e1x, e2y), mul(e1y, e2x)))
  const stiffness = material(p, fillMaterial, 1, lane)
  const scale = mul(neg(half), mul(stiffness, sub(size, material(p, fillMaterial, 0, lane))))
  const fjx = mul(scale, e2y)
  const fjy = neg(mul(scale, e2x))
  const fkx = neg(mul(scale, e1y))
  const fky = mul(scale, e1x)
  take(i, fx, lane, add(fjx, fkx))
  take(i, fy, lane, add(fjy, fky))
  give(j, fx, lane, fjx)
  give(j, fy, lane, fjy)
  give(k, fx, lane, fkx)
  give(k, fy, lane, fky)
}

/** a b - c d */
@inline function cross(a: Vec, b: Vec, c: Vec, d: Vec): Vec {
  return sub(mul(a, b), mul(c, d))
}
/** Minus the sum of three forces on component c of node i. */
@inline function answer(i: usize, c: usize, lane: usize, f1: Vec, f2: Vec, f3: Vec): void {
  take(i, c, lane, add(add(f1, f2), f3))
}

@inline function volume(p: usize, i: usize, j: usize, k: usize, l: usize, lane: usize, perSix: Vec): void {
  const e1x = from(i, j, x, lane)
  const e1y = from(i, j, y, lane)
  const e1z = from(i, j, z, lane)
  const e2x = from(i, k, x, lane)
  const e2y = from(i, k, y, lane)
  const e2z = from(i, k, z, lane)
  const e3x = from(i, l, x, lane)
  const e3y = from(i, l, y, lane)
  const e3z = from(i, l, z, lane)
  const c1x = cross(e2y, e3z, e2z, e3y)
  const c1y = cross(e2z, e3x, e2x, e3z)
  const c1z = cross(e2x, e3y, e2y, e3x)
  const size = mul(add(add(mul(e1x, c1x), mul(e1y, c1y)), mul(e1z, c1z)), perSix)
  const stiffness = material(p, fillMaterial, 1, lane)
  const sixth = mul(neg(mul(stiffness, sub(size, material(p, fillMaterial, 0, lane)))), perSix)
  const f1x = mul(sixth, c1x)
  const f1y = mul(sixth, c1y)
  const f1z = mul(sixth, c1z)
  const f2x = mul(sixth, cross(e3y, e1z, e3z, e1y))
  const f2y = mul(sixth, cross(e3z, e1x, e3x, e1z))
  const f2z = mul(sixth, cross(e3x, e1y, e3y, e1x))
  const f3x = mul(sixth, cross(e1y, e2z, e1z, e2y))
  const f3y = mul(sixth, cross(e1z, e2x, e1x, e2z))
  const f3z = mul(sixth, cross(e1x, e2y, e1y, e2x))
  answer(i, fx, lane, f1x, f2x, f3x)
  answer(i, fy, lane, f1y, f2y, f3y)
  answer(i, fz, lane, f1z, f2z, f3z)
  give(j, fx, lane, f1x)
  give(j, fy, lane, f1y)
  give(j, fz, lane, f1z)
  give(k, fx, lane, f2x)
  give(k, fy, lane, f2y)
  give(k, fz, lane, f2z)
  give(l, fx, lane, f3x)
  give(l, fy, lane, f3y)
  give(l, fz, lane, f3z)
}

export function addFills(): void {
  const factor = dimensions == 3 ? number(perSixAt, 0) : number(halfAt, 0)
  const end = word(fillEnd)
  for (let p = word(fillFirst); p < end; p += fillBytes) {
    const i = word(p)
    const j = word(p + 4)
    const k = word(p + 8)
    if (dimensions == 3) {
      const l = word(p + 12)
      volume(p, i, j, k, l, 0, factor)
      if (vectors > 1) volume(p, i, j, k, l, vectorBytes, factor)
    } else {
      area(p, i, j, k, 0, factor)
      if (vectors > 1) area(p, i, j, k, vectorBytes, factor)
    }
  }
}
