// A rigid world that moves. The library (Rapier, deterministic build, compiled to WebAssembly, single precision)
// solves contacts and joints; this file steps it, drives the motors, adds up what they did, catches states that are
// not finite, and reads everything back as plain numbers.
//
// Time is a count of steps of fixed length; no clock is read. The same description, commands and loads give the same
// bits on every machine (the library's deterministic build; held by digests in the tests).
//
// What the library does not tell, and how it is found here:
// - Joints: it tells no forces. Motors are therefore ours (motors.ts), their effort and work exact by construction.
//   The forces in pins and guides are not told at all.
// - Contacts: it tells one impulse a point. In lasting contact that sum is (n + 1)/n of what the balance of momentum
//   asks, n the rounds of the solver (measured, a block at rest); in the first step of an impact it is exact. Forces
//   here are impulse / h * n / (n + 1): right for lasting contact, n/(n + 1) of the blow of an impact.
// - States that are not finite: it switches such a body off without a word. Speeds beyond 400 times the world's size
//   a second and turns beyond an eighth of a turn a step: it cuts them off without a word. advance() looks for all
//   three, every 16 steps and at its end: they are faults.

import { ByteWriter } from '../../shared/bytes.js'
import { check } from '../../shared/check.js'
import { hex, sha256 } from '../../shared/digests.js'
import { cutOffs } from './check.js'
import type { Contact, EngineWorld, MassOf } from './engine.js'
import { type Held, type JointMotion, readJoint, worldPoint } from './joints.js'
import { driveMechanism, type Mechanism, startMechanism } from './mechanism.js'
import { bookWork, type Drive, startDrive } from './motors.js'
import type { JointSpec, RigidSpec } from './spec.js'

/** Why and when a simulation failed. */
export interface Fault {
  readonly reason: string
  readonly seconds: number
}

/** Steps between two looks for states that are not finite. */
const stepsBetweenLooks = 16
/** Further out than this single precision is coarser than a millimetre. */
const placeMostM = 1e4

export class RigidWorld {
  readonly dimensions: 2 | 3
  /** Name and version of the library: part of every digest. */
  readonly library: string
  readonly stepSeconds: number
  /** Steps done. */
  steps = 0
  private readonly engine: EngineWorld
  private readonly spec: RigidSpec
  private readonly bodyNumbers: ReadonlyMap<string, number>
  private readonly jointNumbers: ReadonlyMap<string, number>
  private readonly held: readonly Held[]
  private readonly joints: readonly JointMotion[]
  private readonly drives: readonly (Drive | undefined)[]
  private readonly mechanism: Mechanism
  /** Bodies of the mechanism that its drives move; empty without drives. */
  private readonly driven: readonly number[]
  private readonly asked: readonly Float64Array[]
  private readonly changed = new Set<number>()
  private isFree = false

  /** Made by the build functions of rigid2d.ts and rigid3d.ts, which have checked the description. */
  constructor(library: string, dimensions: 2 | 3, spec: RigidSpec, engine: EngineWorld) {
    this.library = library
    this.dimensions = dimensions
    this.spec = spec
    this.stepSeconds = spec.stepSeconds
    this.engine = engine
    this.bodyNumbers = new Map(spec.bodies.map((body, i) => [body.name, i]))
    this.jointNumbers = new Map((spec.joints ?? []).map((joint, i) => [joint.name, i]))
    this.held = spec.bodies.map(() => emptyHeld(dimensions))
    this.asked = spec.bodies.map(() => new Float64Array(dimensions === 2 ? 3 : 6))
    this.joints = (spec.joints ?? []).map((joint) => ({
      spec: joint,
      a: this.bodyNumbers.get(joint.a)!,
      b: this.bodyNumbers.get(joint.b)!,
      place: builtPlace(joint, spec),
      rate: 0,
      axis: new Float64Array(dimensions),
      endA: new Float64Array(dimensions),
      endB: new Float64Array(dimensions),
    }))
    for (let i = 0; i < spec.bodies.length; i++) this.read(i)
    for (const joint of this.joints) readJoint(joint, this.held[joint.a]!, this.held[joint.b]!)
    this.drives = this.joints.map(({ spec: { motor }, place }) => motor && startDrive(motor, place))
    const isDriven = this.drives.some((drive) => drive !== undefined)
    const jointed = new Set(isDriven ? this.joints.flatMap(({ a, b }) => [a, b]) : [])
    this.driven = [...jointed].filter((i) => spec.bodies[i]!.fixed !== true).sort((a, b) => a - b)
    this.mechanism = startMechanism({
      joints: this.joints,
      drives: this.drives,
      held: this.held,
      gravity: spec.gravityMps2,
      inverseMass: Float64Array.from(spec.bodies, (body, i) =>
        body.fixed ? 0 : 1 / engine.masses[i]!.massKg,
      ),
      inverseInertia: spec.bodies.map(() => new Float64Array(dimensions === 2 ? 1 : 9)),
    })
    for (const i of this.driven) engine.readInverseInertia(i, this.mechanism.inverseInertia[i]!)
  }

