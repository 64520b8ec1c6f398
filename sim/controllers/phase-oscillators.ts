// Coupled phase oscillators: each has a phase that runs at its own frequency and is pulled towards stated phase lags
// behind others,
//   d phi_i / dt = 2 pi f_i + sum over links j -> i of  K sin(phi_j - phi_i - lag)  +  2 pi sum of gain * input
//                  + (K_all / n) sum over all j of  sin(phi_j - phi_i)
// with phi in radians; outside this file phases and lags are in turns. A link's lag is what phi_j - phi_i goes to when
// it alone acts: the source j is then ahead of i by the lag. Command = middle + amplitude sin phi.
// (Kuramoto, Chemical oscillations, waves, and turbulence, 1984; for gaits: Ijspeert, Central pattern generators
// for locomotion control in animals and robots: a review, 2008; both from memory.)
//
// Integrated with the classical Runge-Kutta method, error of fourth order, in equal parts of the interval so short that
// in one part no phase is pulled by more than `partRadians` and no linked pair drifts apart by more than that.

import { cos, sin } from '../../shared/detmath/trigonometry.js'
import { real } from '../../shared/encodings.js'
import { rungeKutta4 } from '../ode/runge-kutta.js'
import { type Controller, demand, demandDesign, demandNumbers, type Range, within } from './controller.js'

const turn = 2 * Math.PI
const partRadians = 0.1
const partsMost = 1000

export interface PhaseLink {
  readonly from: number
  readonly to: number
  /** K, rad/s. */
  readonly couplingPerSecond: number
  /** How far `from` is ahead of `to` where the link rests. */
  readonly lagTurns: number
}

/** A sensed quantity that makes an oscillator faster: by gain Hz for every unit of the input. */
export interface PhaseFeedback {
  readonly oscillator: number
  readonly input: number
  readonly gainHz: number
}

export interface PhaseOscillatorsSpec {
  readonly frequenciesHz: ArrayLike<number>
  readonly links: readonly PhaseLink[]
  /** K_all, rad/s: pull of each towards the mean of all; 0 when absent. */
  readonly commonPerSecond?: number
  readonly feedback?: readonly PhaseFeedback[]
  /** Number of inputs; as many as the feedback names when absent. */
  readonly inputs?: number
  /** Of the phases at time 0; all 0 when absent. */
  readonly startTurns?: ArrayLike<number>
  readonly amplitudes: ArrayLike<number>
  readonly range: Range
  readonly stepSeconds: number
}

/** A controller whose state is the phases, in turns, each in [0, 1). */
export function phaseOscillators(spec: PhaseOscillatorsSpec): Controller {
  const count = spec.frequenciesHz.length
  const { amplitudes, range, stepSeconds, startTurns, feedback = [] } = spec
  const inputCount = spec.inputs ?? feedback.reduce((most, { input }) => Math.max(most, input + 1), 0)
  checkSpec(spec, count, inputCount)
  const outputs = new Float64Array(count)
  const state = new Float64Array(count)
  if (startTurns) state.set(Array.from(startTurns, fraction))
  const held = new Float64Array(inputCount)
  const pairs = new Float64Array(2 * count)
  const parts = partsOf(spec, count)
  const advanceBy = rungeKutta4((_, phases, rates) => turnRates(spec, phases, held, pairs, rates), count)
  const middle = (range[0] + range[1]) / 2
  const say = () => {
    for (let i = 0; i < count; i++) {
      outputs[i] = within(middle + amplitudes[i]! * sin(turn * state[i]!), range)
    }
  }
  say()
  return {
    stepSeconds,
    inputCount,
    outputs,
    state,
    step: (inputs) => {
      for (let i = 0; i < inputCount; i++) held[i] = inputs[i]!
      for (let part = 0; part < parts; part++) advanceBy(0, stepSeconds / parts, state, state)
      for (let i = 0; i < count; i++) state[i] = fraction(state[i]!)
      say()
    },
  }
}

