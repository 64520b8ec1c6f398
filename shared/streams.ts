// Named streams of random numbers. A stream is a place in the output of Philox4x32-10, a counter-based
// generator: word i of a stream is a pure function of (seed, purpose, a, b, c, i). Nothing is shared between
// streams, so who draws first never matters. (Salmon, Moraes, Dror, Shaw: Parallel random numbers: as easy as
// 1, 2, 3. SC'11, 2011.)
//
//   key      first two words of Philox4x32-10(counter = [purpose, seed low 32, seed high 21, 0x534b5259], key = 0)
//   counter  [block, a, b, c]; the four words of a block are used in order, then block + 1
//
// The way numbers are made of words is part of a search's definition: changing it changes every search.

import { check } from './check.js'
import { log } from './detmath/exponential.js'
import { cos, sin } from './detmath/trigonometry.js'

/** A named stream of random numbers, counter-based (Philox4x32-10). */
export interface Stream {
  /** Next 32-bit word, 0 to 2^32 - 1. */
  word(): number
  /** Uniform in [0, 1), 53 bits. */
  uniform(): number
  /** Unbiased integer, 0 <= n < bound, bound up to 2^32. */
  below(bound: number): number
  /** Standard normal. */
  normal(): number
  /** True with probability numerator / denominator (integers). */
  chance(numerator: number, denominator: number): boolean
  /** A permutation of 0 .. length - 1. */
  permutation(length: number): Int32Array
  /** Index drawn with probability proportional to weights (finite, >= 0, not all 0). */
  weighted(weights: ArrayLike<number>): number
}

/** What streams are for. Numbers enter every search: add rows, never renumber. */
export const purposes = {
  /** A founder's genome: (island, number). */
  founder: 1,
  /** A child's parents and variation: (island, number). */
  birth: 2,
  /** What a method decides at a commit: (island, commit). */
  commit: 3,
  /** Everything random about a simulation: see conditions.ts. */
  condition: 4,
  emigrants: 5,
  arrivals: 6,
  topology: 7,
  /** Which results are simulated a second time. */
  confirm: 8,
  /** Trials of `check`. */
  check: 9,
  /** Hostile weather of tests. */
  weather: 10,
  /** Conditions that selection has never seen. */
  retest: 11,
  spare: 12,
} as const
export type Purpose = keyof typeof purposes

const two32 = 2 ** 32

/** High 32 bits (signed) of the product of two unsigned 32-bit numbers, from 16-bit halves. */
function highProduct(x: number, y: number): number {
  const xl = x & 0xffff
  const xh = x >>> 16
  const yl = y & 0xffff
  const yh = y >>> 16
  const t = (Math.imul(xh, yl) + (Math.imul(xl, yl) >>> 16)) | 0
  const u = (Math.imul(xl, yh) + (t & 0xffff)) | 0
  return (Math.imul(xh, yh) + (t >>> 16) + (u >>> 16)) | 0
}

const scratch = new Int32Array(4)

/** One block of Philox4x32 into `scratch`, as signed words (small integers: nothing is allocated). */
function block(c0: number, c1: number, c2: number, c3: number, k0: number, k1: number, rounds: number): void {
  for (let round = 0; round < rounds; round++) {
    const high0 = highProduct(c0, 0xd2511f53)
    const low0 = Math.imul(c0, 0xd2511f53)
    const high1 = highProduct(c2, 0xcd9e8d57)
    const low1 = Math.imul(c2, 0xcd9e8d57)
    c0 = high1 ^ c1 ^ k0
    c1 = low1
    c2 = high0 ^ c3 ^ k1
    c3 = low0
    k0 = (k0 + 0x9e3779b9) | 0
    k1 = (k1 + 0xbb67ae85) | 0
  }
  scratch[0] = c0
  scratch[1] = c1
  scratch[2] = c2
  scratch[3] = c3
}

/** Philox4x32: four words out of a counter of four words and a key of two. Pure; `out` is written in order. */
export function philox4x32(
  counter: ArrayLike<number>,
  key: ArrayLike<number>,
  out: Uint32Array,
  rounds = 10,
): void {
  check(
    counter.length === 4 && key.length === 2 && out.length >= 4,
    'Philox4x32 takes 4 + 2 words and gives 4',
  )
  block(counter[0]! | 0, counter[1]! | 0, counter[2]! | 0, counter[3]! | 0, key[0]! | 0, key[1]! | 0, rounds)
  out.set(scratch)
}

class PhiloxStream implements Stream {
  // All words are kept as signed 32-bit integers, which the engine stores without allocation.
  private readonly k0: number
  private readonly k1: number
  private readonly a: number
  private readonly b: number
  private readonly c: number
  private next: number
  private w0 = 0
  private w1 = 0
  private w2 = 0
  private w3 = 0
  private used = 4
  private kept = 0
  private hasKept = false

  constructor(k0: number, k1: number, next: number, a: number, b: number, c: number) {
    this.k0 = k0
    this.k1 = k1
    this.next = next
    this.a = a
    this.b = b
    this.c = c
  }

