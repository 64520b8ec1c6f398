// The numbers of the crawler's world, each with where it comes from. SI units. The machine and the water works
// are invented; the numbers are ordinary ones of the trade, good enough for comparing designs, not for building.

import { actuatorClasses, smallBellows } from '../../../shared/making/actuators.js'
import { silicones } from '../../../shared/making/materials.js'

const { bellows } = actuatorClasses
const rubber = silicones.a10

export const numbers = {
  gravityMps2: 9.81,

  // Silicone rubber of Shore A 10, 20 and 30: rows of the workshop's materials, with their sources there.
  youngPa: {
    soft: rubber.youngPa,
    firm: silicones.a20.youngPa,
    hard: silicones.a30.youngPa,
  },
  rubberKgpm3: rubber.densityKgpm3,
  // A tube of 16 mm mean diameter with a wall of 1 mm, as sold or cast. A solid rod of the same area would buckle
  // under a compression of 1 to 4 %; the tube does at 5 to 36 % (Euler, pinned ends, 80 to 30 mm). Buckling is not
  // simulated.
  strutAreaM2: Math.PI * 0.016 * 0.001,
  strutDiameterM: 0.016,
  // c/k of the struts. tan delta = c w / k is then 0.06 to 0.19 between 10 and 30 Hz, where the body's own modes
  // are; silicone rubbers at low frequency: about 0.05 to 0.2 (from memory).
  relaxationSeconds: rubber.relaxationSeconds,
  // A moulded joint with its pin, or the like.
  jointKg: 0.005,

  // Actuators: the small bellows of the workshop's table, on compressed air; the wall is taken as soft as the softest
  // strut. The force limit is gauge pressure times bore, 5.7 N; valves and hoses limit the rate of strain.
  strainMost: bellows.strokeMost,
  pressurePa: smallBellows.pressurePa,
  boreAreaM2: smallBellows.boreAreaM2,
  actuatorFittingKg: bellows.fittingKg,
  strainRateMost: bellows.rateMostPerSecond,

  // Feet. Rubber on wet concrete and pipe walls slides at roughly 0.3 to 1 (trade tables, wide scatter); the floor's
  // own number is drawn per simulation. Factors per foot, towards +x and towards -x. Directional pads (bristles,
  // scales) slide several times more easily one way; the factors are assumed.
  feet: {
    bare: { forward: 1, backward: 1 },
    skid: { forward: 0.35, backward: 0.35 },
    pad: { forward: 0.4, backward: 1.4 },
    'pad-reversed': { forward: 1.4, backward: 0.4 },
  },
  padKg: 0.002,
  frictionMost: 1.3,

  // Ground contact: a node's weight sinks it by about 0.1 mm; a node that lands at 0.3 m/s comes up with 0.83 of
  // its speed (Hunt and Crossley, y = 0.3), the rest is left to the body's own damping.
  contactNpm: 1500,
  contactNspm2: 1500,
  depthLimitM: 0.004,

  // The sensor puck and the ring that holds it on an upper node.
  puckKg: 0.05,
  puckRadiusM: 0.018,

  // A pipe of 200 mm, an ordinary size of small drains (DN 200). Its crown is drawn and takes no part.
  boreM: 0.2,

  // The trial.
  settleSeconds: 0.6,
  // Uniform drag while settling only, so that nothing swings when the trial starts.
  settleDragNspm: 0.15,
  rampSeconds: 0.5,
  trialSeconds: 8,
  /** Longest step; shorter where a body asks for it. */
  stepSecondsMost: 1e-3,
  framesPerSecond: 25,
  samplesPerFrame: 2,
  /** Frames between two looks at whether the body is broken, five a second; the last frame is one of them. */
  framesPerLook: 5,

  // Collapse: a bay that keeps less of its area (or volume) than this, or a strut outside these multiples of its length.
  bayLeast: 0.15,
  strutRatioLeast: 0.6,
  strutRatioMost: 1.5,
} as const
