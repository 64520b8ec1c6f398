// Drift: variation without selection, as a control. A uniform parent breeds, a uniform member leaves; failed
// individuals are treated like any other, because turning them away would be selection. It is the steady-state
// machine with tournaments of one and random replacement (the Moran model of population genetics).

import type { Method } from '../types.js'
import { breedingSettings } from './breeding.js'
import { createSteady, restoreSteady, type SteadyRules } from './steady-state.js'

const rules: SteadyRules = { tournament: { size: 1, distinct: false }, replacement: 'random' }

export const drift: Method = {
  name: 'drift',
  title: 'Drift (control)',
  summary: 'variation without selection: what the same operators and budget reach by wandering',
  source: 'Moran, Random processes in genetics, 1958 (from memory)',
  settings: breedingSettings(0.5),
  defaultPopulation: 100,
  pace: 'steady',
  objectives: 'any',
  create: (context) => createSteady(context, rules),
  restore: (context, saved, individual) => restoreSteady(context, rules, saved, individual),
}
