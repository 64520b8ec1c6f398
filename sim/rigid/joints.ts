// Where a joint is and how fast it moves, from the poses and velocities of its two bodies; and what an effort in it
// does to them. Place: 2-D hinge, turn of b less turn of a, counted through whole turns; 3-D hinge, turn of b against
// a about the common axis, likewise; slider, way of b's end from a's end along the axis carried by a. Place 0 is where
// the bodies' own axes agree (hinge) or the ends meet (slider).

import { atan2 } from '../../shared/detmath/inverse-trigonometry.js'
import { cos, sin } from '../../shared/detmath/trigonometry.js'
import type { JointSpec } from './spec.js'

/** Pose, velocity and centre of one body, and the load on it, as world.ts keeps them. */
export interface Held {
  readonly pose: Float64Array
  readonly velocity: Float64Array
  readonly centre: Float64Array
  readonly force: Float64Array
  readonly torque: Float64Array
}

/** v turned as a body of this pose is turned, into out. */
export function turned(pose: Float64Array, v: readonly number[], out: Float64Array): void {
  if (pose.length === 3) {
    const [c, s] = [cos(pose[2]!), sin(pose[2]!)]
    out[0] = c * v[0]! - s * v[1]!
    out[1] = s * v[0]! + c * v[1]!
    return
  }
  // v + 2 w (u x v) + 2 u x (u x v), u and w the vector and scalar part of the quaternion.
  const [ux, uy, uz, w] = [pose[3]!, pose[4]!, pose[5]!, pose[6]!]
  const [vx, vy, vz] = [v[0]!, v[1]!, v[2]!]
  const tx = 2 * (uy * vz - uz * vy)
  const ty = 2 * (uz * vx - ux * vz)
  const tz = 2 * (ux * vy - uy * vx)
  out[0] = vx + w * tx + uy * tz - uz * ty
  out[1] = vy + w * ty + uz * tx - ux * tz
  out[2] = vz + w * tz + ux * ty - uy * tx
}

/** World place of a point given in a body's own axes. */
export function worldPoint(pose: Float64Array, own: readonly number[], out: Float64Array): void {
  turned(pose, own, out)
  for (let i = 0; i < out.length; i++) out[i] = pose[i]! + out[i]!
}

/** Velocity of the point of a body that is at this place. */
function pointVelocity({ velocity, centre }: Held, place: Float64Array, out: Float64Array): void {
  const [rx, ry] = [place[0]! - centre[0]!, place[1]! - centre[1]!]
  if (out.length === 2) {
    out[0] = velocity[0]! - velocity[2]! * ry
    out[1] = velocity[1]! + velocity[2]! * rx
    return
  }
  const rz = place[2]! - centre[2]!
  const [wx, wy, wz] = [velocity[3]!, velocity[4]!, velocity[5]!]
  out[0] = velocity[0]! + wy * rz - wz * ry
  out[1] = velocity[1]! + wz * rx - wx * rz
  out[2] = velocity[2]! + wx * ry - wy * rx
}

/** Adds a force at a place to a body's load. */
function addForceAt(held: Held, place: Float64Array, direction: Float64Array, size: number): void {
  const { force, torque, centre } = held
  for (let i = 0; i < force.length; i++) force[i]! += size * direction[i]!
  const [rx, ry] = [place[0]! - centre[0]!, place[1]! - centre[1]!]
  const [fx, fy] = [size * direction[0]!, size * direction[1]!]
  if (force.length === 2) {
    torque[0]! += rx * fy - ry * fx
    return
  }
  const [rz, fz] = [place[2]! - centre[2]!, size * direction[2]!]
  torque[0]! += ry * fz - rz * fy
  torque[1]! += rz * fx - rx * fz
  torque[2]! += rx * fy - ry * fx
}

const dot = (a: Float64Array, b: Float64Array) => {
  let sum = 0
  for (let i = 0; i < a.length; i++) sum += a[i]! * b[i]!
  return sum
}

export interface JointMotion {
  readonly spec: JointSpec
  readonly a: number
  readonly b: number
  place: number
  rate: number
  readonly axis: Float64Array
  readonly endA: Float64Array
  readonly endB: Float64Array
}

const fullTurn = 2 * Math.PI

/** Brings place and rate up to date. A hinge may turn by less than half a turn between two calls. */
export function readJoint(joint: JointMotion, a: Held, b: Held): void {
  const { spec } = joint
  worldPoint(b.pose, spec.onBM, joint.endB)
  if (spec.axis) turned(a.pose, spec.axis, joint.axis)
  if (spec.kind === 'fixed') return
  if (spec.kind === 'slider') {
    readSlider(joint, a, b)
    return
  }
  const angle = a.pose.length === 3 ? b.pose[2]! - a.pose[2]! : turnAbout(spec.axis!, a.pose, b.pose)
  joint.place += wrapped(angle - joint.place)
  if (a.pose.length === 3) {
    joint.rate = b.velocity[2]! - a.velocity[2]!
    return
  }
  joint.rate = 0
  for (let i = 0; i < 3; i++) joint.rate += (b.velocity[3 + i]! - a.velocity[3 + i]!) * joint.axis[i]!
}

/** The same angle between minus half a turn and half a turn. */
function wrapped(angle: number): number {
  return angle - fullTurn * Math.round(angle / fullTurn)
}

/** Angle of b against a about an axis that both share. */
function turnAbout(axis: readonly number[], a: Float64Array, b: Float64Array): number {
  // Vector and scalar part of conj(a) b.
  const [ax, ay, az, aw] = [-a[3]!, -a[4]!, -a[5]!, a[6]!]
  const [bx, by, bz, bw] = [b[3]!, b[4]!, b[5]!, b[6]!]
  const x = aw * bx + ax * bw + ay * bz - az * by
  const y = aw * by - ax * bz + ay * bw + az * bx
  const z = aw * bz + ax * by - ay * bx + az * bw
  const w = aw * bw - ax * bx - ay * by - az * bz
  return 2 * atan2(x * axis[0]! + y * axis[1]! + z * axis[2]!, w)
}

const wayScratch = [new Float64Array(2), new Float64Array(3)] as const
const otherScratch = [new Float64Array(2), new Float64Array(3)] as const

function readSlider(joint: JointMotion, a: Held, b: Held): void {
  const { spec, axis, endA, endB } = joint
  worldPoint(a.pose, spec.onAM, endA)
  const way = wayScratch[axis.length === 2 ? 0 : 1]
  const other = otherScratch[axis.length === 2 ? 0 : 1]
  for (let i = 0; i < way.length; i++) way[i] = endB[i]! - endA[i]!
  joint.place = dot(way, axis)
  pointVelocity(b, endB, way)
  pointVelocity(a, endB, other)
  for (let i = 0; i < way.length; i++) way[i]! -= other[i]!
  joint.rate = dot(way, axis)
}

/** Puts an effort on b and, turned round, on a. */
export function addEffort(joint: JointMotion, effort: number, a: Held, b: Held): void {
  if (joint.spec.kind === 'slider') {
    addForceAt(b, joint.endB, joint.axis, effort)
    addForceAt(a, joint.endB, joint.axis, -effort)
    return
  }
  if (a.torque.length === 1) {
    b.torque[0]! += effort
    a.torque[0]! -= effort
    return
  }
  for (let i = 0; i < 3; i++) {
    b.torque[i]! += effort * joint.axis[i]!
    a.torque[i]! -= effort * joint.axis[i]!
  }
}
