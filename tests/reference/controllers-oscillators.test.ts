// Oscillator controllers against closed forms. Two coupled: Adler, A study of locking phenomena in oscillators, 1946 (from
// memory; formulas derived again). Many: controllers-crowd.test.ts.

import { describe, expect, test } from 'vitest'
import { hex, sha256 } from '../../shared/digests.js'
import { checkGenome, randomGenome } from '../../shared/encodings.js'
import { Refusal } from '../../shared/refusals.js'
import { stream as openStream } from '../../shared/streams.js'
import { type Controller, noInputs } from '../../sim/controllers/controller.js'
import { openLoopFrom, openLoopParts } from '../../sim/controllers/open-loop.js'
import {
  describeLinks,
  phaseOscillators,
  phaseOscillatorsFrom,
  phaseOscillatorsParts,
} from '../../sim/controllers/phase-oscillators.js'
import { orderOf } from './physics-bodies.js'

const turn = 2 * Math.PI
const run = (controller: Controller, steps: number) => {
  for (let i = 0; i < steps; i++) controller.step(noInputs)
  return controller
}
/** Into [-1/2, 1/2). */
const wrapped = (turns: number) => turns - Math.floor(turns + 0.5)
const link = (from: number, to: number, couplingPerSecond: number, lagTurns = 0) => {
  return { from, to, couplingPerSecond, lagTurns }
}

describe('open-loop oscillators', () => {
  const design = {
    outputs: 3,
    frequencies: 'own',
    frequencyHz: [0.5, 2],
    range: [-0.2, 0.4],
    unit: 'strain',
    stepSeconds: 0.01,
  } as const

  test('command = middle + amplitude sin(2 pi (f t + phase)), to 1e-12 after 10,000 steps', () => {
    const genes = { frequency: [0.5, 1.1, 2], amplitude: [0.3, 0.1, 0], phase: [0, 0.25, 0.7] }
    const { outputs } = run(openLoopFrom(design, genes), 10_000)
    for (const [i, f] of genes.frequency.entries()) {
      const truth = 0.1 + genes.amplitude[i]! * Math.sin(turn * (f * 100 + genes.phase[i]!))
      expect(Math.abs(outputs[i]! - truth)).toBeLessThan(1e-12)
    }
  })

  test('starts with the command of time 0, and one frequency may serve all', () => {
    const common = { ...design, frequencies: 'common' } as const
    const controller = openLoopFrom(common, {
      frequency: [1],
      amplitude: [0.3, 0.3, 0.3],
      phase: [0, 0.25, 0.5],
    })
    for (const [i, value] of [0.1, 0.4, 0.1].entries()) expect(controller.outputs[i]).toBeCloseTo(value, 15)
    for (const [i, value] of [0.4, 0.1, -0.2].entries()) {
      expect(run(controller, i === 0 ? 25 : 0).outputs[i]).toBeCloseTo(value, 12)
    }
  })

  test('genes of the wrong number are refused', () => {
    expect(() => openLoopFrom(design, { frequency: [1], amplitude: [0, 0, 0], phase: [0, 0, 0] })).toThrow(
      Refusal,
    )
  })
})

describe('two coupled phase oscillators', () => {
  const still = { amplitudes: [1, 1], range: [-1, 1], stepSeconds: 0.01 } as const

  test.each([0.1, 0.5, 0.9, 0.99])(
    'detuned by %d of the critical amount they lock at sin(difference) = detuning',
    (part) => {
      // d psi / dt = dw - (K1 + K2) sin psi with K1 = 2, K2 = 3 rad/s: locks at asin(dw / 5).
      const detuned = (part * 5) / turn
      const pair = phaseOscillators({
        ...still,
        frequenciesHz: [1, 1 + detuned],
        links: [link(0, 1, 3), link(1, 0, 2)],
      })
      const { state } = run(pair, 6000)
      expect(Math.abs(wrapped(state[1]! - state[0]!) - Math.asin(part) / turn)).toBeLessThan(1e-9)
    },
  )

  test.each([1.01, 1.5, 3])(
    'detuned by %d of it they slip with a beat of sqrt(dw^2 - K^2) / 2 pi',
    (part) => {
      const detuned = (part * 5) / turn
      const pair = phaseOscillators({
        ...still,
        frequenciesHz: [1, 1 + detuned],
        links: [link(0, 1, 3), link(1, 0, 2)],
      })
      let slips = 0
      let [first, last] = [0, 0]
      let before = 0
      for (let i = 1; i <= 40_000; i++) {
        run(pair, 1)
        const now = wrapped(pair.state[1]! - pair.state[0]!)
        if (before > 0.25 && now < -0.25) {
          // The moment of the slip between two samples, by a straight line.
          const at = i - (now + 0.5) / (now + 1 - before)
          if (slips === 0) first = at
          last = at
          slips++
        }
        before = now
      }
      const truth = Math.sqrt(part * part - 1) * (5 / turn)
      expect(slips).toBeGreaterThan(40)
      expect(Math.abs((slips - 1) / ((last - first) * 0.01) / truth - 1)).toBeLessThan(1e-4)
    },
  )

  test('a link with a lag brings its source ahead by the lag', () => {
    const follow = phaseOscillators({ ...still, frequenciesHz: [1.3, 1.3], links: [link(0, 1, 4, 0.2)] })
    const { state } = run(follow, 2000)
    expect(wrapped(state[0]! - state[1]!)).toBeCloseTo(0.2, 12)
  })

  test('towards the lock tan(psi / 2) falls as exp(-K t), with an error of fourth order', () => {
    const error = (stepSeconds: number) => {
      const pair = phaseOscillators({
        ...still,
        stepSeconds,
        frequenciesHz: [1, 1],
        links: [link(0, 1, 0.5)],
        startTurns: [0, 0.4],
      })
      const { state } = run(pair, Math.round(2 / stepSeconds))
      const truth = 2 * Math.atan(Math.tan(0.4 * Math.PI) * Math.exp(-0.5 * 2))
      return Math.abs(wrapped(state[1]! - state[0]!) * turn - truth)
    }
    // Intervals of at most 0.1 rad of pull are one step of the integration each.
    expect(Math.abs(orderOf(error(0.2), error(0.1)) - 4)).toBeLessThan(0.1)
    expect(error(0.01)).toBeLessThan(1e-10)
  })

  test('strong pulls make the parts of an interval smaller, not the result worse', () => {
    const strong = (stepSeconds: number) =>
      run(
        phaseOscillators({ ...still, stepSeconds, frequenciesHz: [1, 1.5], links: [link(0, 1, 300)] }),
        Math.round(1 / stepSeconds),
      ).state
    const [coarse, fine] = [strong(0.1), strong(0.001)]
    for (let i = 0; i < 2; i++) expect(Math.abs(wrapped(coarse[i]! - fine[i]!))).toBeLessThan(1e-8)
    const absurd = [link(0, 1, 1e6)]
    expect(() => phaseOscillators({ ...still, frequenciesHz: [1, 1], links: absurd })).toThrow(Refusal)
  })

  test('what is sensed makes an oscillator faster, by gain Hz for a unit', () => {
    const feeling = phaseOscillators({
      ...still,
      frequenciesHz: [1, 1],
      links: [],
      feedback: [{ oscillator: 1, input: 0, gainHz: 0.25 }],
    })
    for (let i = 0; i < 100; i++) feeling.step([0.5])
    expect(feeling.inputCount).toBe(1)
    expect(wrapped(feeling.state[1]! - feeling.state[0]!)).toBeCloseTo(0.125, 12)
  })
})

