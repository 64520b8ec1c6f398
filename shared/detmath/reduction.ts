// Reduction of an angle to [-pi/4, pi/4]: x = n pi/2 + r, with r as a sum of two doubles and n modulo 4.
// Up to 2^19 pi/2 after fdlibm (e_rem_pio2.c; Sun Microsystems 1993, see NOTICE.txt): pi/2 is taken away in
// parts of 33 bits. Beyond, after Payne and Hanek (Radian reduction for trigonometric functions, 1983): only
// those digits of 2/pi are multiplied that can matter, in exact integer arithmetic.

import { exactProductTail } from './pairs.js'
import { highWord, lowWord, powerOfTwo } from './words.js'

/** What the last reduceByHalfPi left: r = reduced[0] + reduced[1]. */
export const reduced = new Float64Array(2)

function exponentOf(x: number): number {
  return (highWord(x) >> 20) & 0x7ff
}

/** Leaves x - n pi/2 in `reduced` and returns n modulo 4. x is finite. */
export function reduceByHalfPi(x: number): number {
  if (Math.abs(x) > 823549) return reduceHuge(x)
  const n = Math.round(x * 0.6366197723675814)
  let r = x - n * 1.5707963267341256
  let w = n * 6.077100506506192e-11
  let y = r - w
  const exponent = exponentOf(x)
  if (exponent - exponentOf(y) > 16) {
    let t = r
    w = n * 6.077100506303966e-11
    r = t - w
    w = n * 2.0222662487959506e-21 - (t - r - w)
    y = r - w
    if (exponent - exponentOf(y) > 49) {
      t = r
      w = n * 2.0222662487111665e-21
      r = t - w
      w = n * 8.4784276603689e-32 - (t - r - w)
      y = r - w
    }
  }
  reduced[0] = y
  reduced[1] = r - y - w
  return n & 3
}

/** 2/pi in digits of base 2^24, the first standing for 2^-24. */
// biome-ignore format: a table
const twoOverPi = [
  0xa2f983, 0x6e4e44, 0x1529fc, 0x2757d1, 0xf534dd, 0xc0db62, 0x95993c, 0x439041, 0xfe5163,
  0xabdebb, 0xc561b7, 0x246e3a, 0x424dd2, 0xe00649, 0x2eea09, 0xd1921c, 0xfe1deb, 0x1cb129,
  0xa73ee8, 0x8235f5, 0x2ebb44, 0x84e99c, 0x7026b4, 0x5f7e41, 0x3991d6, 0x398353, 0x39f49c,
  0x845f8b, 0xbdf928, 0x3b1ff8, 0x97ffde, 0x05980f, 0xef2f11, 0x8b5a0a, 0x6d1f6d, 0x367ecf,
  0x27cb09, 0xb74f46, 0x3f669e, 0x5fea2d, 0x7527ba, 0xc7ebe5, 0xf17b3d, 0x0739f7, 0x8a5292,
  0xea6bfb, 0x5fb11f, 0x8d5d08, 0x560330, 0x46fc7b, 0x6babf0, 0xcfbc20, 0x9af436, 0x1da9e3,
]

/** Fraction digits that are computed: 216 bits. Cancellation takes at most about 62 of them (Muller, 2006). */
const fractionDigits = 9
const base = 16777216
/** Digits of x * 2/pi modulo 2^24: [0] the integer part, [1] to [9] the fraction. */
const digits = new Float64Array(fractionDigits + 1)
const factor = new Float64Array(4)

/** |x| = M 2^q; writes M 2^(q mod 24) into `factor` (base 2^24, lowest first) and returns floor(q / 24). */
function splitFactor(x: number): number {
  const high = highWord(x)
  const q = ((high >> 20) & 0x7ff) - 1075
  const digit = Math.floor(q / 24)
  const up = powerOfTwo(q - 24 * digit)
  const low = lowWord(x)
  const parts = [
    low & 0xffffff,
    ((low >>> 24) | (high << 8)) & 0xffffff,
    ((high & 0xfffff) | 0x100000) >>> 16,
  ]
  let carry = 0
  for (let i = 0; i < 4; i++) {
    const sum = (parts[i] ?? 0) * up + carry
    carry = Math.floor(sum / base)
    factor[i] = sum - carry * base
  }
  return digit
}

function reduceHuge(x: number): number {
  const digit = splitFactor(x)
  // Each column is a sum of at most four products of 24 bits: below 2^51, so exact.
  let carry = 0
  for (let k = fractionDigits; k >= 0; k--) {
    let sum = carry
    for (let i = 0; i < 4; i++) {
      const j = digit + i + k
      if (j >= 1) sum += factor[i]! * twoOverPi[j - 1]!
    }
    carry = Math.floor(sum / base)
    digits[k] = sum - carry * base
  }
  let n = digits[0]! & 3
  // A fraction of one half and more belongs to the next multiple: r becomes fraction - 1.
  const negative = digits[1]! >= base / 2
  if (negative) {
    n = (n + 1) & 3
    let borrow = 0
    for (let k = fractionDigits; k >= 1; k--) {
      const rest = -digits[k]! - borrow
      borrow = rest < 0 ? 1 : 0
      digits[k] = rest + borrow * base
    }
  }
  fractionTimesHalfPi(negative !== x < 0)
  return x < 0 ? -n & 3 : n
}

/** Leaves the fraction in `digits` times pi/2, with its sign, in `reduced`. */
function fractionTimesHalfPi(negative: boolean): void {
  let first = 1
  while (first < fractionDigits && digits[first] === 0) first++
  // Pairs of digits are exact doubles; six digits are more than 120 bits of the fraction.
  const a = pairOfDigits(first)
  const rest = pairOfDigits(first + 2) + pairOfDigits(first + 4)
  const upper = a + rest
  const lower = rest - (upper - a)
  const halfPi = 1.5707963267948966
  const product = upper * halfPi
  const tail = exactProductTail(upper, halfPi, product) + (upper * 6.123233995736766e-17 + lower * halfPi)
  const y = product + tail
  const yTail = tail - (y - product)
  reduced[0] = negative ? -y : y
  reduced[1] = negative ? -yTail : yTail
}

function pairOfDigits(k: number): number {
  const upper = k <= fractionDigits ? digits[k]! : 0
  const lower = k + 1 <= fractionDigits ? digits[k + 1]! : 0
  return (upper * base + lower) * powerOfTwo(-24 * (k + 1))
}
