// What a lattice is made of, as plain data: point masses joined by viscoelastic struts over a ground. SI units
// (m, s, kg, N); the unit is the last part of a name. Types only; build.ts checks a description and lays it out
// as flat arrays, kernel.ts moves it.

/** Components of a node's position, in the order x (along the ground), y (up). */
export const dimensions = 2

export interface NodeSpec {
  readonly positionM: readonly number[]
  /** At rest when absent. */
  readonly velocityMps?: readonly number[]
  readonly massKg: number
  /** Held where it is. */
  readonly pinned?: boolean
  /** Coefficient of friction while it slides towards +x and towards -x; no friction when absent. */
  readonly friction?: { readonly forward: number; readonly backward: number }
}

/** A Kelvin-Voigt strut: a spring and a dashpot side by side. */
export interface StrutSpec {
  readonly a: number
  readonly b: number
  /** The distance of its nodes at the start when absent. */
  readonly restM?: number
  readonly stiffnessNpm: number
  readonly dampingNspm: number
}

/**
 * An active strut: its rest length is commanded, rest * (1 + strain * sin(2 pi (frequency * t + phase))), with
 * the frequency of its group. Its dashpot is the rubber around the actuator: it acts on the rate of the total
 * length, not on the rate of (length - commanded length).
 */
export interface ActuatorSpec extends StrutSpec {
  readonly group: number
  readonly strain: number
  readonly phaseTurns: number
  /** Tension and thrust stay within this; unlimited when absent. */
  readonly forceLimitN?: number
}

/** A node moved along a given path: position = start + amplitude * sin(2 pi (frequency * t + phase)). */
export interface PrescribedSpec {
  readonly node: number
  readonly group: number
  readonly amplitudeM: readonly number[]
  readonly phaseTurns: number
}

/** Struts and nodes that share one drive frequency. */
export interface DriveGroupSpec {
  readonly frequencyHz: number
  /**
   * Actuators follow their command with a first-order lag of this time constant: the steady answer to a sine is
   * smaller by cos d and later by d, tan d = 2 pi frequency * lag. Prescribed nodes have none.
   */
  readonly lagSeconds?: number
}

/** Ground as heights at equal spacing, straight lines between them, level beyond the ends. */
export interface GroundSpec {
  readonly firstXM: number
  readonly spacingM: number
  readonly heightsM: readonly number[] | Float64Array
}

/** Contact after Hunt and Crossley: f = stiffness d^n + damping d^n dd/dt, d the depth of a node; never pulls. */
export interface ContactSpec {
  /** N / m^exponent. */
  readonly stiffness: number
  /** N s / m^(exponent + 1). */
  readonly damping: number
  readonly exponent: 1 | 1.5
  /** Deeper than this the simulation has failed; the step size is chosen for contact up to this depth. */
  readonly depthLimitM: number
}

export interface LatticeSpec {
  readonly nodes: readonly NodeSpec[]
  /** Passive struts. */
  readonly struts: readonly StrutSpec[]
  readonly actuators?: readonly ActuatorSpec[]
  readonly groups?: readonly DriveGroupSpec[]
  readonly prescribed?: readonly PrescribedSpec[]
  /** Acceleration, e.g. [0, -9.81]. */
  readonly gravityMps2: readonly number[]
  /** Linear drag on every node, force = -drag * velocity. */
  readonly dragNspm?: number
  readonly ground?: GroundSpec
  readonly contact?: ContactSpec
  /** Simulated time of this lattice starts at 0; drives are still before `startSeconds` and grow over `rampSeconds`. */
  readonly drive?: { readonly startSeconds: number; readonly rampSeconds: number }
  /** Refused when it is not stable. */
  readonly stepSeconds: number
}
