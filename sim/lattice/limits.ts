// What the actuators of a lattice can do at most: their own numbers, else those of their class. Classes are real kinds of
// actuators with their sources (shared/making/actuators.ts); a class's power goes with the length of the strut.

import { actuatorClasses, strutLimits } from '../../shared/making/actuators.js'
import type { ActuatorClass } from '../../shared/making/types.js'
import { distanceM } from './build-checks.js'
import type { ActuatorLimits, LatticeSpec } from './spec.js'

/** Of a driven strut that names no class: the workshop's own. */
export const usualActuator: ActuatorClass = actuatorClasses.bellows

/** Of every driven strut: actuators, then guided struts. Infinity where there is no limit. */
export interface DrivenLimits {
  readonly forceN: Float64Array
  readonly strain: Float64Array
  readonly strainRatePerSecond: Float64Array
  readonly powerW: Float64Array
}

const unlimited = {
  forceLimitN: Number.POSITIVE_INFINITY,
  strainLimit: Number.POSITIVE_INFINITY,
  strainRateLimitPerSecond: Number.POSITIVE_INFINITY,
  powerLimitW: Number.POSITIVE_INFINITY,
} as const

/** The limits that hold for a driven strut of rest length `restM`. */
export function limitsOf(strut: ActuatorLimits, restM: number): Required<Omit<ActuatorLimits, 'actuator'>> {
  const { actuator = usualActuator } = strut
  const most = actuator === 'unlimited' ? unlimited : strutLimits(actuator, restM)
  return {
    forceLimitN: strut.forceLimitN ?? most.forceLimitN,
    strainLimit: strut.strainLimit ?? most.strainLimit,
    strainRateLimitPerSecond: strut.strainRateLimitPerSecond ?? most.strainRateLimitPerSecond,
    powerLimitW: strut.powerLimitW ?? most.powerLimitW,
  }
}

export function drivenLimits(spec: LatticeSpec): DrivenLimits {
  const { actuators = [], guided = [] } = spec
  const count = actuators.length + guided.length
  const limits = {
    forceN: new Float64Array(count),
    strain: new Float64Array(count),
    strainRatePerSecond: new Float64Array(count),
    powerW: new Float64Array(count),
  }
  for (let j = 0; j < count; j++) {
    const strut = actuators[j] ?? guided[j - actuators.length]!
    const most = limitsOf(strut, strut.restM ?? distanceM(spec, strut.a, strut.b))
    limits.forceN[j] = most.forceLimitN
    limits.strain[j] = most.strainLimit
    limits.strainRatePerSecond[j] = most.strainRateLimitPerSecond
    limits.powerW[j] = most.powerLimitW
  }
  return limits
}
