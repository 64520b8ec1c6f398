// The two 32-bit words of a double: how the functions of this folder read and set exponent bits. A view on
// shared memory gives the same bits on every processor; which half comes first is found out at load.

const double = new Float64Array(1)
const words = new Uint32Array(double.buffer)
double[0] = 1 // bits 3ff00000 00000000
const high = words[1] === 0x3ff00000 ? 1 : 0
const low = 1 - high

/** Sign, exponent and first 20 bits of the fraction, as a signed 32-bit integer (negative for x < 0 and -0). */
export function highWord(x: number): number {
  double[0] = x
  return words[high]! | 0
}

/** Last 32 bits of the fraction, 0 to 2^32 - 1. */
export function lowWord(x: number): number {
  double[0] = x
  return words[low]!
}

/** The double with these two words. */
export function fromWords(highBits: number, lowBits: number): number {
  words[high] = highBits
  words[low] = lowBits
  return double[0]!
}

/** x with its high word replaced. */
export function withHighWord(x: number, highBits: number): number {
  double[0] = x
  words[high] = highBits
  return double[0]!
}

/** x with the last 32 bits of its fraction cleared: 21 significant bits, so that products of two are exact. */
export function withoutLowWord(x: number): number {
  double[0] = x
  words[low] = 0
  return double[0]!
}

/** 2^n for n in [-1022, 1023], exact. */
export function powerOfTwo(n: number): number {
  return fromWords((n + 1023) << 20, 0)
}

const most = powerOfTwo(1023)
/** 2^-969 = 2^-1022 * 2^53: steps of this size leave the only rounding (to a subnormal) to the last step. */
const step = powerOfTwo(-969)

/** x * 2^n, rounded once, for any integer n (method of fdlibm s_scalbn.c). */
export function scaleByPowerOfTwo(x: number, n: number): number {
  if (n > 1023) {
    if (n <= 2046) return x * most * powerOfTwo(n - 1023)
    return x * most * most * powerOfTwo(Math.min(n - 2046, 1023))
  }
  if (n >= -1022) return x * powerOfTwo(n)
  if (n >= -1991) return x * step * powerOfTwo(n + 969)
  return x * step * step * powerOfTwo(Math.max(n + 1938, -1022))
}