  /** Simulated seconds since the beginning. */
  get seconds(): number {
    return this.steps * this.stepSeconds
  }

  /** Number of a body, for the calls below. The name must be one of the description. */
  body(name: string): number {
    const number = this.bodyNumbers.get(name)
    check(number !== undefined, `there is a body named ${name}`)
    return number
  }

  /** Number of a joint. */
  joint(name: string): number {
    const number = this.jointNumbers.get(name)
    check(number !== undefined, `there is a joint named ${name}`)
    return number
  }

  /**
   * Steps the world; the fault that ends the simulation, or nothing. A world with a fault is not stepped again. Whoever
   * steps by less than 16 at a time hears of a fault up to 16 steps late and asks look() at the end.
   */
  advance(steps: number): Fault | undefined {
    check(!this.isFree, 'a world that was given back is not stepped')
    for (let i = 0; i < steps; i++) {
      this.stepOnce()
      const isLast = i === steps - 1 && steps >= stepsBetweenLooks
      if (isLast || this.steps % stepsBetweenLooks === 0) {
        const fault = this.look()
        if (fault) return fault
      }
    }
    return undefined
  }

  private stepOnce(): void {
    const { engine, stepSeconds: h } = this
    for (const i of this.driven) {
      const { force, torque } = this.held[i]!
      const asked = this.asked[i]!
      for (let k = 0; k < force.length; k++) force[k] = asked[k]!
      for (let k = 0; k < torque.length; k++) torque[k] = asked[force.length + k]!
    }
    if (this.driven.length > 0) driveMechanism(this.mechanism, h)
    for (const i of this.driven) engine.setLoad(i, this.held[i]!.force, this.held[i]!.torque)
    for (const i of this.changed) {
      const { force, torque } = this.held[i]!
      if (!this.driven.includes(i)) engine.setLoad(i, force, torque)
    }
    this.changed.clear()
    engine.step()
    this.steps++
    if (this.driven.length === 0) return
    for (const i of this.driven) {
      this.read(i)
      if (this.dimensions === 3) engine.readInverseInertia(i, this.mechanism.inverseInertia[i]!)
    }
    for (const [i, joint] of this.joints.entries()) {
      const before = joint.rate
      readJoint(joint, this.held[joint.a]!, this.held[joint.b]!)
      const drive = this.drives[i]
      if (drive) bookWork(drive, before, joint.rate, h)
    }
  }

  private read(i: number): void {
    const { pose, velocity, centre } = this.held[i]!
    this.engine.readPose(i, pose)
    this.engine.readVelocity(i, velocity)
    this.engine.readCentre(i, centre)
  }

