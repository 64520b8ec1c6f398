// Controllers for machines: oscillators and small networks, each with the parts of a genome that describe it and the
// way back from a genome. Checks: tests/reference/controllers-*.test.ts.

export { type ActivationName, activations, logistic } from './activations.js'
export { advanceLanesControlled } from './controlled-lanes.js'
export {
  advanceControlled,
  type Controller,
  latticeSensors,
  noInputs,
  type Range,
  type Sense,
  stepsPerCommand,
} from './controller.js'
export {
  type FeedForwardDesign,
  feedForwardFrom,
  feedForwardParts,
  feedForwardWeights,
} from './feed-forward.js'
export { type OpenLoopDesign, type OpenLoopGenes, openLoopFrom, openLoopParts } from './open-loop.js'
export {
  describeLinks,
  type PhaseFeedback,
  type PhaseLink,
  type PhaseOscillatorsDesign,
  type PhaseOscillatorsGenes,
  type PhaseOscillatorsSpec,
  phaseOscillators,
  phaseOscillatorsFrom,
  phaseOscillatorsParts,
} from './phase-oscillators.js'
export { type RecurrentDesign, type RecurrentGenes, recurrentFrom, recurrentParts } from './recurrent.js'
