// What a lattice is made of, as plain data: point masses joined by viscoelastic struts over a ground, in the plane or
// in space. SI units (m, s, kg, N); the unit is the last part of a name. Types only; build.ts checks a description
// and lays it out as flat arrays (layout.ts), reference/ and the WebAssembly kernel move it.
//
// Active struts have the limits of a real kind of actuator (limits.ts) unless they say 'unlimited'.
//
// Axes: x along the ground, y up, z across (3-D only). A vector has as many components as the lattice dimensions.

import type { ActuatorClass } from '../../shared/making/types.js'

export interface NodeSpec {
  readonly positionM: readonly number[]
  /** At rest when absent. */
  readonly velocityMps?: readonly number[]
  readonly massKg: number
  /** Held where it is. */
  readonly pinned?: boolean
  /** No friction when absent. */
  readonly friction?: FrictionSpec
  /** 3-D: the node's forward direction is horizontally towards this node; +x when absent. */
  readonly headingNode?: number
}

/**
 * Coefficients of friction. In the plane `forward` counts while the node slides towards +x, `backward` towards -x.
 * In space they belong to the node's heading; in between the coefficients go along an ellipse,
 * mu = sqrt((mu_f c)^2 + mu_s^2 (1 - c^2)), c the cosine of the angle between sliding and heading, seen from above.
 */
export interface FrictionSpec {
  readonly forward: number
  readonly backward: number
  /** Across the heading, 3-D; the larger of the other two when absent. */
  readonly sideways?: number
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
 * What an actuator can do: what its class can (limits.ts), except where a number is given here. A strut that is only
 * driven by its group has its stroke made smaller until strain and rate of strain fit (its command is a sine of known
 * frequency); a guided strut's are limited in every step. Force and power are limited in every step.
 */
export interface ActuatorLimits {
  /** The workshop's small bellows when absent. 'unlimited': nothing limits it but the numbers given here. */
  readonly actuator?: ActuatorClass | 'unlimited'
  /** Tension and thrust stay within this. */
  readonly forceLimitN?: number
  /** Largest change of the rest length relative to it. */
  readonly strainLimit?: number
  /** Largest rate of the commanded strain, 1/s. */
  readonly strainRateLimitPerSecond?: number
  /** Most mechanical power that the strut gives to its nodes. */
  readonly powerLimitW?: number
}

/**
 * An active strut: its rest length is commanded, rest * (1 + strain * sin(2 pi (frequency * t + phase))), with
 * the frequency of its group. Its dashpot is the rubber around the actuator: it acts on the rate of the total
 * length, not on the rate of (length - commanded length).
 */
export interface ActuatorSpec extends StrutSpec, ActuatorLimits {
  readonly group: number
  readonly strain: number
  readonly phaseTurns: number
}

/**
 * A guided strut: an active strut whose commanded strain is a state. Each step its target is what the caller wants
 * (`hostStrain` of the lattice), plus the drive of its group if it has one, plus gain times sensor for every row of
 * its feedback; the target is kept within the stroke and approached at most at the limit rate of strain.
 */
export interface GuidedSpec extends StrutSpec, ActuatorLimits {
  /** Of the drive; no drive when absent. */
  readonly group?: number
  /** 0 when absent. */
  readonly strain?: number
  /** 0 when absent. */
  readonly phaseTurns?: number
  readonly feedback?: readonly { readonly sensor: number; readonly gain: number }[]
}

/**
 * What guided struts can feel, smoothed by a first-order filter. Contact: 1 while the ground pushes the node, else 0.
 * Strain: (length - rest) / rest of a strut, counted through struts, actuators and guided struts.
 */
export type SensorSpec =
  | { readonly kind: 'contact'; readonly node: number; readonly filterSeconds?: number }
  | { readonly kind: 'strain'; readonly strut: number; readonly filterSeconds?: number }

/**
 * Viscous drag on a straight slender rod between two nodes, larger across than along it (resistive-force theory,
 * Gray and Hancock, The propulsion of sea-urchin spermatozoa, 1955, from memory). Coefficients per length, N s/m^2.
 */
export interface DragStrutSpec {
  readonly a: number
  readonly b: number
  readonly normalNspm2: number
  readonly tangentNspm2: number
}

/** 2-D: a triangle that resists a change of its area A with the energy (1/2) stiffness (A - rest)^2 / rest. */
export interface AreaSpec {
  /** Counter-clockwise. */
  readonly nodes: readonly [number, number, number]
  readonly stiffnessNpm: number
  /** The area at the start when absent. */
  readonly restM2?: number
}

/** 3-D: a tetrahedron that resists a change of its volume V with the energy (1/2) stiffness (V - rest)^2 / rest. */
export interface VolumeSpec {
  /** The last one sees the first three counter-clockwise from the far side: (e1 x e2) . e3 is positive. */
  readonly nodes: readonly [number, number, number, number]
  readonly stiffnessPa: number
  /** The volume at the start when absent. */
  readonly restM3?: number
}

/** Self-contact: two nodes closer than `leastM` are pushed apart by a spring; farther away nothing happens. */
export interface KeepApartSpec {
  readonly a: number
  readonly b: number
  readonly leastM: number
  readonly stiffnessNpm: number
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
  /** The frequency goes in a straight line from `frequencyHz` to `toHz` in this time, then stays. Not with a lag. */
  readonly sweep?: { readonly toHz: number; readonly seconds: number }
}

/**
 * Ground as heights at equal spacing, level beyond the ends. In the plane: straight lines between them. In space:
 * `rows` rows of equally many heights, one row after the other along +z; bilinear patches between them.
 */
export interface GroundSpec {
  readonly firstXM: number
  readonly spacingM: number
  readonly heightsM: readonly number[] | Float64Array
  /** 3-D; 1 when absent, which is the same profile everywhere along z. */
  readonly rows?: number
  /** Of the first row, 3-D; 0 when absent. */
  readonly firstZM?: number
  /** Between rows, 3-D; `spacingM` when absent. */
  readonly spacingZM?: number
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
  /** 2 when absent. */
  readonly dimensions?: 2 | 3
  readonly nodes: readonly NodeSpec[]
  /** Passive struts. */
  readonly struts: readonly StrutSpec[]
  readonly actuators?: readonly ActuatorSpec[]
  readonly guided?: readonly GuidedSpec[]
  readonly sensors?: readonly SensorSpec[]
  readonly dragStruts?: readonly DragStrutSpec[]
  /** 2-D only. */
  readonly areas?: readonly AreaSpec[]
  /** 3-D only. */
  readonly volumes?: readonly VolumeSpec[]
  readonly keepApart?: readonly KeepApartSpec[]
  readonly groups?: readonly DriveGroupSpec[]
  readonly prescribed?: readonly PrescribedSpec[]
  /** Acceleration, e.g. [0, -9.81]. */
  readonly gravityMps2: readonly number[]
  /** Linear drag on every node, force = -drag * velocity. */
  readonly dragNspm?: number
  readonly ground?: GroundSpec
  readonly contact?: ContactSpec
  /** Several bodies are meant; otherwise a lattice that does not hang together is refused. */
  readonly separateBodies?: boolean
  /** Simulated time of this lattice starts at 0; drives are still before `startSeconds` and grow over `rampSeconds`. */
  readonly drive?: { readonly startSeconds: number; readonly rampSeconds: number }
  /** Refused when it is not stable. 'auto': the stability bound times stepSafety (stability.ts). */
  readonly stepSeconds: number | 'auto'
}
