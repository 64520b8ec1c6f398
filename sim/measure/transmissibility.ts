// How much of a shaking arrives: ratio of output to input amplitude, from recorded signals of the same kind (two
// displacements, or two accelerations).
//
// At one frequency: tones fitted to both signals over a window in which the motion is steady, and how steady it was.
// Over a sweep: the ratio of the two spectra of the whole record (each frequency is passed only once, so there is
// nothing to average); right when the system starts at rest and the record lasts until it is at rest again.
// Sources: Harris and Piersol, Harris' shock and vibration handbook, 2002; Bendat and Piersol, Random data, 2010
// (both from memory).

import { atan2 } from '../../shared/detmath/inverse-trigonometry.js'
import { refuse } from '../../shared/refusals.js'
import { transformer } from './spectrum.js'
import { toneAt } from './tones.js'

export interface Transmissibility {
  readonly ratio: number
  /** How far the output is ahead of the input, turns in [-1/2, 1/2). */
  readonly phaseTurns: number
  readonly inputAmplitude: number
  readonly outputAmplitude: number
  /**
   * Relative difference of the ratio between the two halves of the window: 0 when steady. Above 0.01 the start-up has not
   * died away; wait at least 5 / (zeta w0).
   */
  readonly drift: number
}

/** Whole turns taken off. */
const wrap = (turns: number) => turns - Math.floor(turns + 0.5)

/**
 * Ratio and phase at one frequency. Both records start at the same time and hold only the window that counts, at least
 * two periods. Refuses ('impossible-value') shorter ones, different lengths, and an input that does not move.
 */
export function transmissibility(
  input: Float64Array,
  output: Float64Array,
  sampleSeconds: number,
  frequencyHz: number,
): Transmissibility {
  demandPair(input, output)
  const periods = input.length * sampleSeconds * frequencyHz
  if (periods < 2) {
    throw refuse('impossible-value', {
      detail: `found ${periods} periods of ${frequencyHz} Hz, expected at least 2.`,
      where: { field: 'input' },
    })
  }
  const whole = ratioOf(input, output, sampleSeconds, frequencyHz)
  const half = Math.floor(input.length / 2)
  const first = ratioOf(input.subarray(0, half), output.subarray(0, half), sampleSeconds, frequencyHz)
  const last = ratioOf(input.subarray(half), output.subarray(half), sampleSeconds, frequencyHz)
  const drift = whole.ratio === 0 ? 0 : Math.abs(last.ratio - first.ratio) / whole.ratio
  return { ...whole, drift }
}

function ratioOf(input: Float64Array, output: Float64Array, sampleSeconds: number, frequencyHz: number) {
  const from = toneAt(input, sampleSeconds, frequencyHz)
  const to = toneAt(output, sampleSeconds, frequencyHz)
  if (!(from.amplitude > 0)) {
    throw refuse('impossible-value', {
      detail: `the input does not move at ${frequencyHz} Hz.`,
      where: { field: 'input' },
    })
  }
  return {
    ratio: to.amplitude / from.amplitude,
    phaseTurns: wrap(to.phaseTurns - from.phaseTurns),
    inputAmplitude: from.amplitude,
    outputAmplitude: to.amplitude,
  }
}

export interface SweptPoint {
  readonly frequencyHz: number
  readonly ratio: number
  readonly phaseTurns: number
}

/**
 * Ratio over the frequencies that a sweep from `lowHz` to `highHz` has shaken, one point a bin of the record. Left out
 * are frequencies at which the input has less than a hundredth of its strongest.
 */
export function sweptTransmissibility(
  input: Float64Array,
  output: Float64Array,
  sampleSeconds: number,
  lowHz: number,
  highHz: number,
): SweptPoint[] {
  demandPair(input, output)
  const length = powerOfTwo(input.length)
  const from = transformed(input, length)
  const to = transformed(output, length)
  const binHz = 1 / (length * sampleSeconds)
  const first = Math.max(1, Math.ceil(lowHz / binHz))
  const last = Math.min(length / 2 - 1, Math.floor(highHz / binHz))
  const squared = (k: number) => from[2 * k]! * from[2 * k]! + from[2 * k + 1]! * from[2 * k + 1]!
  let strongest = 0
  for (let k = first; k <= last; k++) strongest = Math.max(strongest, squared(k))
  const points: SweptPoint[] = []
  for (let k = first; k <= last; k++) {
    const power = squared(k)
    if (!(power > 1e-4 * strongest)) continue
    const [a, b] = [from[2 * k]!, from[2 * k + 1]!]
    const [c, d] = [to[2 * k]!, to[2 * k + 1]!]
    const real = (c * a + d * b) / power
    const imaginary = (d * a - c * b) / power
    points.push({
      frequencyHz: k * binHz,
      ratio: Math.sqrt(real * real + imaginary * imaginary),
      phaseTurns: atan2(imaginary, real) / (2 * Math.PI),
    })
  }
  return points
}

/** Greatest departure of the output from where it started over that of the input: what a run-up does, resonance passed. */
export function peakRatio(input: Float64Array, output: Float64Array): number {
  demandPair(input, output)
  const most = (values: Float64Array) =>
    values.reduce((peak, value) => Math.max(peak, Math.abs(value - values[0]!)), 0)
  const moved = most(input)
  if (!(moved > 0)) {
    throw refuse('impossible-value', { detail: 'the input does not move.', where: { field: 'input' } })
  }
  return most(output) / moved
}

function powerOfTwo(count: number): number {
  let length = 2
  while (length < count) length *= 2
  return length
}

/**
 * Spectrum of the differences of neighbouring samples, filled up with zeros. The same factor enters input and output, and a
 * record that ends at rest somewhere else than it began has differences that end at 0.
 */
function transformed(samples: Float64Array, length: number): number[] {
  const data = new Array<number>(length).fill(0)
  for (let n = 1; n < samples.length; n++) data[n - 1] = samples[n]! - samples[n - 1]!
  const out = new Array<number>(2 * length).fill(0)
  transformer(length).realTransform(out, data)
  return out
}

function demandPair(input: Float64Array, output: Float64Array): void {
  if (input.length === output.length && input.length >= 8) return
  throw refuse('impossible-value', {
    detail: `found ${input.length} samples of the input and ${output.length} of the output, expected equally many, at least 8.`,
    where: { field: 'output' },
  })
}
