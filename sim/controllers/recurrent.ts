// A continuous-time recurrent network: every neuron has a state y that leaks away and is driven by the firing rates of
// all neurons and by the inputs,
//   tau_i dy_i/dt = -y_i + sum over j of w_ij s(y_j + theta_j) + sum over k of g_ik I_k,   s(x) = 1 / (1 + exp(-x))
// (Beer, On the dynamics of small continuous-time recurrent neural networks, 1995, from memory). The first neurons give
// the commands: their firing rates s(y_i + theta_i), laid onto the range.
//
// Inputs are held over an interval. Integrated with the classical Runge-Kutta method, error of fourth order, in
// equal parts of the interval so short that (1 + sum of |w| / 4) / tau times the part stays below `partRate` (s' <= 1/4).
//
// Weights in one list: neuron after neuron, each the weights from all neurons, then those from all inputs.

import { real } from '../../shared/encodings.js'
import { rungeKutta4 } from '../ode/runge-kutta.js'
import { logistic, toRange } from './activations.js'
import { type Controller, demand, demandDesign, demandNumbers, type Range } from './controller.js'

const partRate = 0.25
const partsMost = 1000

export interface RecurrentDesign {
  readonly inputs: number
  readonly neurons: number
  /** The first of the neurons. */
  readonly outputs: number
  /** Shortest (above 0) and longest time constant, s. */
  readonly timeConstantSeconds: Range
  readonly weightMost: number
  readonly biasMost: number
  readonly range: Range
  readonly stepSeconds: number
}

/** Parts of a genome. */
export function recurrentParts({
  inputs,
  neurons,
  timeConstantSeconds,
  weightMost,
  biasMost,
}: RecurrentDesign) {
  const [low, high] = timeConstantSeconds
  return {
    timeConstant: real({ length: neurons, low, high, scale: 'log', unit: 's' }),
    bias: real({ length: neurons, low: -biasMost, high: biasMost, unit: '1' }),
    weights: real({ length: neurons * (neurons + inputs), low: -weightMost, high: weightMost, unit: '1' }),
  }
}

/** Values of those parts. */
export interface RecurrentGenes {
  readonly timeConstant: ArrayLike<number>
  readonly bias: ArrayLike<number>
  readonly weights: ArrayLike<number>
}

/** The controller that a genome describes. Its state is y, 0 at the start unless given. */
export function recurrentFrom(
  design: RecurrentDesign,
  genes: RecurrentGenes,
  start?: ArrayLike<number>,
): Controller {
  const { inputs: inputCount, neurons, outputs: outputCount, range, stepSeconds } = design
  checkDesign(design, genes)
  const state = new Float64Array(neurons)
  if (start) {
    demandNumbers('recurrent.start', start, neurons)
    for (let i = 0; i < neurons; i++) state[i] = start[i]!
  }
  const outputs = new Float64Array(outputCount)
  const held = new Float64Array(inputCount)
  const parts = partsOf(design, genes)
  const rates = ratesOf(design, genes, held)
  const advanceBy = rungeKutta4((_, y, rate) => rates(y, rate), neurons)
  const say = () => {
    for (let i = 0; i < outputCount; i++) {
      outputs[i] = toRange('logistic', logistic(state[i]! + genes.bias[i]!), range)
    }
  }
  say()
  return {
    stepSeconds,
    inputCount,
    outputs,
    state,
    step: (inputs) => {
      for (let k = 0; k < inputCount; k++) held[k] = inputs[k]!
      for (let part = 0; part < parts; part++) advanceBy(0, stepSeconds / parts, state, state)
      say()
    },
  }
}

function ratesOf({ inputs, neurons }: RecurrentDesign, genes: RecurrentGenes, held: Float64Array) {
  const { timeConstant, bias, weights } = genes
  const firing = new Float64Array(neurons)
  return (y: Float64Array, rate: Float64Array) => {
    for (let j = 0; j < neurons; j++) firing[j] = logistic(y[j]! + bias[j]!)
    let weight = 0
    for (let i = 0; i < neurons; i++) {
      let sum = -y[i]!
      for (let j = 0; j < neurons; j++) sum += weights[weight++]! * firing[j]!
      for (let k = 0; k < inputs; k++) sum += weights[weight++]! * held[k]!
      rate[i] = sum / timeConstant[i]!
    }
  }
}

/** Equal parts of the interval for one step of the integration each. */
function partsOf({ inputs, neurons, stepSeconds }: RecurrentDesign, genes: RecurrentGenes): number {
  let fastest = 0
  for (let i = 0; i < neurons; i++) {
    let sum = 0
    for (let j = 0; j < neurons; j++) sum += Math.abs(genes.weights[i * (neurons + inputs) + j]!)
    fastest = Math.max(fastest, (1 + sum / 4) / genes.timeConstant[i]!)
  }
  const parts = Math.max(1, Math.ceil((fastest * stepSeconds) / partRate))
  demand(
    parts <= partsMost,
    'recurrent.timeConstant',
    `rates of ${fastest} per second over intervals of ${stepSeconds} s`,
    `at most ${partsMost * partRate} an interval: longer time constants or shorter intervals`,
  )
  return parts
}

function checkDesign(design: RecurrentDesign, { timeConstant, bias, weights }: RecurrentGenes): void {
  const { inputs, neurons, outputs, range, stepSeconds } = design
  const whole = [inputs, neurons, outputs].every((n) => Number.isInteger(n) && n >= 0)
  demand(
    whole && outputs >= 1 && outputs <= neurons,
    'recurrent',
    `${inputs} inputs, ${neurons} neurons, ${outputs} outputs`,
    'whole numbers with 1 <= outputs <= neurons',
  )
  demandDesign('recurrent', stepSeconds, range)
  demandNumbers('recurrent.timeConstant', timeConstant, neurons)
  for (let i = 0; i < neurons; i++) {
    demand(timeConstant[i]! > 0, `recurrent.timeConstant[${i}]`, timeConstant[i], 'a time above 0')
  }
  demandNumbers('recurrent.bias', bias, neurons)
  demandNumbers('recurrent.weights', weights, neurons * (neurons + inputs))
}
