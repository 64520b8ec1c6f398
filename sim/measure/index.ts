// What authors of problems measure with. Every tool names its units, the source of its formula, and is held to
// published values in tests/reference/measure-*.test.ts.

export { bandRadps } from './bands.js'
export { type BlockModuli, blockModuli } from './block.js'
export type * from './cell.js'
export * from './elasticity.js'
export {
  type Account,
  type BudgetReport,
  type EnergyBudget,
  openBudget,
  reportBudget,
  type StoredEnergy,
  sampleBudget,
  storedEnergy,
} from './energy.js'
export { type ForceRecord, newForceRecord, peakForceN, rmsForceN, takeForces } from './forces.js'
export {
  type CentreOfMass,
  type ContactRecord,
  centreOfMass,
  contactRecord,
  costOfTransport,
  deviationOf,
  newStatistics,
  peakOf,
  rmsOf,
  type Statistics,
  takeValue,
  travelM,
} from './gait.js'
export { type Homogenised, homogenise } from './homogenise.js'
export { type LinearModel, linearModel } from './linear-model.js'
export { type Mode, type Modes, naturalModes } from './modes.js'
export { amplitudeOf, type Harmonic, type HarmonicInput, harmonicResponse, phaseTurnsOf } from './response.js'
export { dominantTone, type Peak, type Spectrum, spectralPeaks, spectrum, type Window } from './spectrum.js'
export { fitTones, type Tone, type TonesFit, toneAt } from './tones.js'
export {
  peakRatio,
  type SweptPoint,
  sweptTransmissibility,
  type Transmissibility,
  transmissibility,
} from './transmissibility.js'
