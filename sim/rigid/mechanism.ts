// How a mechanism answers its drives: one linearly implicit step of all jointed bodies together. With u the
// velocities, M the masses, f the loads, C u = 0 the joints and B u the rates of the driven ones:
//
//   M (u' - u) = h (f + C' l + B' e)     C u' = 0     e = k (command - q - h B u') + d (r - B u')
//
// (C' and B' transposed). The drives enter as soft rows, B u' + e / (d + h k) = (k (command - q) + d r) / (d + h k);
// then one symmetric positive definite system in (l, e) is left:
//
//   (h G M^-1 G' + S) (l, e) = s - G (u + h M^-1 f)     G = C over B, S and s 0 for joints
//
// solved by Cholesky. Efforts beyond a limit become loads and the rest is solved again. (Constraints with softness:
// Catto, Soft constraints, 2011, from memory. Linearly implicit springs: Baraff and Witkin, 1998, from memory.)
// Turning of the axes during the step (gyroscopic and centrifugal terms) is left out here; the library's own step has
// what it has of it. Only the efforts leave this file.

import { addEffort, type Held, type JointMotion } from './joints.js'
import { type Drive, limited, moveCommand } from './motors.js'

/** One row of G: how the velocities of two bodies enter it, and the same times the inverse masses. */
interface Row {
  readonly a: number
  readonly b: number
  readonly onA: Float64Array
  readonly onB: Float64Array
  readonly byA: Float64Array
  readonly byB: Float64Array
}

export interface Mechanism {
  readonly joints: readonly JointMotion[]
  readonly drives: readonly (Drive | undefined)[]
  readonly held: readonly Held[]
  readonly gravity: readonly number[]
  /** Inverse masses; 0 for fixed bodies. */
  readonly inverseMass: Float64Array
  /** Inverse inertia of every body about its centre, in world axes: 1 or 9 numbers. */
  readonly inverseInertia: readonly Float64Array[]
  readonly rows: readonly Row[]
  readonly matrix: Float64Array
  readonly right: Float64Array
  readonly isHeld: boolean[]
}

export function startMechanism(
  given: Pick<Mechanism, 'joints' | 'drives' | 'held' | 'gravity' | 'inverseMass' | 'inverseInertia'>,
): Mechanism {
  const flat = given.gravity.length === 2
  const freedoms = flat ? 3 : 6
  const empty = () => new Float64Array(freedoms)
  const row = ({ a, b }: JointMotion): Row => ({
    a,
    b,
    onA: empty(),
    onB: empty(),
    byA: empty(),
    byB: empty(),
  })
  const rows = given.joints.flatMap((joint) => {
    const held = joint.spec.kind === 'fixed' ? freedoms : freedoms - 1
    return Array.from({ length: held }, () => row(joint))
  })
  for (const [i, joint] of given.joints.entries()) if (given.drives[i]) rows.push(row(joint))
  const count = rows.length
  return {
    ...given,
    rows,
    matrix: new Float64Array(count * count),
    right: new Float64Array(count),
    isHeld: given.joints.map(() => false),
  }
}

/** Decides the effort of every drive for the coming step of h seconds and adds them to the loads of the bodies. */
export function driveMechanism(mechanism: Mechanism, h: number): void {
  const { joints, drives, held, isHeld } = mechanism
  for (const drive of drives) if (drive) moveCommand(drive, h)
  fillRows(mechanism)
  isHeld.fill(false)
  for (let round = 0; round <= drives.length; round++) {
    solve(mechanism, h)
    if (!holdBeyondLimits(mechanism, h)) break
  }
  for (const [i, drive] of drives.entries()) {
    if (drive && !isHeld[i]) addEffort(joints[i]!, drive.effort, held[joints[i]!.a]!, held[joints[i]!.b]!)
  }
}

/** Reads the efforts of the solution; those beyond a limit become loads. True when one did. */
function holdBeyondLimits({ joints, drives, held, isHeld, rows, right }: Mechanism, h: number): boolean {
  let at = rows.length - drives.filter((drive) => drive !== undefined).length
  let isNew = false
  for (const [i, drive] of drives.entries()) {
    if (!drive) continue
    const wanted = right[at++]!
    if (isHeld[i]) continue
    const joint = joints[i]!
    drive.effort = limited(drive, wanted, joint.place, joint.rate, h)
    if (drive.effort === wanted) continue
    isHeld[i] = true
    isNew = true
    addEffort(joint, drive.effort, held[joint.a]!, held[joint.b]!)
  }
  return isNew
}

