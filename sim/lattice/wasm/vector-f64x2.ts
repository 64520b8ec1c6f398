// Two lanes of double precision.
// The operations mean the same as those of vector-scalar.ts, to the bit.

export type Vec = v128
export type Mask = v128
export const numberBytes: usize = 8
export const vectorBytes: usize = 16
/** Lanes of one vector. */
export const vectorLanes: usize = 2

@inline export function read(at: usize, offset: usize): Vec {
  return v128.load(at + offset)
}
/** The same number in all lanes. */
@inline export function splat(at: usize, offset: usize): Vec {
  return v128.load64_splat(at + offset)
}
@inline export function write(at: usize, offset: usize, value: Vec): void {
  v128.store(at + offset, value)
}
/** The number in all lanes. */
@inline export function spread(a: f64): Vec {
  return f64x2.splat(a)
}
@inline export function add(a: Vec, b: Vec): Vec {
  return f64x2.add(a, b)
}
@inline export function sub(a: Vec, b: Vec): Vec {
  return f64x2.sub(a, b)
}
@inline export function mul(a: Vec, b: Vec): Vec {
  return f64x2.mul(a, b)
}
@inline export function div(a: Vec, b: Vec): Vec {
  return f64x2.div(a, b)
}
@inline export function sqrt(a: Vec): Vec {
  return f64x2.sqrt(a)
}
@inline export function neg(a: Vec): Vec {
  return f64x2.neg(a)
}
@inline export function abs(a: Vec): Vec {
  return f64x2.abs(a)
}
@inline export function floor(a: Vec): Vec {
  return f64x2.floor(a)
}
/** limit < a ? limit : a */
@inline export function atMost(a: Vec, limit: Vec): Vec {
  return f64x2.pmin(a, limit)
}
/** a < limit ? limit : a */
@inline export function atLeast(a: Vec, limit: Vec): Vec {
  return f64x2.pmax(a, limit)
}
@inline export function less(a: Vec, b: Vec): Mask {
  return f64x2.lt(a, b)
}
@inline export function differ(a: Vec, b: Vec): Mask {
  return f64x2.ne(a, b)
}
@inline export function both(a: Mask, b: Mask): Mask {
  return v128.and(a, b)
}
@inline export function either(a: Mask, b: Mask): Mask {
  return v128.or(a, b)
}
// (Compilers make better branches of a bit mask than of any_true.)
@inline export function anyOf(a: Mask): bool {
  return i64x2.bitmask(a) != 0
}
/** One bit a lane. */
@inline export function bitsOf(a: Mask): u32 {
  return <u32>i64x2.bitmask(a)
}
@inline export function choose(mask: Mask, yes: Vec, no: Vec): Vec {
  return v128.bitselect(yes, no, mask)
}
/** +0 where the mask is false. */
@inline export function only(mask: Mask, a: Vec): Vec {
  return v128.and(mask, a)
}

/** Added to a whole number below 2^31, this leaves the number in the lower half of the bits. */
const whole: f64 = 4503599627370496

/** Heights `offset` bytes behind the one numbered `cell` (a whole number), every lane in its own row of heights. */
@inline export function gather(rows: usize, cell: Vec, offset: usize): Vec {
  const at = i64x2.shl(f64x2.add(cell, f64x2.splat(whole)), 3)
  const first = <usize>(i32.load(rows) + i32x4.extract_lane(at, 0))
  const second = <usize>(i32.load(rows + 4) + i32x4.extract_lane(at, 2))
  return v128.load64_lane(second + offset, v128.load64_zero(first + offset), 1)
}
