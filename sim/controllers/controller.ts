// What a controller is to its machine: a small state that takes in what is sensed and gives out commands, at a stated
// interval. Commands are held until the next one. Its own clock is part of its state; nothing else changes it, so the
// same inputs give the same commands to the bit.
//
// Commands are strains wanted of guided struts (`hostStrain` of a lattice), targets of motors, or whatever the author
// makes of them; each controller keeps them within the range of its design. How each kind is written in a genome and
// read back stands in its own file.

import { refuse } from '../../shared/refusals.js'
import { advance, type Fault } from '../lattice/advance.js'
import type { Lattice } from '../lattice/layout.js'

export interface Controller {
  /** From one command to the next, s. */
  readonly stepSeconds: number
  readonly inputCount: number
  /** Commands, held until the next step. */
  readonly outputs: Float64Array
  /** All that changes from step to step, for digests and to go on from. */
  readonly state: Float64Array
  /** One interval further with the inputs held; `outputs` are the commands for the interval that follows. */
  step(inputs: ArrayLike<number>): void
}

/** No inputs, for controllers that have none. */
export const noInputs: readonly number[] = []

/** Lowest and highest command. */
export type Range = readonly [number, number]

/** Steps of the simulator in one interval. Refuses ('impossible-value') an interval that is no whole number of them. */
export function stepsPerCommand(commandSeconds: number, stepSeconds: number): number {
  const ratio = commandSeconds / stepSeconds
  const steps = Math.round(ratio)
  if (!(steps >= 1) || Math.abs(ratio - steps) > 1e-6) {
    throw refuse('impossible-value', {
      detail:
        `found commands every ${commandSeconds} s and steps of ${stepSeconds} s, ${ratio} steps a command; ` +
        'expected a whole number of steps.',
      where: { field: 'controller.stepSeconds' },
    })
  }
  return steps
}

/** Reads what the controller senses into `inputs`. */
export type Sense = (lattice: Lattice, inputs: Float64Array) => void

/** The lattice's own sensors (filtered contact and strain), in their order: as many as the controller has inputs. */
export const latticeSensors: Sense = (lattice, inputs) => {
  if (inputs.length === 0) return
  const { length } = lattice.sensed
  demand(length === inputs.length, 'controller.inputCount', inputs.length, `${length}, one for every sensor`)
  inputs.set(lattice.sensed)
}

/**
 * Runs a lattice under a controller for a number of commands: sense, step the controller, guide the struts, advance. The
 * first fault, or nothing. Output j is the strain wanted of guided strut j.
 */
export function advanceControlled(
  lattice: Lattice,
  controller: Controller,
  commands: number,
  sense: Sense = latticeSensors,
): Fault | undefined {
  demand(
    controller.outputs.length === lattice.guidedCount,
    'controller.outputs',
    `${controller.outputs.length} commands for ${lattice.guidedCount} guided struts`,
    'one each',
  )
  const steps = stepsPerCommand(controller.stepSeconds, lattice.stepSeconds)
  const inputs = new Float64Array(controller.inputCount)
  for (let i = 0; i < commands; i++) {
    sense(lattice, inputs)
    controller.step(inputs)
    lattice.hostStrain.set(controller.outputs)
    const fault = advance(lattice, steps)
    if (fault) return fault
  }
  return undefined
}

/** A Refusal ('impossible-value') that names the field, unless `truth`. */
export function demand(truth: boolean, field: string, found: unknown, expected: string): asserts truth {
  if (truth) return
  throw refuse('impossible-value', {
    detail: `found ${String(found)}, expected ${expected}.`,
    where: { field },
  })
}

/** Checks what every design has. */
export function demandDesign(field: string, stepSeconds: number, [low, high]: Range): void {
  demand(stepSeconds > 0 && stepSeconds < 1e6, `${field}.stepSeconds`, stepSeconds, 'a time above 0')
  demand(low < high && high - low < 1e300, `${field}.range`, `[${low}, ${high}]`, 'a lowest below a highest')
}

export function demandNumbers(field: string, numbers: ArrayLike<number>, length: number): void {
  demand(numbers.length === length, field, `${numbers.length} numbers`, `${length}`)
  for (let i = 0; i < length; i++)
    demand(Number.isFinite(numbers[i]!), `${field}[${i}]`, numbers[i], 'a finite number')
}

/** Within a range. */
export function within(value: number, [low, high]: Range): number {
  return Math.min(high, Math.max(low, value))
}
