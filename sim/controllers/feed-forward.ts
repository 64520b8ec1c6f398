// A small feed-forward network: layers of neurons, each the activation of its bias plus the weighted values of the layer
// before. It has no memory; its commands follow from the inputs of the same instant.
// (E.g. Rumelhart, Hinton and Williams, Learning representations by back-propagating errors, 1986, from memory.)
//
// Weights in one list: layer after layer, neuron after neuron, each its bias and then one weight for every value
// before it. Sums are taken in that order.

import { real } from '../../shared/encodings.js'
import { type ActivationName, activations, toRange } from './activations.js'
import { type Controller, demand, demandDesign, demandNumbers, type Range } from './controller.js'

export interface FeedForwardDesign {
  /** Numbers of inputs, of neurons in every hidden layer, and of outputs. */
  readonly layers: readonly number[]
  readonly hidden: ActivationName
  readonly output: ActivationName
  /** Weights and biases lie within +-weightMost. */
  readonly weightMost: number
  /** Commands: the bounds of the output's activation are laid onto it. */
  readonly range: Range
  readonly stepSeconds: number
}

/** Number of weights and biases. */
export function feedForwardWeights({ layers }: Pick<FeedForwardDesign, 'layers'>): number {
  let total = 0
  for (let i = 1; i < layers.length; i++) total += (layers[i - 1]! + 1) * layers[i]!
  return total
}

/** Parts of a genome. */
export function feedForwardParts(design: FeedForwardDesign) {
  const { weightMost } = design
  return {
    weights: real({ length: feedForwardWeights(design), low: -weightMost, high: weightMost, unit: '1' }),
  }
}

/** The controller that a genome describes. Its state is the values of all neurons, inputs first. */
export function feedForwardFrom(
  design: FeedForwardDesign,
  { weights }: { readonly weights: ArrayLike<number> },
): Controller {
  const { layers, hidden, output, range, stepSeconds } = design
  const sound = layers.length >= 2 && layers.every((size) => Number.isInteger(size) && size > 0)
  demand(sound, 'feedForward.layers', `[${layers}]`, 'inputs, hidden layers and outputs, each above 0')
  demandDesign('feedForward', stepSeconds, range)
  demandNumbers('feedForward.weights', weights, feedForwardWeights(design))
  const state = new Float64Array(layers.reduce((sum, size) => sum + size, 0))
  const outputs = new Float64Array(layers.at(-1)!)
  const inputCount = layers[0]!
  const first = state.length - outputs.length
  const infer = () => {
    let weight = 0
    let before = 0
    for (let layer = 1; layer < layers.length; layer++) {
      const { apply } = activations[layer + 1 < layers.length ? hidden : output]
      const into = before + layers[layer - 1]!
      for (let neuron = 0; neuron < layers[layer]!; neuron++) {
        let sum = weights[weight++]!
        for (let i = before; i < into; i++) sum += weights[weight++]! * state[i]!
        state[into + neuron] = apply(sum)
      }
      before = into
    }
    for (let i = 0; i < outputs.length; i++) outputs[i] = toRange(output, state[first + i]!, range)
  }
  infer()
  return {
    stepSeconds,
    inputCount,
    outputs,
    state,
    step: (inputs) => {
      for (let i = 0; i < inputCount; i++) state[i] = inputs[i]!
      infer()
    },
  }
}
