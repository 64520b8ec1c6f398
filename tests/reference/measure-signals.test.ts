// Amplitudes, phases and spectra of signals whose content is known exactly.

import FFT from 'fft.js'
import { describe, expect, test } from 'vitest'
import { cos, sin } from '../../shared/detmath/trigonometry.js'
import { hex, sha256 } from '../../shared/digests.js'
import { Refusal } from '../../shared/refusals.js'
import { dominantTone, spectralPeaks, spectrum, transformer } from '../../sim/measure/spectrum.js'
import { fitTones, goertzelSum } from '../../sim/measure/tones.js'
import { peakRatio, sweptTransmissibility, transmissibility } from '../../sim/measure/transmissibility.js'
import { Solver } from '../tools/odex.js'

const turn = 2 * Math.PI
const signal = (count: number, of: (n: number) => number) =>
  Float64Array.from({ length: count }, (_, n) => of(n))

describe('tones', () => {
  test("Goertzel's sum is the discrete Fourier transform, on bins and off them", () => {
    const samples = signal(1000, (n) => Math.sin(0.37 * n) + 0.01 * n - 3 * Math.cos(2.2 * n))
    for (const angle of [turn / 1000, (turn * 37) / 1000, 0.7, 1.234567, 3.1]) {
      let real = 0
      let imaginary = 0
      for (const [n, x] of samples.entries()) {
        real += x * Math.cos(angle * n)
        imaginary -= x * Math.sin(angle * n)
      }
      const found = goertzelSum(samples, angle)
      expect(Math.abs(found.real - real)).toBeLessThan(1e-8)
      expect(Math.abs(found.imaginary - imaginary)).toBeLessThan(1e-8)
    }
  })

  test('on a bin it agrees with fft.js', () => {
    const samples = signal(1024, (n) => Math.sin(0.1 * n * n))
    const fft = new FFT(1024)
    const out = fft.createComplexArray()
    fft.realTransform(out, Array.from(samples))
    for (const k of [1, 17, 200, 511]) {
      const found = goertzelSum(samples, (turn * k) / 1024)
      expect(found.real).toBeCloseTo(out[2 * k], 9)
      expect(found.imaginary).toBeCloseTo(out[2 * k + 1], 9)
    }
  })

  test('amplitude and phase of a tone off every bin come out to 1e-10, mean and all', () => {
    // 7.3 periods, and 0.8 of one; phases all round.
    for (const periods of [0.8, 7.3, 1234.56]) {
      for (const phase of [-0.45, -0.2, 0, 0.13, 0.49]) {
        const frequencyHz = periods / 50
        const samples = signal(5000, (n) => 2.5 + 0.3 * Math.sin(turn * (frequencyHz * n * 0.01 + phase)))
        const { tones, mean, residualRms } = fitTones(samples, 0.01, [frequencyHz])
        expect(Math.abs(tones[0]!.amplitude - 0.3)).toBeLessThan(1e-10)
        expect(Math.abs(tones[0]!.phaseTurns - phase)).toBeLessThan(1e-10)
        expect(Math.abs(mean - 2.5)).toBeLessThan(1e-10)
        expect(residualRms).toBeLessThan(1e-10)
      }
    }
  })

  test('a tone and its third harmonic and a neighbour are told apart', () => {
    const of = (n: number) =>
      Math.sin(turn * (1.7 * n * 1e-3 + 0.1)) +
      0.02 * Math.sin(turn * (5.1 * n * 1e-3 - 0.3)) +
      0.5 * Math.cos(turn * 1.9 * n * 1e-3)
    const { tones } = fitTones(signal(4321, of), 1e-3, [1.7, 5.1, 1.9])
    const truths = [
      [1, 0.1],
      [0.02, -0.3],
      [0.5, 0.25],
    ]
    for (const [i, [amplitude, phase]] of truths.entries()) {
      expect(Math.abs(tones[i]!.amplitude - amplitude!)).toBeLessThan(1e-10)
      expect(Math.abs(tones[i]!.phaseTurns - phase!)).toBeLessThan(1e-9)
    }
  })

  test('what the tones leave is reported', () => {
    // Two tones fitted by one: the other, amplitude 0.1, is left with an rms of 0.1 / sqrt 2.
    const samples = signal(
      2000,
      (n) => Math.sin((turn * 20 * n) / 2000) + 0.1 * Math.sin((turn * 31 * n) / 2000),
    )
    expect(fitTones(samples, 1 / 2000, [20]).residualRms).toBeCloseTo(0.1 / Math.SQRT2, 10)
  })

  test.each([
    ['at half the sampling rate', [50], 100],
    ['at 0 Hz', [0], 100],
    ['named twice', [3, 3], 100],
    ['of which a thousandth of a period is recorded', [0.001], 100],
  ])('a tone %s is refused', (_, frequencies, count) => {
    expect(() => fitTones(signal(count, Math.sin), 0.01, frequencies)).toThrow(Refusal)
  })
})