/** In [0, 1); what is no number stays none, for the choke point of the simulator to find. */
function fraction(turns: number): number {
  const left = turns - Math.floor(turns)
  return left >= 1 ? 0 : left
}

/** Rates of all phases, turns a second; `pairs` is scratch. */
function turnRates(
  { frequenciesHz, links, commonPerSecond = 0, feedback = [] }: PhaseOscillatorsSpec,
  phases: Float64Array,
  inputs: Float64Array,
  pairs: Float64Array,
  rates: Float64Array,
): void {
  const count = phases.length
  for (let i = 0; i < count; i++) rates[i] = frequenciesHz[i]!
  for (const { from, to, couplingPerSecond, lagTurns } of links) {
    rates[to]! += (couplingPerSecond / turn) * sin(turn * (phases[from]! - phases[to]! - lagTurns))
  }
  for (const { oscillator, input, gainHz } of feedback) rates[oscillator]! += gainHz * inputs[input]!
  if (commonPerSecond !== 0) pullTogether(phases, commonPerSecond / (turn * count), pairs, rates)
}

/** sum over j of sin(phi_j - phi_i) = S cos phi_i - C sin phi_i, with the sums S and C of all sines and cosines. */
function pullTogether(phases: Float64Array, pull: number, pairs: Float64Array, rates: Float64Array): void {
  let [sines, cosines] = [0, 0]
  for (let i = 0; i < phases.length; i++) {
    const angle = turn * phases[i]!
    pairs[2 * i] = sin(angle)
    pairs[2 * i + 1] = cos(angle)
    sines += pairs[2 * i]!
    cosines += pairs[2 * i + 1]!
  }
  for (let i = 0; i < phases.length; i++) {
    rates[i]! += pull * (sines * pairs[2 * i + 1]! - cosines * pairs[2 * i]!)
  }
}

/** Equal parts of the interval for one step of the integration each. */
function partsOf(spec: PhaseOscillatorsSpec, count: number): number {
  const { links, commonPerSecond = 0, stepSeconds, frequenciesHz } = spec
  const pulls = new Float64Array(count).fill(Math.abs(commonPerSecond))
  let drift = 0
  for (const { from, to, couplingPerSecond } of links) {
    pulls[to]! += Math.abs(couplingPerSecond)
    drift = Math.max(drift, turn * Math.abs(frequenciesHz[from]! - frequenciesHz[to]!))
  }
  const strongest = pulls.reduce((most, pull) => Math.max(most, pull), drift)
  const parts = Math.max(1, Math.ceil((strongest * stepSeconds) / partRadians))
  demand(
    parts <= partsMost,
    'phaseOscillators.links',
    `pulls or differences of ${strongest} rad/s over intervals of ${stepSeconds} s`,
    `at most ${partsMost * partRadians} rad an interval`,
  )
  return parts
}

function checkSpec(spec: PhaseOscillatorsSpec, count: number, inputCount: number): void {
  const { amplitudes, range, stepSeconds, startTurns, links, feedback = [] } = spec
  const field = 'phaseOscillators'
  demand(count > 0, `${field}.frequenciesHz`, 'none', 'at least one oscillator')
  demandDesign(field, stepSeconds, range)
  demandNumbers(`${field}.frequenciesHz`, spec.frequenciesHz, count)
  demandNumbers(`${field}.amplitudes`, amplitudes, count)
  if (startTurns) demandNumbers(`${field}.startTurns`, startTurns, count)
  demandNumbers(`${field}.commonPerSecond`, [spec.commonPerSecond ?? 0], 1)
  const isOne = (i: number, most: number) => Number.isInteger(i) && i >= 0 && i < most
  for (const [i, { from, to, couplingPerSecond, lagTurns }] of links.entries()) {
    demand(
      isOne(from, count) && isOne(to, count),
      `${field}.links[${i}]`,
      `${from} to ${to}`,
      `two of ${count}`,
    )
    demandNumbers(`${field}.links[${i}]`, [couplingPerSecond, lagTurns], 2)
  }
  for (const [i, { oscillator, input, gainHz }] of feedback.entries()) {
    const known = isOne(oscillator, count) && isOne(input, inputCount)
    demand(
      known,
      `${field}.feedback[${i}]`,
      `input ${input} to ${oscillator}`,
      `of ${inputCount} to ${count}`,
    )
    demandNumbers(`${field}.feedback[${i}]`, [gainHz], 1)
  }
}

