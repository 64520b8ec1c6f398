// How a lattice lies in memory: the flat arrays that the reference (reference/) and the WebAssembly kernel read, in
// double precision. D = dimensions (2 or 3). One lattice is one replicate. Lattices of one body share their arrays
// (vary.ts): an array that is the same object is the same for all of them.
//
// Node record, `stride` = 3 D numbers: position | velocity | force, SI units. Forces are 0 between steps. What names a
// node in an index array is the *offset of its record* (node * stride), unless it says "node number".
//
// Struts lie in one list: `passiveCount` passive ones, then `activeCount` active ones, then `guidedCount` guided ones.
// Arrays "of driven struts" belong to the active and guided ones: entry j is strut passiveCount + j.
//
// Order of one step, always, because floating-point addition is not associative; every list by index:
//   0 guide: sensors, then the strains of guided struts
//   1 passive struts  2 active struts  3 guided struts  4 drag struts  5 areas or volumes  6 keep-apart pairs
//   7 nodes: node drag, contact, friction, integration     8 step + 1, rotors, drive, prescribed nodes
// Formulas: above the functions in reference/. Empty lists cost nothing.

import type { Strokes } from './build-parts.js'
import type { LatticeSpec } from './spec.js'

export interface Lattice {
  readonly dimensions: 2 | 3
  readonly stride: number
  readonly nodeCount: number
  readonly passiveCount: number
  readonly activeCount: number
  readonly guidedCount: number
  readonly sensorCount: number
  readonly dragCount: number
  /** Areas in 2-D, volumes in 3-D. */
  readonly fillCount: number
  readonly apartCount: number
  readonly groupCount: number
  readonly prescribedCount: number

  // State: these, and nothing else, change from step to step.
  readonly nodes: Float64Array
  /** nodeCount: 1 where the ground pushed in the last integration, else 0; kept only while there are sensors. */
  readonly touching: Float64Array
  /** sensorCount: filtered values. */
  readonly sensed: Float64Array
  /** guidedCount: commanded strain. */
  readonly guidedStrain: Float64Array
  /** 2 groupCount: sin and cos of the phase of every group since the drive started. */
  readonly rotors: Float64Array
  /** 2 groupCount: sin and cos of the angle that rotors turn by in the next step; constant without a sweep. */
  readonly rotation: Float64Array
  /** 2 groupCount: rotors times how far the drive has grown (0 to 1). */
  readonly driven: Float64Array
  /** Steps done. */
  step: number

  // What the caller may change between calls of advance().
  /** guidedCount: strain wanted by the caller, e.g. a controller. */
  readonly hostStrain: Float64Array
  dragNspm: number

  // Nodes
  /** 0 for nodes that are pinned or moved along a path. */
  readonly inverseMass: Float64Array
  readonly massKg: Float64Array
  /** Acceleration, D numbers. */
  readonly gravity: Float64Array
  /** forward, backward in 2-D; forward, backward, sideways in 3-D; a node each. */
  readonly friction: Float64Array
  /** 3-D: record of the node that the friction's forward direction points at, -1 for +x. Empty in 2-D. */
  readonly heading: Int32Array

  // Struts
  /** 2 a strut. */
  readonly ends: Int32Array
  readonly restM: Float64Array
  readonly stiffnessNpm: Float64Array
  /** stiffness * rest. */
  readonly stiffnessRestN: Float64Array
  readonly dampingNspm: Float64Array
  // Driven struts
  /** Place of its group's sine in `driven`. */
  readonly group: Int32Array
  readonly strainCos: Float64Array
  readonly strainSin: Float64Array
  /** Infinity where there is no limit; so for all limits. */
  readonly limitN: Float64Array
  readonly powerMostW: Float64Array
  // Guided struts
  readonly strokeMost: Float64Array
  /** Largest change of strain in one step: limit of the rate * h. */
  readonly strainStepMost: Float64Array
  /** guidedCount + 1: rows feedbackFirst[j] to feedbackFirst[j + 1] - 1 of the feedback belong to guided strut j. */
  readonly feedbackFirst: Int32Array
  /** Sensor number of every feedback row. */
  readonly feedbackSensor: Int32Array
  readonly feedbackGain: Float64Array
  // Sensors
  /** 0 contact, 1 strain. */
  readonly sensorKind: Int32Array
  /** Contact: node number. Strain: strut number. */
  readonly sensorAt: Int32Array
  /** min(1, h / filter time). */
  readonly sensorRate: Float64Array

