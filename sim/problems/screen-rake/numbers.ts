// The numbers of the rake's world, each with where it comes from. SI units. The machine, its screen and the water
// works are invented; the numbers are ordinary ones of the trade, good enough for comparing designs, not for building.

import { cos, sin } from '../../../shared/detmath/trigonometry.js'
import { actuatorClasses } from '../../../shared/making/actuators.js'

const degree = Math.PI / 180
const motor = actuatorClasses.wormGearedMotor

export const numbers = {
  degree,
  gravityMps2: 9.81,
  waterKgpm3: 1000,

  // The intake: a bar screen 0.5 m wide across a small channel. Bars lean back 70 degrees from the horizontal (hand-
  // and machine-raked screens stand at 60 to 80 degrees: common practice, no source). At the top the bars are bent over
  // and run down at 45 degrees as the apron, so that tines pass between them until the debris slides: matted debris
  // slides on wet steel up to a friction of 1. Straight piece and bend are assumed; the crest is 1.09 m high.
  screenAngle: 70 * degree,
  screenLengthM: 1.06,
  bendRadiusM: 0.15,
  barThicknessM: 0.04,
  apronAngle: 45 * degree,
  apronLengthM: 0.3,
  troughDepthM: 0.3,
  troughLengthM: 0.6,

  // The machine hangs from a beam across the channel, above the screen; its base pin lies in this window.
  baseLowM: [-0.4, 1.4],
  baseHighM: [0.8, 2.1],

  /** Arms are led no higher than this below their base pin. */
  belowPinM: 0.1,

  // Links: square tube of aluminium, 40 x 40 x 3 mm: 444 mm^2 at 2700 kg/m^3.
  linkWidthM: 0.04,
  linkKgpm: 1.2,
  // Comb: 12 tines of stainless rod, 8 mm (50 mm^2 at 7900 kg/m^3: 0.4 kg/m each), on a cross bar of 0.5 m.
  tineCount: 12,
  tineKgpm: 0.4,
  tineWidthM: 0.012,
  crossBarKg: 0.6,
  crossBarRadiusM: 0.02,
  /** Steel tines and aluminium links on wet debris, 0.3 to 0.5: assumed. */
  machineFriction: 0.4,

  // Drives: a worm-geared motor of 24 V (class and source: shared/making) and a chain stage of the given ratio with
  // an efficiency of 0.9 (assumed). Commands go no faster than half the speed without load, where a motor with a
  // straight line of torque over speed gives its most power.
  motor,
  gears: [1, 2, 4],
  stageEfficiency: 0.9,
  /** Motors are this strong against their class: with low voltage and wear, or fresh. Assumed. */
  strengthLeast: 0.85,
  strengthMost: 1.05,
  /** The rotor as felt at the motor's own shaft: 2e-5 kg m^2 behind a worm of 1:40 (assumed). */
  rotorKgm2: 0.032,
  motorKg: motor.fittingKg + 0.5,
  /** Rack and pinion of the sliding arm. */
  pinionM: 0.05,
  /** Position control: full effort at this error, and damping for a tenth of a second. Assumed. */
  fullEffortRad: 0.05,
  fullEffortM: 0.02,
  dampingSeconds: 0.1,
  /** Time in which a drive runs up to its full rate. Assumed. */
  rampSeconds: 0.4,

  // The trial: the water presses the debris on for half a second while the machine stands parked, then it works for 6 s.
  settleSeconds: 0.5,
  workSeconds: 6,
  stepSeconds: 1 / 60,
  solverRounds: 2,
  solverSweeps: 4,
  sampleSeconds: 0.05,
  framesPerSecond: 20,
  /**
   * What counts as cleared: a piece behind the lip in full, and this much of the share of its way to behind the lip for
   * one that was only raised. Without it every machine that lifts scores like one that stands still, and nothing leads
   * to clearing.
   */
  raisedCounts: 0.5,
  /** Deeper than this in the screen or deck at the start, the machine cannot be put up. */
  startDepthMostM: 0.03,

  // Debris: bundles that lie across several bars and tines and are hooked in them, so they slide and hardly turn: a
  // moment of inertia that lets none roll within a trial (assumed). Drag coefficient of blunt bodies about 1.1 (common
  // practice, no source).
  pieces: 4,
  dragCoefficient: 1.1,
  pieceInertiaKgm2: 1,
} as const

type Place = readonly [number, number]
const { screenAngle, screenLengthM, bendRadiusM, apronAngle } = numbers

/** Where the straight piece of the screen ends and the bend begins. */
export const bendStartM: Place = [screenLengthM * cos(screenAngle), screenLengthM * sin(screenAngle)]
/** Middle of the bend. */
export const bendM: Place = [
  bendStartM[0] + bendRadiusM * sin(screenAngle),
  bendStartM[1] - bendRadiusM * cos(screenAngle),
]
/** Where the bend ends and the apron begins: the lip, behind which debris slides down by itself. */
export const lipM: Place = [
  bendM[0] + bendRadiusM * sin(apronAngle),
  bendM[1] + bendRadiusM * cos(apronAngle),
]

/** Limits of a drive with a stage of this ratio; effort N m, rate rad/s. */
export function driveOf(ratio: number) {
  const { forceMost, rateMostPerSecond, powerMost } = numbers.motor
  return {
    effortMost: forceMost * ratio * numbers.stageEfficiency,
    rateMost: rateMostPerSecond / 2 / ratio,
    powerMostW: powerMost * numbers.stageEfficiency,
  }
}