// -------------------------------------------------------------------------------------------- genome

export interface PhaseOscillatorsDesign {
  readonly outputs: number
  /** Names of links and the oscillators they join, e.g. { name: 'front to rear', from: 0, to: 1 }. */
  readonly links: readonly { readonly name: string; readonly from: number; readonly to: number }[]
  readonly frequencies: 'common' | 'own'
  readonly frequencyHz: Range
  /** Strongest K, rad/s. */
  readonly couplingMostPerSecond: number
  readonly range: Range
  readonly unit: string
  readonly stepSeconds: number
}

/** Parts of a genome. A lag each link; couplings are not negative, because the lag can turn a pull into a push. */
export function phaseOscillatorsParts(design: PhaseOscillatorsDesign) {
  const { outputs, links, frequencies, frequencyHz, couplingMostPerSecond, range, unit } = design
  demand(
    links.length > 0,
    'phaseOscillators.links',
    'none',
    'at least one link; without use open-loop oscillators',
  )
  return {
    frequency: real({
      length: frequencies === 'own' ? outputs : 1,
      low: frequencyHz[0],
      high: frequencyHz[1],
      scale: 'log',
      unit: 'Hz',
    }),
    amplitude: real({ length: outputs, low: 0, high: (range[1] - range[0]) / 2, unit }),
    coupling: real({ length: links.length, low: 0, high: couplingMostPerSecond, unit: 'rad/s' }),
    lag: real({ length: links.length, low: -0.5, high: 0.5, unit: 'turn' }),
  }
}

/** Values of those parts. */
export interface PhaseOscillatorsGenes {
  readonly frequency: ArrayLike<number>
  readonly amplitude: ArrayLike<number>
  readonly coupling: ArrayLike<number>
  readonly lag: ArrayLike<number>
}

/** The controller that a genome describes; phases start spread evenly, so that no two start alike. */
export function phaseOscillatorsFrom(
  design: PhaseOscillatorsDesign,
  { frequency, amplitude, coupling, lag }: PhaseOscillatorsGenes,
): Controller {
  const { outputs, links, frequencies, range, stepSeconds } = design
  demandNumbers('phaseOscillators.frequency', frequency, frequencies === 'own' ? outputs : 1)
  demandNumbers('phaseOscillators.coupling', coupling, links.length)
  demandNumbers('phaseOscillators.lag', lag, links.length)
  const each = Array.from({ length: outputs }, (_, i) => i)
  return phaseOscillators({
    frequenciesHz: each.map((i) => frequency[frequencies === 'own' ? i : 0]!),
    links: links.map(({ from, to }, i) => {
      return { from, to, couplingPerSecond: coupling[i]!, lagTurns: lag[i]! }
    }),
    startTurns: each.map((i) => i / outputs),
    amplitudes: amplitude,
    range,
    stepSeconds,
  })
}

/** Lines for a person: what each link wants. */
export function describeLinks(
  { links }: PhaseOscillatorsDesign,
  { coupling, lag }: Pick<PhaseOscillatorsGenes, 'coupling' | 'lag'>,
): string[] {
  return links.map(({ name, from, to }, i) => {
    const ahead = lag[i]! >= 0 ? 'ahead of' : 'behind'
    const turns = Number(Math.abs(lag[i]!).toPrecision(3))
    return `${name}: oscillator ${from + 1} ${turns} turn ${ahead} ${to + 1}, pull ${Number(coupling[i]!.toPrecision(3))} rad/s`
  })
}
