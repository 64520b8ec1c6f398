// What a neuron makes of its sum, by name. All of detmath, so that a network has the same bits everywhere.

import { exp } from '../../shared/detmath/exponential.js'
import { tanh } from '../../shared/detmath/hyperbolic.js'

interface Activation {
  apply(sum: number): number
  /** Lowest and highest value; undefined where there is no bound. */
  readonly bounds: readonly [number, number] | undefined
}

/** One row a function. */
export const activations = {
  /** In (-1, 1). */
  tanh: { apply: tanh, bounds: [-1, 1] },
  /** 1 / (1 + exp(-x)), in (0, 1). */
  logistic: { apply: logistic, bounds: [0, 1] },
  /** max(0, x). */
  relu: { apply: (sum: number) => Math.max(0, sum), bounds: undefined },
  identity: { apply: (sum: number) => sum, bounds: undefined },
} as const satisfies { readonly [name: string]: Activation }

export type ActivationName = keyof typeof activations

/** 1 / (1 + exp(-x)): 0 and 1 far out, never a number that is none. */
export function logistic(x: number): number {
  return 1 / (1 + exp(-x))
}

/**
 * A value of the activation as a command: its bounds onto the range; without bounds the value itself, kept within
 * the range.
 */
export function toRange(name: ActivationName, value: number, [low, high]: readonly [number, number]): number {
  const { bounds }: Activation = activations[name]
  const command = bounds ? low + ((value - bounds[0]) / (bounds[1] - bounds[0])) * (high - low) : value
  return Math.min(high, Math.max(low, command))
}