function fillRows({ joints, drives, held, rows, inverseMass, inverseInertia }: Mechanism): void {
  let at = 0
  for (const joint of joints) at = fillJoint(joint, rows, at, held)
  for (const [i, joint] of joints.entries()) if (drives[i]) fillDriven(joint, rows[at++]!, held)
  for (const row of rows) {
    timesInverse(row.onA, inverseMass[row.a]!, inverseInertia[row.a]!, row.byA)
    timesInverse(row.onB, inverseMass[row.b]!, inverseInertia[row.b]!, row.byB)
  }
}

const units = [
  [Float64Array.of(1, 0), Float64Array.of(0, 1)],
  [Float64Array.of(1, 0, 0), Float64Array.of(0, 1, 0), Float64Array.of(0, 0, 1)],
] as const
const across2 = [Float64Array.of(0, 0)] as const
const across3 = [Float64Array.of(0, 0, 0), Float64Array.of(0, 0, 0)] as const

/** The rows that hold a joint together; the number of the row after them. */
function fillJoint(joint: JointMotion, rows: readonly Row[], first: number, held: readonly Held[]): number {
  let at = first
  const flat = joint.axis.length === 2
  const { kind } = joint.spec
  const axes = units[flat ? 0 : 1]
  if (kind !== 'slider') for (const axis of axes) pointRow(rows[at++]!, joint, axis, held)
  else for (const one of perpendicular(joint.axis)) pointRow(rows[at++]!, joint, one, held)
  if (flat) {
    if (kind !== 'hinge') spinRow(rows[at++]!, axes[0]!)
    return at
  }
  for (const axis of kind === 'hinge' ? perpendicular(joint.axis) : axes) spinRow(rows[at++]!, axis)
  return at
}

function fillDriven(joint: JointMotion, row: Row, held: readonly Held[]): void {
  if (joint.spec.kind === 'slider') pointRow(row, joint, joint.axis, held)
  else spinRow(row, joint.axis)
}

/** Unit vectors across an axis: one in 2-D, two in 3-D. */
function perpendicular(axis: Float64Array): readonly Float64Array[] {
  if (axis.length === 2) {
    const one = across2[0]
    one[0] = -axis[1]!
    one[1] = axis[0]!
    return across2
  }
  const [one, two] = across3
  // The coordinate axis that lies most across, less its share along the axis.
  const least = [0, 1, 2].reduce((a, b) => (Math.abs(axis[b]!) < Math.abs(axis[a]!) ? b : a))
  for (let i = 0; i < 3; i++) one[i] = (i === least ? 1 : 0) - axis[least]! * axis[i]!
  const length = Math.sqrt(one[0]! * one[0]! + one[1]! * one[1]! + one[2]! * one[2]!)
  for (let i = 0; i < 3; i++) one[i]! /= length
  cross(axis, one, two, 0)
  return across3
}

function cross(a: Float64Array, b: Float64Array, out: Float64Array, at: number): void {
  out[at] = a[1]! * b[2]! - a[2]! * b[1]!
  out[at + 1] = a[2]! * b[0]! - a[0]! * b[2]!
  out[at + 2] = a[0]! * b[1]! - a[1]! * b[0]!
}

const arm = Float64Array.of(0, 0, 0)

/** Rate at which b's end moves along a direction as seen from the point of a that is there. */
function pointRow(row: Row, joint: JointMotion, direction: Float64Array, held: readonly Held[]): void {
  fillPoint(row.onA, joint.endB, direction, held[row.a]!.centre, -1)
  fillPoint(row.onB, joint.endB, direction, held[row.b]!.centre, 1)
}

function fillPoint(
  on: Float64Array,
  end: Float64Array,
  direction: Float64Array,
  centre: Float64Array,
  sign: number,
): void {
  for (let i = 0; i < direction.length; i++) {
    on[i] = sign * direction[i]!
    arm[i] = end[i]! - centre[i]!
  }
  if (direction.length === 2) on[2] = sign * (arm[0]! * direction[1]! - arm[1]! * direction[0]!)
  else {
    cross(arm, direction, on, 3)
    for (let i = 3; i < 6; i++) on[i]! *= sign
  }
}

/** Rate at which b turns about a direction as seen from a. */
function spinRow(row: Row, direction: Float64Array): void {
  row.onA.fill(0)
  row.onB.fill(0)
  if (direction.length === 2) {
    row.onA[2] = -1
    row.onB[2] = 1
    return
  }
  for (let i = 0; i < 3; i++) {
    row.onA[3 + i] = -direction[i]!
    row.onB[3 + i] = direction[i]!
  }
}

