// Loading a bundled plug-in: import it, take its default export, check that it is a problem.

import type { AnyProblem } from '../../shared/problem.js'
import { Refusal, refuse } from '../../shared/refusals.js'
import { asProblem } from '../../sim/problem.js'
import { importPlugin, type PluginSource, placeOf } from './import.js'

export type { PluginSource } from './import.js'

/**
 * The problem of a bundled plug-in. Refuses: problem-not-found (no such bundle), problem-throws (its top level threw),
 * not-a-problem and its kin, naming the field that does not fit.
 */
export async function loadPlugin(source: PluginSource): Promise<AnyProblem> {
  const exported = await importPlugin(source)
  const where = placeOf(source)
  if (exported === undefined) throw refuse('not-a-problem', { detail: 'it has no default export.', where })
  try {
    return asProblem(exported)
  } catch (error) {
    if (!(error instanceof Refusal)) throw error
    const { code, detail, cure } = error
    throw refuse(code, { detail, cure, where: { ...where, ...error.where }, cause: error })
  }
}
