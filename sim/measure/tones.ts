// Amplitude and phase of a recorded signal at frequencies that are known, on a bin or not: the least-squares fit of
//   x(t) = mean + sum over tones of  A sin(2 pi (f t + phase)),   t = 0 at the first sample.
// The sums x cos, x sin that it needs are Goertzel's (An algorithm for the evaluation of finite trigonometric series,
// 1958, from memory; for any frequency: Sysel and Rajmic, Goertzel algorithm generalized to non-integer multiples of
// fundamental frequency, 2012, from memory), taken in blocks, because the error of the plain recurrence grows with the square
// of the length (Gentleman 1969, from memory). The matrix of the fit takes away what a mean and the tones leak into each other;
// for a single tone on a bin the result is Goertzel's own.

import { atan2 } from '../../shared/detmath/inverse-trigonometry.js'
import { cos, sin } from '../../shared/detmath/trigonometry.js'
import { refuse } from '../../shared/refusals.js'
import { factorise } from './semidefinite.js'

/** Samples after which Goertzel's recurrence starts anew. */
const blockLength = 256
/** Tones and mean that are more alike than this over the record are not told apart: rounding would show. */
const leastApart = 1e-8
const turn = 2 * Math.PI

export interface Tone {
  readonly frequencyHz: number
  /** In the units of the signal; half of peak to peak. */
  readonly amplitude: number
  /** In [-1/2, 1/2]: the tone is A sin(2 pi (f t + phaseTurns)), t from the first sample. */
  readonly phaseTurns: number
}

export interface TonesFit {
  readonly tones: readonly Tone[]
  readonly mean: number
  /** Root mean square of what the fit leaves. */
  readonly residualRms: number
}

/** Sum of x_n e^(-i w n), by Goertzel's recurrence in blocks. `angle` = w in radians a sample. */
export function goertzelSum(samples: ArrayLike<number>, angle: number): { real: number; imaginary: number } {
  const twoCos = 2 * cos(angle)
  const s = sin(angle)
  const c = cos(angle)
  let real = 0
  let imaginary = 0
  for (let first = 0; first < samples.length; first += blockLength) {
    const last = Math.min(first + blockLength, samples.length)
    let before = 0
    let now = 0
    for (let n = first; n < last; n++) {
      const next = samples[n]! + twoCos * now - before
      before = now
      now = next
    }
    // The block's sum, times e^(iw (length - 1)): now - e^(-iw) before.
    const blockReal = now - c * before
    const blockImaginary = s * before
    const turned = angle * (last - 1)
    const [sine, cosine] = [sin(turned), cos(turned)]
    real += blockReal * cosine + blockImaginary * sine
    imaginary += blockImaginary * cosine - blockReal * sine
  }
  return { real, imaginary }
}

/**
 * Mean, amplitudes and phases of all tones named, together. Refuses ('impossible-value'): frequencies not between 0 and
 * half the sampling rate, and records too short to tell the tones (and the mean) apart.
 */
export function fitTones(
  samples: ArrayLike<number>,
  sampleSeconds: number,
  frequenciesHz: readonly number[],
): TonesFit {
  const { angles, coefficients } = solve(samples, sampleSeconds, frequenciesHz)
  return {
    mean: coefficients[0]!,
    tones: frequenciesHz.map((frequencyHz, i) => toneOf(frequencyHz, coefficients, i)),
    residualRms: residualRms(samples, angles, coefficients),
  }
}

/** Amplitude and phase at one frequency; refuses what fitTones refuses. */
export function toneAt(samples: ArrayLike<number>, sampleSeconds: number, frequencyHz: number): Tone {
  return toneOf(frequencyHz, solve(samples, sampleSeconds, [frequencyHz]).coefficients, 0)
}

