// Four lanes of single precision.
// The operations mean the same as those of vector-scalar.ts, rounded to single precision.

export type Vec = v128
export type Mask = v128
export const numberBytes: usize = 4
export const vectorBytes: usize = 16
/** Lanes of one vector. */
export const vectorLanes: usize = 4

@inline export function read(at: usize, offset: usize): Vec {
  return v128.load(at + offset)
}
/** The same number in all lanes. */
@inline export function splat(at: usize, offset: usize): Vec {
  return v128.load32_splat(at + offset)
}
@inline export function write(at: usize, offset: usize, value: Vec): void {
  v128.store(at + offset, value)
}
/** The number in all lanes. */
@inline export function spread(a: f64): Vec {
  return f32x4.splat(<f32>a)
}
@inline export function add(a: Vec, b: Vec): Vec {
  return f32x4.add(a, b)
}
@inline export function sub(a: Vec, b: Vec): Vec {
  return f32x4.sub(a, b)
}
@inline export function mul(a: Vec, b: Vec): Vec {
  return f32x4.mul(a, b)
}
@inline export function div(a: Vec, b: Vec): Vec {
  return f32x4.div(a, b)
}
@inline export function sqrt(a: Vec): Vec {
  return f32x4.sqrt(a)
}
@inline export function neg(a: Vec): Vec {
  return f32x4.neg(a)
}
@inline export function abs(a: Vec): Vec {
  return f32x4.abs(a)
}
@inline export function floor(a: Vec): Vec {
  return f32x4.floor(a)
}
/** limit < a ? limit : a */
@inline export function atMost(a: Vec, limit: Vec): Vec {
  return f32x4.pmin(a, limit)
}
/** a < limit ? limit : a */
@inline export function atLeast(a: Vec, limit: Vec): Vec {
  return f32x4.pmax(a, limit)
}
@inline export function less(a: Vec, b: Vec): Mask {
  return f32x4.lt(a, b)
}
@inline export function differ(a: Vec, b: Vec): Mask {
  return f32x4.ne(a, b)
}
@inline export function both(a: Mask, b: Mask): Mask {
  return v128.and(a, b)
}
@inline export function either(a: Mask, b: Mask): Mask {
  return v128.or(a, b)
}
// (Compilers make better branches of a bit mask than of any_true.)
@inline export function anyOf(a: Mask): bool {
  return i32x4.bitmask(a) != 0
}
/** One bit a lane. */
@inline export function bitsOf(a: Mask): u32 {
  return <u32>i32x4.bitmask(a)
}
@inline export function choose(mask: Mask, yes: Vec, no: Vec): Vec {
  return v128.bitselect(yes, no, mask)
}
/** +0 where the mask is false. */
@inline export function only(mask: Mask, a: Vec): Vec {
  return v128.and(mask, a)
}

/** Heights `offset` bytes behind the one numbered `cell` (a whole number), every lane in its own row of heights. */
@inline export function gather(rows: usize, cell: Vec, offset: usize): Vec {
  const at = i32x4.shl(i32x4.trunc_sat_f32x4_s(cell), 2)
  const first = <usize>(i32.load(rows) + i32x4.extract_lane(at, 0))
  const second = <usize>(i32.load(rows + 4) + i32x4.extract_lane(at, 1))
  const third = <usize>(i32.load(rows + 8) + i32x4.extract_lane(at, 2))
  const fourth = <usize>(i32.load(rows + 12) + i32x4.extract_lane(at, 3))
  const two = v128.load32_lane(second + offset, v128.load32_zero(first + offset), 1)
  return v128.load32_lane(fourth + offset, v128.load32_lane(third + offset, two, 2), 3)
}
