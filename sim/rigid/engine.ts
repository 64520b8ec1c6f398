// The port between world.ts, which knows nothing of the library, and rigid2d.ts and rigid3d.ts, which know nothing
// else. Arrays: a pose is x y angle (2-D) or x y z qx qy qz qw (3-D); a velocity is vx vy w or vx vy vz wx wy wz, of
// the body's centre of mass. Bodies and joints are counted as in the description.

export interface Contact {
  /** Bodies, by name. */
  readonly a: string
  readonly b: string
  /** Unit vector from a to b. */
  readonly normal: readonly number[]
  /** Force on b along the normal, N: the mean over the last step; see world.ts for what the library tells. */
  readonly pressN: number
  /** Size of the friction force, N, told the same way. */
  readonly frictionN: number
  /** Depth of the deepest point, m; negative where the two do not quite touch. */
  readonly depthM: number
}

export interface MassOf {
  readonly massKg: number
  /** Centre of mass in the body's own axes. */
  readonly centreM: readonly number[]
  /** Least principal moment of inertia about the centre of mass, kg m^2. */
  readonly inertiaLeastKgm2: number
}

export interface EngineWorld {
  step(): void
  readPose(body: number, pose: Float64Array): void
  readVelocity(body: number, velocity: Float64Array): void
  /** World place of the centre of mass. */
  readCentre(body: number, centre: Float64Array): void
  readonly masses: readonly MassOf[]
  /** Inverse of the inertia about the centre of mass, in world axes: 1 number in 2-D, 9 in 3-D. */
  readInverseInertia(body: number, inverse: Float64Array): void
  /** Kinetic energy of one body, J, and its angular momentum about its own centre (one number or three). */
  kineticJ(body: number): number
  spinMomentum(body: number, momentum: Float64Array): void
  /** False once the library has switched the body off, which it does with states that are not finite. */
  isAlive(body: number): boolean
  /** Sets force (at the centre of mass) and torque on a body from now on. */
  setLoad(body: number, force: Float64Array, torque: Float64Array): void
  /** Sets where a body is and how it moves, as if it were built so. */
  place(body: number, pose: Float64Array, velocity: Float64Array): void
  contacts(): Contact[]
  /** The library's own copy of everything, for comparing. */
  snapshot(): Uint8Array
  free(): void
}
