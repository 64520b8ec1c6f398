// What a rigid world is made of, as plain data: bodies with shapes and materials, joints with motors and limits. SI
// units (m, s, kg, N, rad); the unit is the last part of a name. Types only; check.ts refuses what cannot be,
// rigid2d.ts and rigid3d.ts build it, world.ts moves it.
//
// A point or direction has two numbers in 2-D (x along the ground, y up) and three in 3-D (z across). A turn is an
// angle in 2-D and a unit quaternion [x, y, z, w] in 3-D. Bodies and joints have names, so that whatever goes wrong
// can be told by name.

export type Point = readonly number[]
/** 2-D: an angle, rad, counter-clockwise. 3-D: a unit quaternion x, y, z, w. */
export type Turn = number | readonly number[]

export interface MaterialSpec {
  /** Coefficient of Coulomb friction; two materials meet as the world's frictionRule says. */
  readonly friction: number
  /** Coefficient of restitution, 0 to 1. */
  readonly restitution?: number
  /** 2-D: mass per area, kg/m^2 (density times the depth of the body). 3-D: kg/m^3. Ignored on fixed bodies. */
  readonly density: number
}

export type Outline =
  | { readonly kind: 'ball'; readonly radiusM: number }
  /** Half of every side. */
  | { readonly kind: 'box'; readonly halfM: Point }
  /** A line of this half length along the shape's own y axis, thick by the radius. */
  | { readonly kind: 'capsule'; readonly halfLengthM: number; readonly radiusM: number }
  /** 3-D only: axis along the shape's own y axis. */
  | { readonly kind: 'cylinder'; readonly halfLengthM: number; readonly radiusM: number }
  /** The convex hull of these points. */
  | { readonly kind: 'hull'; readonly pointsM: readonly Point[] }
  /** 2-D, fixed bodies only: a line through these points, without thickness or mass. */
  | { readonly kind: 'line'; readonly pointsM: readonly Point[] }

export interface ShapeSpec {
  readonly outline: Outline
  readonly material: MaterialSpec
  /** Place and turn on the body; the body's own origin and axes when absent. */
  readonly atM?: Point
  readonly turn?: Turn
  /** Shapes of two layers named in the world's `apart` pass through each other; layer '' when absent. */
  readonly layer?: string
}

export interface BodySpec {
  readonly name: string
  /** Never moves. */
  readonly fixed?: boolean
  readonly positionM: Point
  readonly turn?: Turn
  readonly velocityMps?: Point
  /** rad/s: a number in 2-D, three in 3-D. */
  readonly spinRadps?: number | Point
  readonly shapes: readonly ShapeSpec[]
  /** Mass that no shape has: a motor in an arm, a point mass. Inertia about its own centre: a number, or three in 3-D. */
  readonly extra?: {
    readonly massKg: number
    readonly centreM: Point
    readonly inertiaKgm2: number | Point
  }
  /** Watched between steps, so that it does not pass through thin things. */
  readonly fast?: boolean
}

/**
 * A geared drive in a hinge or slider: a spring and a dashpot between where it is and where it is told to be, within
 * limits of effort, rate and power. The law stands in motors.ts. Effort is N m in a hinge and N in a slider; rate
 * rad/s or m/s.
 */
export interface MotorSpec {
  /** N m/rad or N/m; 0 for a drive that only holds a rate. */
  readonly stiffness: number
  /** N m s/rad or N s/m. */
  readonly damping: number
  readonly effortMost: number
  /** The command moves no faster than this. */
  readonly rateMost: number
  /** How fast the command's rate changes, rad/s^2 or m/s^2; at once when absent. */
  readonly rampMost?: number
  /** Power given to the joint stays within this; effort that brakes is not limited by it. */
  readonly powerMostW: number
}

export interface JointSpec {
  readonly name: string
  readonly kind: 'hinge' | 'slider' | 'fixed'
  /** Names of bodies. */
  readonly a: string
  readonly b: string
  /** Where the joint is on each body, in the body's own axes; the two must be at one place when it is built. */
  readonly onAM: Point
  readonly onBM: Point
  /**
   * Slider: direction along which b moves. 3-D hinge: axis of the turn. In the own axes of a and of b (those of a
   * when absent). A 2-D hinge needs none.
   */
  readonly axis?: Point
  readonly axisOnB?: Point
  /** Range of the joint's place, rad or m; a hinge's within -pi and pi. */
  readonly range?: readonly [number, number]
  readonly motor?: MotorSpec
  /** Whether the two bodies also touch each other; not unless said. */
  readonly touching?: boolean
}

/** How the numbers of two materials that meet become one. */
export type PairRule = 'average' | 'least' | 'product' | 'most'

export interface RigidSpec {
  /** Acceleration, e.g. [0, -9.81]. */
  readonly gravityMps2: Point
  readonly stepSeconds: number
  readonly bodies: readonly BodySpec[]
  readonly joints?: readonly JointSpec[]
  /** Pairs of layers that pass through each other (a layer may be paired with itself). */
  readonly apart?: readonly (readonly [string, string])[]
  /** 'average' unless said. */
  readonly frictionRule?: PairRule
  /** 'average' unless said. */
  readonly restitutionRule?: PairRule
  /** Rounds of the contact and joint solver in one step, 1 to 64; 4 unless said. */
  readonly solverRounds?: number
  /** Sweeps over all contacts and joints within a round, 1 to 64; 1 unless said. Helps chains of light and heavy parts. */
  readonly solverSweeps?: number
  /**
   * Size of an ordinary body of this world, m; 1 unless said. The library allows an overlap of a thousandth of it
   * and looks for contacts two thousandths ahead.
   */
  readonly sizeM?: number
  /** Natural frequency of the spring that takes an overlap out again, Hz; the library's own (30) unless said. */
  readonly contactHz?: number
}