describe('spectra', () => {
  test('the transformer has our sines, not those of the host, and transforms like fft.js', () => {
    const made = transformer(4096)
    for (let i = 0; i < made.table.length; i += 2) {
      expect(made.table[i]).toBe(cos((Math.PI * i) / 4096))
      expect(made.table[i + 1]).toBe(-sin((Math.PI * i) / 4096))
    }
    const data = Array.from({ length: 4096 }, (_, n) => Math.sin(n * n))
    const fft = new FFT(4096)
    const [ours, theirs] = [fft.createComplexArray(), fft.createComplexArray()]
    made.realTransform(ours, data)
    fft.realTransform(theirs, data)
    for (let k = 0; k < 4096; k++) expect(Math.abs(ours[k] - theirs[k])).toBeLessThan(1e-10)
  })

  test.each(['hann', 'rectangle'] as const)('window %s: a tone on a bin has its amplitude', (window) => {
    const samples = signal(1024, (n) => 7 + 0.4 * Math.sin((turn * 100 * n) / 1024))
    const { amplitudes, binHz } = spectrum(samples, 1e-3, window)
    expect(amplitudes[Math.round(100 / 1.024 / binHz)]).toBeCloseTo(0.4, 10)
    expect(amplitudes[0]).toBeLessThan(1e-10)
  })

  test('a peak between bins is found to 0.003 bins of the record and 0.1 % in amplitude', () => {
    // For records much longer than the period; the nearer the tone is to 0 Hz, the more its mirror image disturbs.
    for (let aside = 0; aside < 1; aside += 0.05) {
      const bins = 50 + aside
      const peak = dominantTone(
        signal(1000, (n) => 0.7 * Math.sin((turn * bins * n) / 1000 + 1)),
        0.01,
      )!
      expect(Math.abs(peak.frequencyHz * 10 - bins)).toBeLessThan(0.003)
      expect(Math.abs(peak.amplitude / 0.7 - 1)).toBeLessThan(1e-3)
    }
  })

  test('a tone a thousand times weaker is seen beside a strong one, once each', () => {
    const samples = signal(3000, (n) => Math.sin(0.5 * n) + 1e-3 * Math.sin(1.3 * n))
    const peaks = spectralPeaks(spectrum(samples, 1), 5, 5e-4)
    expect(peaks).toHaveLength(2)
    expect(Math.abs(peaks[0]!.frequencyHz * turn - 0.5)).toBeLessThan(1e-5)
    expect(Math.abs(peaks[1]!.frequencyHz * turn - 1.3)).toBeLessThan(1e-4)
  })

  test('a constant record has no tone', () => {
    expect(dominantTone(new Float64Array(100).fill(3), 0.1)).toBeUndefined()
  })

  // Period of a pendulum over that of small swings, 2 K / pi = 1 / AGM(1, cos(a / 2)); Landau and Lifshitz,
  // Mechanics, section 11 (from memory), recomputed.
  test.each([
    [10, 1.00190718814],
    [45, 1.0399733432],
    [90, 1.18034059902],
    [150, 1.7622037295],
  ])('a pendulum swinging by %d degrees has %d times the period of small swings', (degrees, ratio) => {
    const solver = new Solver(2)
    solver.denseOutput = true
    solver.absoluteTolerance = 1e-11
    solver.relativeTolerance = 1e-11
    const samples: number[] = []
    const [seconds, step] = [41 * turn, 0.05]
    const swing = (_: number, [q, v]: number[]) => [v!, -Math.sin(q!)]
    const keep = solver.grid(step, (_, [q]) => samples.push(q!))
    solver.solve(swing, 0, [(degrees * Math.PI) / 180, 0], seconds, keep)
    const peak = dominantTone(samples, step)!
    expect(Math.abs(peak.frequencyHz * turn * ratio - 1)).toBeLessThan(1e-3)
  })

  test('the same bits everywhere: digest of a spectrum and of a fit', () => {
    // Made of whole numbers only, so that no function of the host enters.
    const samples = signal(777, (n) => ((n * n * 31) % 97) / 8)
    const { amplitudes } = spectrum(samples, 1 / 64)
    const { tones, mean, residualRms } = fitTones(samples, 1 / 64, [1.25, 7.1])
    const numbers = [...amplitudes, mean, residualRms, ...tones.flatMap((t) => [t.amplitude, t.phaseTurns])]
    expect(hex(sha256(new Uint8Array(Float64Array.from(numbers).buffer)))).toBe(
      'e3c2b6bf0b28eb876fd6bc14247983bfad9c44b57147811072735ac31669db3a',
    )
  })
})

