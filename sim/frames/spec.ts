// What a framework is made of, as plain data: nodes in a plane joined by straight bars that stretch, bend (welded or
// hinged at their ends) or both, perhaps repeated periodically. SI units; a pad of unit depth has EA and EI per metre
// of depth, and its moduli are then pascals. ("Frames" are what a replay shows; a structure is a framework here.)

/** Place x, y in metres. */
export type Point = readonly [number, number]

export interface BarSpec {
  readonly a: number
  readonly b: number
  /** In a periodic cell: end b lies in the copy of the cell that is moved by shift[0] and shift[1] periods. */
  readonly shift?: readonly [number, number]
  /** Stretching stiffness E A; a bar of length L is a spring of axialN / L. */
  readonly axialN: number
  /** Bending stiffness E I of a wall that is welded to its nodes; a bar without it is pin-jointed (central force). */
  readonly bendingNm2?: number
  /** Shear stiffness kappa G A (Timoshenko); rigid in shear (Euler-Bernoulli) when absent. */
  readonly shearN?: number
  /** Which of the rotations of its node an end is welded to; 0 when absent. Other numbers are other bodies at a hinge. */
  readonly turnA?: number
  readonly turnB?: number
  /** Mass a length, and rotary inertia rho I a length; none when absent. Only vibrations ask for them. */
  readonly massKgpm?: number
  readonly rotaryKgm?: number
}

/** A torsion spring between two rotations of one node. */
export interface HingeSpec {
  readonly node: number
  readonly turns: readonly [number, number]
  readonly stiffnessNmprad: number
}

export interface FrameworkSpec {
  readonly nodes: readonly Point[]
  readonly bars: readonly BarSpec[]
  readonly hinges?: readonly HingeSpec[]
  /** The two periods of a periodic cell. */
  readonly periods?: readonly [Point, Point]
}