  // Drag struts
  /** 2 a drag strut. */
  readonly dragEnds: Int32Array
  /** N s/m^2. */
  readonly dragNormal: Float64Array
  /** Normal minus tangential coefficient, N s/m^2. */
  readonly dragDifference: Float64Array

  // Areas, volumes
  /** D + 1 each. */
  readonly fillEnds: Int32Array
  /** m^2 or m^3. */
  readonly fillRest: Float64Array
  /** Stiffness / rest. */
  readonly fillStiffness: Float64Array

  // Keep-apart pairs
  /** 2 a pair. */
  readonly apartEnds: Int32Array
  readonly apartStiffnessNpm: Float64Array
  /** stiffness * least distance. */
  readonly apartStiffnessLeastN: Float64Array

  // Ground
  /**
   * Heights with one more at every end, as high as the end, which makes the ground level beyond. 2-D: one row.
   * 3-D: row after row along z, `groundColumns` heights each.
   */
  readonly heightsM: Float64Array
  readonly groundColumns: number
  readonly groundRows: number
  /** x of the first height (the added one), 1 / spacing, highest height (-Infinity: no ground), z of the first row,
   * 1 / spacing of rows. */
  readonly terrain: Float64Array
  /** k, lambda, 1 where the exponent is 1.5 (else 0). */
  readonly contact: Float64Array
  readonly depthLimitM: number

  // Drive
  /** At the start of the drive, rad/s. */
  readonly angularRadps: Float64Array
  /** Change of the angular frequency during a sweep, rad/s^2; 0 without. */
  readonly sweepRadps2: Float64Array
  /** Steps that the sweep takes; 0 without. */
  readonly sweepSteps: Int32Array
  /** 2 groupCount: sin and cos of the angle that `rotation` turns by in a step of a sweep. */
  readonly rotationTurn: Float64Array
  readonly driveStartStep: number
  readonly rampSteps: number
  readonly stepSeconds: number
  // Prescribed nodes
  readonly prescribedEnds: Int32Array
  /** Place of the group's sine in `driven`. */
  readonly prescribedGroup: Int32Array
  /** D each. */
  readonly prescribedStartM: Float64Array
  /** D each. */
  readonly prescribedAmplitudeM: Float64Array
  readonly prescribedCos: Float64Array
  readonly prescribedSin: Float64Array

  /** For vary.ts and messages. */
  readonly source: Source
}

/** What the lattice was built from, its state at the start, and what its step size rests on (a number a node). */
export interface Source {
  readonly spec: LatticeSpec
  readonly start: Pick<Lattice, 'nodes' | 'rotors' | 'rotation' | 'driven'>
  readonly strokes: Strokes
  readonly rowStiffnessNpm: Float64Array
  readonly rowDampingNspm: Float64Array
}

/** Stride of a 2-D node record: x y | vx vy | fx fy. */
export const planeStride = 6
/** Stride of a 3-D node record: x y z | vx vy vz | fx fy fz. */
export const spaceStride = 9

/** Keeps 0 / 0 away from a foot at rest, m/s, and from a heading without direction, m; far below all that matters. */
export const tiny = 1e-200

/** Steps between two fresh sines of the rotors: keeps the rounding of the recurrence below 1e-13. */
export const freshEverySteps = 256
/** Steps between two choke points; also at the end of every call. */
export const lookEverySteps = 64
