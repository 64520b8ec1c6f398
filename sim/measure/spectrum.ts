// Spectra of recorded signals, with fft.js (radix-4 fast Fourier transform). Its table of sines and cosines is made by
// the host, whose last bit differs between processors: it is replaced by our own before anything is transformed, and
// the rest of fft.js only adds, subtracts and multiplies. So a spectrum has the same bits everywhere.
//
// The mean is taken off and the record windowed (Hann: Harris, On the use of windows for harmonic analysis with the
// discrete Fourier transform, 1978, from memory) and filled up with zeros to a power of two at least four times its
// length, so that a parabola through the logarithms of the three highest values finds the top of a peak.

import FFT from 'fft.js'
import { exp, log } from '../../shared/detmath/exponential.js'
import { cos, sin } from '../../shared/detmath/trigonometry.js'
import { refuse } from '../../shared/refusals.js'

/** What is used of fft.js, whose own types are all `any`. */
interface Transformer {
  table: number[]
  realTransform(out: number[], data: readonly number[]): void
}

export type Window = 'hann' | 'rectangle'

export interface Spectrum {
  /** Frequency of value k is k * binHz; the mean is taken off. */
  readonly binHz: number
  /** Amplitude (half of peak to peak) of a steady tone at that frequency, in the units of the signal. */
  readonly amplitudes: Float64Array
  /** 1 / length of the record: tones closer than about two of these (Hann: three) are not told apart. */
  readonly resolutionHz: number
  readonly window: Window
}

export interface Peak {
  readonly frequencyHz: number
  readonly amplitude: number
}

const zeroFill = 4
const lengthMost = 2 ** 24

/** Amplitude spectrum of samples taken every `sampleSeconds`; Hann window unless said. */
export function spectrum(
  samples: ArrayLike<number>,
  sampleSeconds: number,
  window: Window = 'hann',
): Spectrum {
  const count = samples.length
  if (count < 8 || count * zeroFill > lengthMost || !(sampleSeconds > 0)) {
    throw refuse('impossible-value', {
      detail:
        `found ${count} samples every ${sampleSeconds} s, expected 8 to ${lengthMost / zeroFill} samples and ` +
        'a time above 0 between them.',
      where: { field: 'samples' },
    })
  }
  let length = 1
  while (length < zeroFill * count) length *= 2
  const { windowed, sum } = prepare(samples, length, window)
  const out = new Array<number>(2 * length).fill(0)
  transformer(length).realTransform(out, windowed)
  const amplitudes = new Float64Array(length / 2 + 1)
  for (let k = 0; k < amplitudes.length; k++) {
    const [real, imaginary] = [out[2 * k]!, out[2 * k + 1]!]
    const twice = k === 0 || k === length / 2 ? 1 : 2
    amplitudes[k] = (twice * Math.sqrt(real * real + imaginary * imaginary)) / sum
  }
  return {
    binHz: 1 / (length * sampleSeconds),
    amplitudes,
    resolutionHz: 1 / (count * sampleSeconds),
    window,
  }
}

/** Windowed departures from the mean that the window sees (so that value 0 is 0), filled up; and the window's sum. */
function prepare(samples: ArrayLike<number>, length: number, window: Window) {
  const count = samples.length
  const weights = new Float64Array(count)
  let sum = 0
  let weighted = 0
  for (let n = 0; n < count; n++) {
    // Periodic form of Hann's window, whose sum is exactly half of the length.
    const weight = window === 'hann' ? (1 - cos((2 * Math.PI * n) / count)) / 2 : 1
    weights[n] = weight
    sum += weight
    weighted += weight * samples[n]!
  }
  const mean = weighted / sum
  const windowed = new Array<number>(length).fill(0)
  for (let n = 0; n < count; n++) windowed[n] = (samples[n]! - mean) * weights[n]!
  return { windowed, sum }
}

/** One transformer a length: making its tables costs as much as a transform. Long ones are not kept. */
const transformers = new Map<number, Transformer>()

/** A transformer of fft.js with sines and cosines of our own in place of the host's. */
export function transformer(length: number): Transformer {
  const known = transformers.get(length)
  if (known) return known
  const made: Transformer = new FFT(length)
  for (let i = 0; i < made.table.length; i += 2) {
    const angle = (Math.PI * i) / length
    made.table[i] = cos(angle)
    made.table[i + 1] = -sin(angle)
  }
  if (length <= 2 ** 16) transformers.set(length, made)
  return made
}

/** Envelope of what a tone of amplitude 1 leaves `bins` (of the record) away from it: its side lobes' tops. */
const leakage: { readonly [W in Window]: (bins: number) => number } = {
  rectangle: (bins) => 1 / (Math.PI * bins),
  hann: (bins) => 1 / (Math.PI * bins * (bins * bins - 1)),
}
/** From the middle of the main lobe to its first zero, bins of the record. */
const mainLobe: { readonly [W in Window]: number } = { rectangle: 1, hann: 2 }

/**
 * The highest peaks, highest first (the lower frequency first among equals): local maxima above `floor` times the
 * highest that are neither in the main lobe of a higher one nor as low as its side lobes. Frequencies and amplitudes from
 * a parabola through the logarithms of three values (common practice, exact for a Gaussian; for Hann with this
 * filling measured to 0.003 bins of the record and 0.1 % when the tone stands alone).
 */
export function spectralPeaks(of: Spectrum, most: number, floor = 0.01): Peak[] {
  const { binHz, amplitudes, resolutionHz } = of
  const candidates: number[] = []
  let highest = 0
  for (let k = 1; k + 1 < amplitudes.length; k++) {
    const value = amplitudes[k]!
    if (value > amplitudes[k - 1]! && value >= amplitudes[k + 1]!) {
      candidates.push(k)
      highest = Math.max(highest, value)
    }
  }
  candidates.sort((a, b) => amplitudes[b]! - amplitudes[a]! || a - b)
  const stands = (k: number, other: number) => {
    const bins = (Math.abs(other - k) * binHz) / resolutionHz
    // Half as much again, because lobes of several tones add up.
    return bins >= mainLobe[of.window] && amplitudes[k]! > 1.5 * amplitudes[other]! * leakage[of.window](bins)
  }
  const kept: number[] = []
  for (const k of candidates) {
    if (kept.length === most || amplitudes[k]! < floor * highest) break
    if (kept.every((other) => stands(k, other))) kept.push(k)
  }
  return kept.map((k) => topOf(amplitudes, k, binHz))
}

function topOf(amplitudes: Float64Array, k: number, binHz: number): Peak {
  const [l, m, r] = [amplitudes[k - 1]!, amplitudes[k]!, amplitudes[k + 1]!]
  if (!(l > 0 && r > 0)) return { frequencyHz: k * binHz, amplitude: m }
  const [a, b, c] = [log(l), log(m), log(r)]
  const bend = a - 2 * b + c
  const aside = bend === 0 ? 0 : (a - c) / (2 * bend)
  return { frequencyHz: (k + aside) * binHz, amplitude: exp(b - ((a - c) * aside) / 4) }
}

/** Below this part of the largest value a tone is rounding. */
const negligible = 1e-12

/** The strongest frequency of a record and its amplitude; undefined when the record is constant. */
export function dominantTone(samples: ArrayLike<number>, sampleSeconds: number): Peak | undefined {
  const [peak] = spectralPeaks(spectrum(samples, sampleSeconds), 1)
  let largest = 0
  for (let n = 0; n < samples.length; n++) largest = Math.max(largest, Math.abs(samples[n]!))
  return peak !== undefined && peak.amplitude > negligible * largest ? peak : undefined
}