/** Mean, then a cosine and a sine part for each tone. */
function solve(samples: ArrayLike<number>, sampleSeconds: number, frequenciesHz: readonly number[]) {
  const count = samples.length
  const angles = frequenciesHz.map((f) => turn * f * sampleSeconds)
  for (const [i, f] of frequenciesHz.entries()) {
    const found = `found ${f} Hz with ${1 / sampleSeconds} samples a second`
    const sound = angles[i]! > 0 && angles[i]! < Math.PI
    demand(sound, `frequenciesHz[${i}]`, `${found}, expected a frequency above 0 and below half of that.`)
  }
  const size = 1 + 2 * angles.length
  demand(count >= size, 'samples', `found ${count} samples, expected at least ${size}.`)
  const solver = factorise(gramOf(angles, count), size)
  const apart =
    `found ${count} samples over ${count * sampleSeconds} s, too few to tell ${frequenciesHz.join(', ')} Hz ` +
    'and the mean apart; expected a record of at least a good part of one period and of one beat.'
  demand(solver.rank === size && solver.leastPivot > leastApart, 'samples', apart)
  const right = new Float64Array(size)
  for (let n = 0; n < count; n++) right[0]! += samples[n]!
  for (const [i, angle] of angles.entries()) {
    const { real, imaginary } = goertzelSum(samples, angle)
    right[1 + 2 * i] = real
    right[2 + 2 * i] = -imaginary
  }
  return { angles, coefficients: solver.solve(right) }
}

function toneOf(frequencyHz: number, coefficients: Float64Array, i: number): Tone {
  const [c, s] = [coefficients[1 + 2 * i]!, coefficients[2 + 2 * i]!]
  return { frequencyHz, amplitude: Math.sqrt(c * c + s * s), phaseTurns: atan2(c, s) / turn }
}

/** Sums of products of 1, cos w1 n, sin w1 n, cos w2 n, ... over n = 0 .. count - 1, in closed form. */
function gramOf(angles: readonly number[], count: number): Float64Array {
  const size = 1 + 2 * angles.length
  const gram = new Float64Array(size * size)
  const put = (i: number, j: number, value: number) => {
    gram[i * size + j] = value
    gram[j * size + i] = value
  }
  put(0, 0, count)
  for (const [i, a] of angles.entries()) {
    const alone = dirichlet(a, count)
    put(0, 1 + 2 * i, alone.real)
    put(0, 2 + 2 * i, alone.imaginary)
    for (const [j, b] of angles.entries()) {
      const sum = dirichlet(a + b, count)
      const difference = dirichlet(a - b, count)
      put(1 + 2 * i, 1 + 2 * j, (difference.real + sum.real) / 2)
      put(2 + 2 * i, 2 + 2 * j, (difference.real - sum.real) / 2)
      // cos a sin b = (sin(a + b) - sin(a - b)) / 2.
      put(1 + 2 * i, 2 + 2 * j, (sum.imaginary - difference.imaginary) / 2)
    }
  }
  return gram
}

/** Sum of e^(i angle n): sin(count angle / 2) / sin(angle / 2), turned by (count - 1) angle / 2. */
function dirichlet(angle: number, count: number): { real: number; imaginary: number } {
  const half = angle / 2
  const below = sin(half)
  const size = Math.abs(below) < 1e-300 ? count : sin(count * half) / below
  const turned = (count - 1) * half
  return { real: size * cos(turned), imaginary: size * sin(turned) }
}

function residualRms(samples: ArrayLike<number>, angles: readonly number[], fit: Float64Array): number {
  let squares = 0
  for (let n = 0; n < samples.length; n++) {
    let left = samples[n]! - fit[0]!
    for (const [i, angle] of angles.entries()) {
      left -= fit[1 + 2 * i]! * cos(angle * n) + fit[2 + 2 * i]! * sin(angle * n)
    }
    squares += left * left
  }
  return Math.sqrt(squares / samples.length)
}

function demand(truth: boolean, field: string, detail: string): asserts truth {
  if (!truth) throw refuse('impossible-value', { detail, where: { field } })
}
