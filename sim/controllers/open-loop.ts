// Open-loop oscillators: every output swings by itself, command = middle + amplitude sin(2 pi (f t + phase)), all with
// one frequency or each with its own. Exact at any time: t is a count of intervals, nothing is integrated.

import { sin } from '../../shared/detmath/trigonometry.js'
import { real } from '../../shared/encodings.js'
import { type Controller, demand, demandDesign, demandNumbers, type Range, within } from './controller.js'

export interface OpenLoopDesign {
  readonly outputs: number
  /** One frequency for all, or one each. */
  readonly frequencies: 'common' | 'own'
  /** Lowest (above 0) and highest frequency, Hz. */
  readonly frequencyHz: Range
  /** Of commands; the amplitude goes up to half of it, about its middle. */
  readonly range: Range
  /** Unit of the commands, e.g. 'strain' or 'rad'. */
  readonly unit: string
  readonly stepSeconds: number
}

/** Parts of a genome, in the order in which they are best declared; a problem may give them other names. */
export function openLoopParts(design: OpenLoopDesign) {
  const { outputs, frequencies, frequencyHz, range, unit } = design
  return {
    frequency: real({
      length: frequencies === 'own' ? outputs : 1,
      low: frequencyHz[0],
      high: frequencyHz[1],
      scale: 'log',
      unit: 'Hz',
    }),
    amplitude: real({ length: outputs, low: 0, high: (range[1] - range[0]) / 2, unit }),
    phase: real({ length: outputs, low: 0, high: 1, unit: 'turn' }),
  }
}

/** Values of those parts. */
export interface OpenLoopGenes {
  readonly frequency: ArrayLike<number>
  readonly amplitude: ArrayLike<number>
  readonly phase: ArrayLike<number>
}

/** The controller that a genome describes. */
export function openLoopFrom(design: OpenLoopDesign, genes: OpenLoopGenes): Controller {
  const { outputs: count, frequencies, range, stepSeconds } = design
  demand(Number.isInteger(count) && count > 0, 'openLoop.outputs', count, 'a whole number above 0')
  demandDesign('openLoop', stepSeconds, range)
  demandNumbers('openLoop.frequency', genes.frequency, frequencies === 'own' ? count : 1)
  demandNumbers('openLoop.amplitude', genes.amplitude, count)
  demandNumbers('openLoop.phase', genes.phase, count)
  const outputs = new Float64Array(count)
  const state = Float64Array.of(0)
  const middle = (range[0] + range[1]) / 2
  const say = () => {
    for (let i = 0; i < count; i++) {
      const cycles = genes.frequency[frequencies === 'own' ? i : 0]! * (state[0]! * stepSeconds)
      // Whole turns are taken off before the sine: what is left is exact to the rounding of the count of cycles.
      const turns = cycles - Math.floor(cycles) + genes.phase[i]!
      outputs[i] = within(middle + genes.amplitude[i]! * sin(2 * Math.PI * turns), range)
    }
  }
  say()
  return {
    stepSeconds,
    inputCount: 0,
    outputs,
    state,
    step: () => {
      state[0]!++
      say()
    },
  }
}
