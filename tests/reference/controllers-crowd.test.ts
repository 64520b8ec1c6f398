// Many coupled oscillators: the onset of common rhythm. Kuramoto, Chemical oscillations, waves, and turbulence, 1984, and
// Strogatz, From Kuramoto to Crawford, 2000 (both from memory).

import { describe, expect, test } from 'vitest'
import { stream as openStream } from '../../shared/streams.js'
import { type Controller, noInputs } from '../../sim/controllers/controller.js'
import { phaseOscillators } from '../../sim/controllers/phase-oscillators.js'

const turn = 2 * Math.PI
const run = (controller: Controller, steps: number) => {
  for (let i = 0; i < steps; i++) controller.step(noInputs)
  return controller
}

describe('many oscillators, Lorentzian frequencies of half width gamma, all coupled with K', () => {
  // Onset at K_c = 2 / (pi g(0)) = 2 gamma; above it the order parameter is r = sqrt(1 - K_c / K). Finite populations
  // scatter: eight populations of 200, seeds fixed beforehand, bands of four standard errors.
  const gammaRadps = 0.5
  const count = 200
  const order = (ratio: number, seed: number) => {
    // The crowd settles at a rate of gamma (K / K_c - 1) or faster; each interval is one step of the integration.
    const stepSeconds = Math.min(0.08, 0.1 / ratio)
    const settling = Math.round((ratio === 1.5 ? 25 : 10) / stepSeconds)
    const watching = Math.round(12 / stepSeconds)
    const stream = openStream(seed, 'weather', 1, 0, 0)
    const frequenciesHz = Array.from({ length: count }, () => {
      return 1 + (gammaRadps / turn) * Math.tan(Math.PI * (stream.uniform() - 0.5))
    })
    const crowd = phaseOscillators({
      frequenciesHz,
      links: [],
      commonPerSecond: ratio * 2 * gammaRadps,
      startTurns: frequenciesHz.map(() => stream.uniform()),
      amplitudes: frequenciesHz.map(() => 1),
      range: [-1, 1],
      stepSeconds,
    })
    let sum = 0
    run(crowd, settling)
    for (let i = 0; i < watching; i++) {
      run(crowd, 1)
      const [c, s] = crowd.state.reduce(
        ([a, b], phase) => [a! + Math.cos(turn * phase), b! + Math.sin(turn * phase)],
        [0, 0],
      )
      sum += Math.sqrt(c! * c! + s! * s!) / count
    }
    return sum / watching
  }
  const seeds = [11, 12, 13, 14, 15, 16, 17, 18]

  test.each([1.5, 3])('K = %d K_c: r = sqrt(1 - K_c / K)', (ratio) => {
    const found = seeds.map((seed) => order(ratio, seed))
    const mean = found.reduce((a, b) => a + b, 0) / found.length
    const variance = found.reduce((a, r) => a + (r - mean) ** 2, 0) / (found.length - 1)
    expect(Math.abs(mean - Math.sqrt(1 - 1 / ratio))).toBeLessThan(4 * Math.sqrt(variance / found.length))
  })

  test('K = K_c / 2: no more order than that of a finite crowd', () => {
    // Below onset r^2 is 1 / (n (1 - K / K_c)) on average (fluctuations of a finite population, Daido 1990, from memory):
    // r about sqrt(pi / 4) of its root.
    const mean = seeds.map((seed) => order(0.5, seed)).reduce((a, b) => a + b, 0) / seeds.length
    const truth = Math.sqrt(Math.PI / 4 / (count * 0.5))
    expect(mean).toBeGreaterThan(0.5 * truth)
    expect(mean).toBeLessThan(2 * truth)
  })
})