  /** Next word, signed. */
  private draw(): number {
    switch (this.used++) {
      case 1:
        return this.w1
      case 2:
        return this.w2
      case 3:
        return this.w3
      default:
        block(this.next, this.a, this.b, this.c, this.k0, this.k1, 10)
        this.next = (this.next + 1) | 0
        this.w0 = scratch[0]!
        this.w1 = scratch[1]!
        this.w2 = scratch[2]!
        this.w3 = scratch[3]!
        this.used = 1
        return this.w0
    }
  }

  word(): number {
    return this.draw() >>> 0
  }

  uniform(): number {
    const high = this.draw() >>> 5
    const low = this.draw() >>> 6
    return (high * 67108864 + low) / 9007199254740992
  }

  /** Multiply-shift with rejection (Lemire: Fast random integer generation in an interval, 2019). */
  below(bound: number): number {
    check(Number.isInteger(bound) && bound >= 1 && bound <= two32, 'a bound is an integer from 1 to 2^32')
    if (bound === two32) return this.word()
    let x = this.draw()
    let low = Math.imul(x, bound) >>> 0
    if (low < bound) {
      const threshold = (two32 - bound) % bound
      while (low < threshold) {
        x = this.draw()
        low = Math.imul(x, bound) >>> 0
      }
    }
    return highProduct(x, bound) >>> 0
  }

  /** Box and Muller (A note on the generation of random normal deviates, 1958): cosine first, then sine. */
  normal(): number {
    if (this.hasKept) {
      this.hasKept = false
      return this.kept
    }
    const radius = Math.sqrt(-2 * log((this.word() + 0.5) / two32))
    const angle = (2 * Math.PI * (this.word() + 0.5)) / two32
    this.kept = radius * sin(angle)
    this.hasKept = true
    return radius * cos(angle)
  }

  chance(numerator: number, denominator: number): boolean {
    check(
      Number.isInteger(numerator) && numerator >= 0 && numerator <= denominator,
      'a probability is a ratio of integers from 0 to 1',
    )
    return this.below(denominator) < numerator
  }

  /** Fisher and Yates, from the end (Durstenfeld: Algorithm 235, 1964). */
  permutation(length: number): Int32Array {
    const order = new Int32Array(length)
    for (let i = 0; i < length; i++) order[i] = i
    for (let i = length - 1; i > 0; i--) {
      const j = this.below(i + 1)
      const moved = order[i]!
      order[i] = order[j]!
      order[j] = moved
    }
    return order
  }

  weighted(weights: ArrayLike<number>): number {
    let total = 0
    for (let i = 0; i < weights.length; i++) {
      check(weights[i]! >= 0, 'a weight is at least 0')
      total += weights[i]!
    }
    check(total > 0 && total < Infinity, 'weights have a finite sum above 0')
    const mark = this.uniform() * total
    let sum = 0
    let last = 0
    for (let i = 0; i < weights.length; i++) {
      if (weights[i] === 0) continue
      sum += weights[i]!
      if (mark < sum) return i
      last = i
    }
    return last // uniform() * total can round up to the total
  }
}

/** Keys of one seed: two words a purpose, made when first asked for. */
interface SeedKeys {
  readonly seed: number
  readonly made: Uint8Array
  readonly words: Int32Array
}
const seedsKept = 64
const purposeNumbers = 1 + Math.max(...Object.values(purposes))
const keysOfSeeds = new Map<number, SeedKeys>()
let latest: SeedKeys | undefined

function keysOf(seed: number): SeedKeys {
  if (latest !== undefined && latest.seed === seed) return latest
  let keys = keysOfSeeds.get(seed)
  if (keys === undefined) {
    check(Number.isSafeInteger(seed) && seed >= 0, 'a seed is an integer from 0 to 2^53 - 1')
    if (keysOfSeeds.size >= seedsKept) keysOfSeeds.clear()
    keys = { seed, made: new Uint8Array(purposeNumbers), words: new Int32Array(2 * purposeNumbers) }
    keysOfSeeds.set(seed, keys)
  }
  latest = keys
  return keys
}

/**
 * The stream of this seed, purpose and ids (each 0 to 2^32 - 1), at its beginning. The same arguments always
 * give the same numbers; any difference gives an independent stream.
 */
export function stream(seed: number, purpose: Purpose, a = 0, b = 0, c = 0): Stream {
  check(a >>> 0 === a && b >>> 0 === b && c >>> 0 === c, 'ids of a stream are unsigned 32-bit integers')
  const number = purposes[purpose]
  const keys = keysOf(seed)
  if (keys.made[number] === 0) {
    block(number, seed | 0, Math.floor(seed / two32), 0x534b5259, 0, 0, 10)
    keys.words[2 * number] = scratch[0]!
    keys.words[2 * number + 1] = scratch[1]!
    keys.made[number] = 1
  }
  return new PhiloxStream(keys.words[2 * number]!, keys.words[2 * number + 1]!, 0, a | 0, b | 0, c | 0)
}

/** The stream that begins at this counter under this key: for checks against published vectors. */
export function streamAt(counter: ArrayLike<number>, key: ArrayLike<number>): Stream {
  check(counter.length === 4 && key.length === 2, 'Philox4x32 takes 4 + 2 words')
  return new PhiloxStream(
    key[0]! | 0,
    key[1]! | 0,
    counter[0]! | 0,
    counter[1]! | 0,
    counter[2]! | 0,
    counter[3]! | 0,
  )
}
