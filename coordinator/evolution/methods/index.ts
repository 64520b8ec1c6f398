// The methods: one row each. Adding one is a file and a row here.

import { check } from '../../../shared/check.js'
import type { Method } from '../types.js'
import { ageFitnessPareto } from './age-fitness-pareto.js'
import { drift } from './drift.js'
import { generational } from './generational.js'
import { nsgaTwo } from './nsga-ii.js'
import { onePlusLambda } from './one-plus-lambda.js'
import { randomSampling } from './random-sampling.js'
import { steadyState } from './steady-state.js'

export const methods: readonly Method[] = [
  steadyState,
  generational,
  nsgaTwo,
  ageFitnessPareto,
  onePlusLambda,
  drift,
  randomSampling,
]

const byName = new Map(methods.map((method) => [method.name, method]))

/** The row of that name; a plan names no other. */
export function methodNamed(name: string): Method {
  const method = byName.get(name)
  check(method !== undefined, `method ${name} is a row of the table`)
  return method
}
