// The numbers of the mount's world, each with where it comes from. SI units. The workshop, the pump and the sensor are
// invented; the numbers are ordinary ones of the trade, good enough for comparing designs, not for building.

export const numbers = {
  gravityMps2: 9.81,

  // The pump: two-pole motor at 50 Hz with its slip (2900 rpm; name plates of small pumps, from memory) and an idle
  // speed by inverter. Shaken by its unbalance, once a turn, mostly up and down. 0.05 mm at 48 Hz is 11 mm/s rms, bad
  // for a small pump by ISO 10816-1, 1995 (from memory): the mount is for pumps that shake.
  fullHz: 48.33,
  idleHz: 15,
  shakeM: 0.05e-3,
  // A direct start takes 1 to 2 s; a small pump coasts down in a few seconds (from memory).
  runUpSeconds: 1.6,
  coastSeconds: 2.2,

  // How the cases count in the weighted mean of transmissibility. Assumed: nine hours of ten at full speed; starts and
  // stops are short, but they are where parts wear and screws come loose.
  weights: { idle: 0.1, full: 0.84, 'run-up': 0.03, coasting: 0.03 },

  // One simulation of any case. Shaking grows over the first quarter second.
  seconds: 2.6,
  growSeconds: 0.25,
  // The last second is measured: 14 turns at idle speed.
  measureSeconds: 1,
  samplesPerSecond: 400,

  // The sensor: a vibration logger in its box. Its mass and the place of its centre of mass are assumed.
  sensorKg: 1.2,
  sensorHeightM: 0.025,
  // Its foot is a plate on all upper joints, its body stiff against any strut of the mount: struts of 100 kN/m.
  bodyNpm: 1e5,
  bodyRelaxationSeconds: 1e-4,
  // Part of the sensor's mass that sits in its foot.
  footShare: 0.4,

  // A mount must still carry the sensor at this many times its weight: knocks, a hand, a fall of the pump's speed on a
  // rough bearing. Assumed; without it a search finds mounts that are about to buckle, because they are soft.
  weightsCarried: 2,

  // Room below the sensor: its box hangs over the guard of the coupling, and must not touch it whatever the pump does. The
  // gap is assumed, and so is what a mount counts worse for each whole room that it lacks, in each case: enough that
  // no mount gains by lacking any.
  roomM: 1e-3,
  lackWeight: 1,

  // The mount: moulded struts as thick as their class says and this deep across; bows of strip 10 mm wide.
  depthM: 0.03,
  // A joint: a moulded boss 10 mm across and as deep as the mount (2.5 g) with a steel pin of 4 mm (3 g) and its clips.
  jointKg: 0.006,

  // Scatter of one build, one place and one day: standard deviations as shares, cut off at three. Assumed, but for the
  // batch of rubber: +-30 % between makers (Gent), of which one maker's batches have a third.
  sensorScatter: 0.05,
  batchScatter: 0.1,
  speedScatter: 0.02,
  // The line of shaking leans this much from the upright, rad.
  leanRad: 0.15,
} as const

/** What the pump does in each case: turns per second at the start, at the end, and how long the change takes. */
export const cases = {
  idle: { fromHz: numbers.idleHz, toHz: numbers.idleHz, seconds: 0 },
  full: { fromHz: numbers.fullHz, toHz: numbers.fullHz, seconds: 0 },
  'run-up': { fromHz: 0, toHz: numbers.fullHz, seconds: numbers.runUpSeconds },
  coasting: { fromHz: numbers.fullHz, toHz: 0, seconds: numbers.coastSeconds },
} as const
export type CaseName = keyof typeof cases
export const caseNames = Object.keys(cases) as readonly CaseName[]
