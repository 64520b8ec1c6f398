// The numbers of the walker's world, each with where it comes from. The machine and the water works are invented.

export const numbers = {
  gravityMps2: 9.81,
  // Assumed: a walker that a person can carry, with its lamp and camera at the hip.
  legM: 0.8,
  hipKg: 2.5,
  // The slope for which the model's gaits are published to many digits (Bhounsule, 2014; Garcia and others, 1998).
  gamma: 0.009,
  // Slopes that a search may choose from where the slope is evolved; stable gaits are published up to 0.0151 rad,
  // walking of any kind up to 0.019.
  gammaLow: 0.003,
  gammaHigh: 0.025,

  // What is tried. The stride map has fallen or nearly forgotten its start after this many steps (0.589^12 = 0.002).
  stepsMost: 12,
  // Assumed: a trowelled concrete ramp under a 0.3 m step, +-0.1 mm.
  unevennessRad: 3e-4,
  // Assumed: a draught or a wet patch changes the speed by up to one percent, every fourth step.
  nudgeMost: 0.01,
  stepsPerNudge: 4,

  // A start that is this far from where its first step ends, in the model's units, counts half its speed. Assumed:
  // small enough that nothing is gained by leaving a gait for a faster start (tested), large enough to be found.
  steadiness: 0.01,

  // Integration step in units of sqrt(leg / gravity): after twelve steps angles and periods are good to 1e-6 (tested).
  step: 1 / 16,
  multiplierMost: 20,
} as const

/** sqrt(leg / gravity), s: one unit of the model's time. */
export const timeSeconds = Math.sqrt(numbers.legM / numbers.gravityMps2)
