// What a person is told of a walker: how to let it go, in units of the bench, and what its use brings with it. The
// cautions follow from the use.

import { aluminiumSquareTubes } from '../../../shared/making/stock.js'
import type { Parts, Process, Use } from '../../../shared/making/types.js'
import { numbers, timeSeconds } from './numbers.js'
import type { Release } from './release.js'

const degrees = (radians: number) => `${((radians * 180) / Math.PI).toFixed(2)} degrees`
const perSecond = (rate: number) => `${(rate / timeSeconds).toFixed(3)} rad/s`

/** Lines for a person, with units. */
export function describeWalker({ stance, gamma }: Release): readonly string[] {
  const { theta, thetaRate, phiRate } = stance
  const fallM = 2 * numbers.legM * Math.abs(theta) * gamma
  return [
    `Legs: two, straight, ${(numbers.legM * 1000).toFixed(0)} mm from hip to foot, as light as can be; hip ${numbers.hipKg} kg.`,
    `Ramp: ${degrees(gamma)} (1 in ${(1 / gamma).toFixed(0)}), stepping stones or a chequered gap where the feet pass.`,
    `Release: both feet on the ramp, the legs ${degrees(theta)} on each side of its normal, the front one carrying.`,
    `Release: front leg turning forwards at ${perSecond(-thetaRate)}, the angle between the legs at ${perSecond(phiRate)}.`,
    `A step comes down by about ${(fallM * 1000).toFixed(1)} mm: ${(numbers.hipKg * numbers.gravityMps2 * fallM * 1000).toFixed(0)} mJ of gravity's work.`,
  ]
}

const legTube = aluminiumSquareTubes[0]!

/** Legs of the lightest square tube in stock on a hinge. What is evolved is how to let it go, so every genome can be made. */
export const walkerProcess: Process = {
  name: 'two tubes on a hinge',
  methods: ['cutting-to-length', 'machining', 'screwing'],
  stock: [legTube],
  actuators: [],
}

/** The same for every genome. The model's legs have no mass; these have an eighth of the hip's each. */
export function partsOfWalker(): Parts {
  const legKg = legTube.areaM2 * legTube.material.densityKgpm3 * numbers.legM
  return {
    struts: ['left leg', 'right leg'].map((name) => ({ name, stock: legTube.name, lengthM: numbers.legM })),
    massKg: numbers.hipKg + 2 * legKg,
  }
}

/** No motor, no energy but its weight; what falls is the walker itself. */
export const useOfWalker: Use = {
  places: ['culvert'],
  wetted: 'raw-water',
  energy: ['gravity'],
  gasPressurePa: 0,
  gasVolumeM3: 0,
  liquidPressurePa: 0,
  storedElasticJ: 0,
  suspendedKg: numbers.hipKg,
  suspendedHeightM: numbers.legM,
  movingParts: true,
  // The legs close under the walker's weight; twice for the blow of a fall. Assumed.
  peakForceN: 2 * numbers.hipKg * numbers.gravityMps2,
  rotationHz: 0,
  // Lamp and camera at the hip.
  voltageV: 5,
  battery: 'lithium',
  hottestC: 40,
  onRunningMachine: false,
  vibrationHz: 0,
  upstreamOfPump: true,
}
