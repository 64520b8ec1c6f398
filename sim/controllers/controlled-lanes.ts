// Controllers on replicates side by side in the kernel: the same meaning as advanceControlled() on every lane, bit for
// bit in double precision. A file of its own, because whoever does not use the kernel need not carry it.

import type { Fault } from '../lattice/advance.js'
import { advanceLanes, type Lanes, unpackLane } from '../lattice/lanes.js'
import { type Controller, demand, latticeSensors, type Sense, stepsPerCommand } from './controller.js'

/**
 * Runs every lane under its own controller for a number of commands; the fault of every lane, or undefined. All
 * controllers give commands at one interval. A lane is copied out of the kernel for every command when its controller
 * senses anything; one without inputs costs nothing but its own steps. A lane with a fault stands still, its controller
 * with it.
 */
export function advanceLanesControlled(
  lanes: Lanes,
  controllers: readonly Controller[],
  commands: number,
  sense: Sense = latticeSensors,
): readonly (Fault | undefined)[] {
  const { lattices, faults } = lanes
  const [first] = controllers
  demand(
    first !== undefined && controllers.length === lattices.length,
    'controllers',
    `${controllers.length} for ${lattices.length} lanes`,
    'one each',
  )
  for (const [i, { stepSeconds, outputs }] of controllers.entries()) {
    const { guidedCount } = lattices[i]!
    demand(
      stepSeconds === first.stepSeconds,
      `controllers[${i}].stepSeconds`,
      stepSeconds,
      `${first.stepSeconds} s`,
    )
    demand(
      outputs.length === guidedCount,
      `controllers[${i}].outputs`,
      outputs.length,
      `${guidedCount}, one a strut`,
    )
  }
  const steps = stepsPerCommand(first.stepSeconds, lattices[0]!.stepSeconds)
  const inputs = controllers.map(({ inputCount }) => new Float64Array(inputCount))
  for (let command = 0; command < commands; command++) {
    for (const [i, controller] of controllers.entries()) {
      if (faults[i]) continue
      if (controller.inputCount > 0) sense(unpackLane(lanes, i), inputs[i]!)
      controller.step(inputs[i]!)
      lattices[i]!.hostStrain.set(controller.outputs)
    }
    advanceLanes(lanes, steps)
  }
  return faults
}