  /** The first body whose state is not finite or cut off, or that has left the world. */
  look(): Fault | undefined {
    for (const [i, body] of this.spec.bodies.entries()) {
      if (body.fixed) continue
      const { pose, velocity } = this.held[i]!
      this.read(i)
      const isSound = this.engine.isAlive(i) && pose.every(Number.isFinite) && velocity.every(Number.isFinite)
      if (!isSound) return this.fault(`the state of body ${body.name} is not finite`)
      for (let k = 0; k < this.dimensions; k++) {
        if (Math.abs(pose[k]!) > placeMostM) return this.fault(`body ${body.name} has left the world`)
      }
      const limit = this.overLimit(velocity)
      if (limit) return this.fault(`body ${body.name} ${limit}`)
    }
    return undefined
  }

  /** What the library cuts off, a little below where it does. */
  private overLimit(velocity: Float64Array): string | undefined {
    const d = this.dimensions
    const [along, spin] = [velocity.subarray(0, d), velocity.subarray(d)]
    const size = (v: Float64Array) => Math.sqrt(v.reduce((sum, x) => sum + x * x, 0))
    const [speedMost, spinMost] = cutOffs(this.spec)
    if (size(along) > 0.999 * speedMost) return `is faster than ${speedMost} m/s`
    return size(spin) > 0.999 * spinMost ? `turns by more than an eighth of a turn a step` : undefined
  }

  private fault(reason: string): Fault {
    return { reason, seconds: this.seconds }
  }

  /** Tells the drive of a joint where to go: rad or m, finite. */
  command(joint: number, target: number): void {
    check(Number.isFinite(target), 'a command is a finite number')
    this.driveOf(joint).target = target
  }

  /** Tells a drive without stiffness how fast to go: rad/s or m/s, finite. */
  commandRate(joint: number, rate: number): void {
    check(Number.isFinite(rate), 'a command is a finite number')
    this.driveOf(joint).targetRate = rate
  }

  /** What the drive of a joint does and did (read only). */
  driveOf(joint: number): Drive {
    const drive = this.drives[joint]
    check(drive !== undefined, 'the joint has a motor')
    return drive
  }

  /** Place of a joint: rad through whole turns, or m. */
  placeOf(joint: number): number {
    this.refresh(joint)
    return this.joints[joint]!.place
  }

  /** Rate of a joint, rad/s or m/s. */
  rateOf(joint: number): number {
    this.refresh(joint)
    return this.joints[joint]!.rate
  }

  private refresh(number: number): void {
    const joint = this.joints[number]!
    this.read(joint.a)
    this.read(joint.b)
    readJoint(joint, this.held[joint.a]!, this.held[joint.b]!)
  }

  /**
   * Sets the load on a body from now on: force at its centre of mass, N (2 or 3 numbers), and torque, N m (1 or 3).
   * A load that is not finite is a fault at the next look, as the library would only drop it.
   */
  load(body: number, force: readonly number[], torque: readonly number[]): void {
    const asked = this.asked[body]!
    const held = this.held[body]!
    const d = this.dimensions
    for (let k = 0; k < d; k++) held.force[k] = asked[k] = force[k]!
    for (let k = 0; k < held.torque.length; k++) held.torque[k] = asked[d + k] = torque[k] ?? 0
    this.changed.add(body)
  }

  /** Copies of pose (x y angle, or x y z and quaternion) and velocity of the centre of mass (vx vy w, or 3 + 3). */
  pose(body: number): Float64Array {
    this.engine.readPose(body, this.held[body]!.pose)
    return this.held[body]!.pose.slice()
  }
  velocity(body: number): Float64Array {
    this.engine.readVelocity(body, this.held[body]!.velocity)
    return this.held[body]!.velocity.slice()
  }
  /** The same without copies: live arrays that the next step changes. Not to be written. */
  peek(body: number): { readonly pose: Float64Array; readonly velocity: Float64Array } {
    this.engine.readPose(body, this.held[body]!.pose)
    this.engine.readVelocity(body, this.held[body]!.velocity)
    return this.held[body]!
  }
  /** World place of a point given in a body's own axes. */
  pointOf(body: number, own: readonly number[]): Float64Array {
    const out = new Float64Array(this.dimensions)
    this.engine.readPose(body, this.held[body]!.pose)
    worldPoint(this.held[body]!.pose, own, out)
    return out
  }
  massOf(body: number): MassOf {
    return this.engine.masses[body]!
  }