describe('transmissibility of recorded signals', () => {
  test('ratio and phase, and how steady they were', () => {
    const input = signal(4000, (n) => 1 + 0.01 * Math.sin(turn * (3.21 * n * 1e-3 + 0.4)))
    const output = signal(4000, (n) => 5 + 0.03 * Math.sin(turn * (3.21 * n * 1e-3 + 0.4 - 0.3)))
    const found = transmissibility(input, output, 1e-3, 3.21)
    expect(found.ratio).toBeCloseTo(3, 9)
    expect(found.phaseTurns).toBeCloseTo(-0.3, 9)
    expect(found.drift).toBeLessThan(1e-9)
    const growing = output.map((x, n) => 5 + (x - 5) * (1 + n / 40_000))
    expect(transmissibility(input, growing, 1e-3, 3.21).drift).toBeGreaterThan(0.01)
  })

  test('two signals of different length, too short a window and a still input are refused', () => {
    const moving = signal(100, Math.sin)
    expect(() => transmissibility(moving, signal(99, Math.sin), 0.1, 1)).toThrow(Refusal)
    expect(() => transmissibility(moving, moving, 0.1, 0.1)).toThrow(Refusal)
    expect(() => peakRatio(new Float64Array(100), moving)).toThrow(Refusal)
  })

  test('over a sweep: a filter known exactly, y_n = 0.9 y_(n-1) + 0.1 x_n', () => {
    const count = 8192
    const input = signal(count, (n) => (n < 7000 ? Math.sin((turn * n * n * 0.2) / 14_000) : 0))
    const output = new Float64Array(count)
    for (let n = 1; n < count; n++) output[n] = 0.9 * output[n - 1]! + 0.1 * input[n]!
    const points = sweptTransmissibility(input, output, 1, 0.01, 0.19)
    expect(points.length).toBeGreaterThan(1000)
    for (const { frequencyHz, ratio, phaseTurns } of points) {
      const [real, imaginary] = [1 - 0.9 * Math.cos(turn * frequencyHz), 0.9 * Math.sin(turn * frequencyHz)]
      expect(ratio * Math.hypot(real, imaginary)).toBeCloseTo(0.1, 9)
      expect(phaseTurns * turn).toBeCloseTo(-Math.atan2(imaginary, real), 8)
    }
  })
})