test('a ring whose links want a quarter of a turn carries a travelling wave', () => {
  const links = [0, 1, 2, 3].map((i) => link(i, (i + 1) % 4, 3, 0.25))
  const ring = phaseOscillators({
    frequenciesHz: [1, 1.02, 0.98, 1],
    links,
    startTurns: [0, 0.7, 0.4, 0.3],
    amplitudes: [1, 1, 1, 1],
    range: [-1, 1],
    stepSeconds: 0.02,
  })
  const { state } = run(ring, 5000)
  for (let i = 0; i < 4; i++) {
    expect(Math.abs(wrapped(state[i]! - state[(i + 1) % 4]! - 0.25))).toBeLessThan(0.02)
  }
})

describe('from and to genomes', () => {
  const design = {
    outputs: 3,
    links: [
      { name: 'front to middle', from: 0, to: 1 },
      { name: 'middle to rear', from: 1, to: 2 },
    ],
    frequencies: 'common',
    frequencyHz: [0.4, 2.5],
    couplingMostPerSecond: 10,
    range: [-0.15, 0.15],
    unit: 'strain',
    stepSeconds: 0.02,
  } as const

  test('founders are legal and describe controllers that lock as their lags say', () => {
    const spec = phaseOscillatorsParts(design)
    for (let seed = 1; seed < 20; seed++) {
      const genome = randomGenome(spec, openStream(seed, 'founder', 1, 0, 0)) as {
        [P in keyof typeof spec]: Float64Array
      }
      expect(checkGenome(spec, genome)).toBeUndefined()
      const { state, outputs } = run(phaseOscillatorsFrom(design, genome), 5000)
      for (const [i, lag] of genome.lag.entries()) {
        if (genome.coupling[i]! < 0.5) continue
        expect(Math.abs(wrapped(state[i]! - state[i + 1]! - lag))).toBeLessThan(1e-6)
      }
      for (const output of outputs) expect(Math.abs(output)).toBeLessThanOrEqual(0.15)
    }
  })

  test('the lags are told by the names of their links', () => {
    expect(describeLinks(design, { coupling: [3, 2], lag: [0.25, -0.1] })).toEqual([
      'front to middle: oscillator 1 0.25 turn ahead of 2, pull 3 rad/s',
      'middle to rear: oscillator 2 0.1 turn behind 3, pull 2 rad/s',
    ])
  })

  test('the same bits everywhere: digests after 1,000 steps', () => {
    const openDesign = { ...design, frequencies: 'own' } as const
    const openSpec = openLoopParts(openDesign)
    const spec = phaseOscillatorsParts(design)
    const open = randomGenome(openSpec, openStream(5, 'founder', 1, 0, 0)) as {
      [P in keyof typeof openSpec]: Float64Array
    }
    const coupled = randomGenome(spec, openStream(5, 'founder', 1, 0, 0)) as {
      [P in keyof typeof spec]: Float64Array
    }
    const digest = (controller: Controller) => {
      const numbers = [...run(controller, 1000).state, ...controller.outputs]
      return hex(sha256(new Uint8Array(Float64Array.from(numbers).buffer))).slice(0, 16)
    }
    expect(digest(openLoopFrom(openDesign, open))).toBe('9d2c12412cbe634c')
    expect(digest(phaseOscillatorsFrom(design, coupled))).toBe('20198e7c33cdf36d')
  })
})