  /** Sets where a body is and how it moves, as if it had been built so. */
  put(body: number, pose: readonly number[], velocity: readonly number[]): void {
    this.engine.place(body, Float64Array.from(pose), Float64Array.from(velocity))
    this.read(body)
  }

  /** What touches what, with the forces of the last step. */
  contacts(): Contact[] {
    return this.engine.contacts()
  }

  /** Kinetic energy of everything, J. */
  kineticJ(): number {
    return this.moving().reduce((sum, i) => sum + this.engine.kineticJ(i), 0)
  }

  /** Potential energy in gravity, J, 0 at the origin. */
  gravitationalJ(): number {
    let sum = 0
    for (const i of this.moving()) {
      this.read(i)
      for (let k = 0; k < this.dimensions; k++) {
        sum -= this.engine.masses[i]!.massKg * this.spec.gravityMps2[k]! * this.held[i]!.centre[k]!
      }
    }
    return sum
  }

  /** Momentum, kg m/s, and angular momentum about the origin, kg m^2/s (1 number in 2-D, 3 in 3-D). */
  momenta(): { readonly linear: Float64Array; readonly angular: Float64Array } {
    const linear = new Float64Array(this.dimensions)
    const angular = new Float64Array(this.dimensions === 2 ? 1 : 3)
    const own = new Float64Array(angular.length)
    for (const i of this.moving()) {
      this.read(i)
      const { massKg } = this.engine.masses[i]!
      const { velocity: v, centre: c } = this.held[i]!
      for (let k = 0; k < this.dimensions; k++) linear[k]! += massKg * v[k]!
      this.engine.spinMomentum(i, own)
      for (let k = 0; k < own.length; k++) angular[k]! += own[k]!
      angular[own.length - 1]! += massKg * (c[0]! * v[1]! - c[1]! * v[0]!)
      if (own.length === 3) {
        angular[0]! += massKg * (c[1]! * v[2]! - c[2]! * v[1]!)
        angular[1]! += massKg * (c[2]! * v[0]! - c[0]! * v[2]!)
      }
    }
    return { linear, angular }
  }

  private moving(): number[] {
    return [...this.spec.bodies.keys()].filter((i) => this.spec.bodies[i]!.fixed !== true)
  }

  /** Hex SHA-256 of the library's name and version, the step count, and every pose, velocity and work done. */
  digest(): string {
    const writer = new ByteWriter(4096).text(this.library).count(this.steps)
    for (let i = 0; i < this.held.length; i++) {
      this.read(i)
      for (const value of this.held[i]!.pose) writer.double(value)
      for (const value of this.held[i]!.velocity) writer.double(value)
    }
    for (const drive of this.drives) writer.double(drive?.workJ ?? 0)
    return hex(sha256(writer.finish()))
  }

  /** Hex SHA-256 of the library's own copy of its whole state, with its name and version. */
  innerDigest(): string {
    return hex(sha256(new ByteWriter().text(this.library).finish(), this.engine.snapshot()))
  }

  /** Gives the library's memory back. Nothing else of this world may be called afterwards. */
  free(): void {
    if (this.isFree) return
    this.isFree = true
    this.engine.free()
  }
}

/** Place of a 2-D hinge by the turns that its bodies are built with, whole turns included; reading keeps near it. */
function builtPlace(joint: JointSpec, { bodies }: RigidSpec): number {
  if (joint.kind !== 'hinge') return 0
  const turnOf = (name: string) => {
    const { turn } = bodies.find((body) => body.name === name)!
    return typeof turn === 'number' ? turn : 0
  }
  return turnOf(joint.b) - turnOf(joint.a)
}

function emptyHeld(dimensions: 2 | 3): Held {
  const flat = dimensions === 2
  return {
    pose: new Float64Array(flat ? 3 : 7),
    velocity: new Float64Array(flat ? 3 : 6),
    centre: new Float64Array(dimensions),
    force: new Float64Array(dimensions),
    torque: new Float64Array(flat ? 1 : 3),
  }
}
