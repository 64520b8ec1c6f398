// One lane: plain double-precision numbers under the names of a vector, so that the kernel is written once. The meaning
// of every operation, to the bit, is that of the reference: comparisons are false for what is no number, and a
// clamp leaves such a number as it is.

export type Vec = f64
export type Mask = bool
export const numberBytes: usize = 8
export const vectorBytes: usize = 8
/** Lanes of one vector. */
export const vectorLanes: usize = 1

@inline export function read(at: usize, offset: usize): Vec {
  return f64.load(at + offset)
}
/** The same number in all lanes. */
@inline export function splat(at: usize, offset: usize): Vec {
  return f64.load(at + offset)
}
@inline export function write(at: usize, offset: usize, value: Vec): void {
  f64.store(at + offset, value)
}
/** The number in all lanes. */
@inline export function spread(a: f64): Vec {
  return a
}
@inline export function add(a: Vec, b: Vec): Vec {
  return a + b
}
@inline export function sub(a: Vec, b: Vec): Vec {
  return a - b
}
@inline export function mul(a: Vec, b: Vec): Vec {
  return a * b
}
@inline export function div(a: Vec, b: Vec): Vec {
  return a / b
}
@inline export function sqrt(a: Vec): Vec {
  return f64.sqrt(a)
}
@inline export function neg(a: Vec): Vec {
  return -a
}
@inline export function abs(a: Vec): Vec {
  return f64.abs(a)
}
@inline export function floor(a: Vec): Vec {
  return f64.floor(a)
}
/** limit < a ? limit : a */
@inline export function atMost(a: Vec, limit: Vec): Vec {
  return select<f64>(limit, a, limit < a)
}
/** a < limit ? limit : a */
@inline export function atLeast(a: Vec, limit: Vec): Vec {
  return select<f64>(limit, a, a < limit)
}
@inline export function less(a: Vec, b: Vec): Mask {
  return a < b
}
@inline export function differ(a: Vec, b: Vec): Mask {
  return a != b
}
@inline export function both(a: Mask, b: Mask): Mask {
  return <bool>(<i32>a & <i32>b)
}
@inline export function either(a: Mask, b: Mask): Mask {
  return <bool>(<i32>a | <i32>b)
}
@inline export function anyOf(a: Mask): bool {
  return a
}
/** One bit a lane. */
@inline export function bitsOf(a: Mask): u32 {
  return <u32>a
}
@inline export function choose(mask: Mask, yes: Vec, no: Vec): Vec {
  return select<f64>(yes, no, mask)
}
/** +0 where the mask is false. */
@inline export function only(mask: Mask, a: Vec): Vec {
  return select<f64>(a, 0, mask)
}

/** Added to a whole number below 2^31, this leaves the number in the lower half of the bits. */
const whole: f64 = 4503599627370496

/** Heights `offset` bytes behind the one numbered `cell` (a whole number), every lane in its own row of heights. */
@inline export function gather(rows: usize, cell: Vec, offset: usize): Vec {
  return f64.load(<usize>i32.load(rows) + (<usize>(<i32>i64.reinterpret_f64(cell + whole)) << 3) + offset)
}