function timesInverse(
  on: Float64Array,
  inverseMass: number,
  inverseInertia: Float64Array,
  out: Float64Array,
): void {
  if (on.length === 3) {
    out[0] = inverseMass * on[0]!
    out[1] = inverseMass * on[1]!
    out[2] = inverseInertia[0]! * on[2]!
    return
  }
  for (let i = 0; i < 3; i++) {
    out[i] = inverseMass * on[i]!
    out[3 + i] =
      inverseInertia[3 * i]! * on[3]! +
      inverseInertia[3 * i + 1]! * on[4]! +
      inverseInertia[3 * i + 2]! * on[5]!
  }
}

function dot(a: Float64Array, b: Float64Array): number {
  let sum = 0
  for (let i = 0; i < a.length; i++) sum += a[i]! * b[i]!
  return sum
}

/** Element of G M^-1 G'. */
function coupling(row: Row, other: Row): number {
  let sum = 0
  if (row.a === other.a) sum += dot(row.byA, other.onA)
  if (row.b === other.b) sum += dot(row.byB, other.onB)
  if (row.a === other.b) sum += dot(row.byA, other.onB)
  if (row.b === other.a) sum += dot(row.byB, other.onA)
  return sum
}

/** Row of G times the velocities that the bodies would have after the step without joints and drives. */
function freeRate(row: Row, mechanism: Mechanism, h: number): number {
  return freeRateOf(row.onA, row.byA, row.a, mechanism, h) + freeRateOf(row.onB, row.byB, row.b, mechanism, h)
}

function freeRateOf(
  on: Float64Array,
  by: Float64Array,
  body: number,
  { held, inverseMass, gravity }: Mechanism,
  h: number,
): number {
  if (inverseMass[body] === 0) return 0
  const { velocity, force, torque } = held[body]!
  let rate = dot(on, velocity)
  for (let i = 0; i < force.length; i++) rate += h * (by[i]! * force[i]! + on[i]! * gravity[i]!)
  for (let i = 0; i < torque.length; i++) rate += h * by[force.length + i]! * torque[i]!
  return rate
}

/** Share of its diagonal that is added to a joint's row, so that closed loops, which hold twice, can be solved. */
const spare = 1e-9

/** Solves for (l, e) into `right`. Drives that are held at a limit count as loads and get 0. */
function solve(mechanism: Mechanism, h: number): void {
  const { rows, matrix, right, joints, drives, isHeld } = mechanism
  const n = rows.length
  for (let i = 0; i < n; i++) {
    for (let j = 0; j <= i; j++) matrix[i * n + j] = h * coupling(rows[i]!, rows[j]!)
    right[i] = -freeRate(rows[i]!, mechanism, h)
  }
  let at = n
  for (const drive of drives) if (drive) at--
  for (let i = 0; i < at; i++) matrix[i * n + i]! *= 1 + spare
  for (const [i, drive] of drives.entries()) {
    if (!drive) continue
    const { stiffness, damping } = drive.spec
    const hardness = damping + h * stiffness
    if (isHeld[i]) {
      for (let j = 0; j < at; j++) matrix[at * n + j] = 0
      for (let j = at + 1; j < n; j++) matrix[j * n + at] = 0
      matrix[at * n + at] = 1
      right[at] = 0
    } else {
      matrix[at * n + at]! += 1 / hardness
      right[at]! += (stiffness * (drive.command - joints[i]!.place) + damping * drive.commandRate) / hardness
    }
    at++
  }
  choleskySolve(matrix, right, n)
}

/** Solves A x = b for the lower half of a symmetric positive definite A, in place. */
function choleskySolve(a: Float64Array, b: Float64Array, n: number): void {
  for (let i = 0; i < n; i++) {
    for (let j = 0; j <= i; j++) {
      let sum = a[i * n + j]!
      for (let k = 0; k < j; k++) sum -= a[i * n + k]! * a[j * n + k]!
      // A row that the others hold already leaves rounding only: it gets no force of its own.
      a[i * n + j] = i === j ? (sum > 0 ? Math.sqrt(sum) : Number.POSITIVE_INFINITY) : sum / a[j * n + j]!
    }
    let sum = b[i]!
    for (let k = 0; k < i; k++) sum -= a[i * n + k]! * b[k]!
    b[i] = sum / a[i * n + i]!
  }
  for (let i = n - 1; i >= 0; i--) {
    let sum = b[i]!
    for (let k = i + 1; k < n; k++) sum -= a[k * n + i]! * b[k]!
    b[i] = sum / a[i * n + i]!
  }
}
