// Rigid bodies in space: builds a checked description with the library's 3-D build. Importing this file makes its
// WebAssembly ready (top-level await); a bundle that imports it carries the library, about 4.5 MB, and nothing of 2-D.
//
// Known weakness: free rotation. Figures: README.md of this folder. Do not judge tumbling or spinning bodies by it.

import {
  CoefficientCombineRule,
  type Collider,
  ColliderDesc,
  type ImpulseJoint,
  init,
  JointData,
  type RevoluteImpulseJoint,
  type RigidBody,
  RigidBodyDesc,
  type SdpMatrix3,
  type Vector,
  version,
  World,
} from '@dimforge/rapier3d-deterministic-compat'
import { refuse } from '../../shared/refusals.js'
import { builderOf } from './build.js'
import { checkGap } from './check.js'
import type { EngineWorld, MassOf } from './engine.js'
import { turned, worldPoint } from './joints.js'
import {
  bodyNumbersOf,
  checkVersion,
  contactsFrom,
  distanceM,
  flatPoints,
  pairRules,
  type Touch,
} from './library.js'
import type { BodySpec, JointSpec, Outline, RigidSpec, ShapeSpec } from './spec.js'

export type * from './engine.js'
export type { Drive } from './motors.js'
export type * from './spec.js'
export { type Fault, RigidWorld } from './world.js'

await init()
checkVersion(version(), '0.21.0')

/** Name and version of the library: part of every digest; put it into the version of a problem. */
export const library = 'rapier3d-deterministic-0.21.0'

const vector = (point: ArrayLike<number>) => ({ x: point[0]!, y: point[1]!, z: point[2]! })
const unturned = [0, 0, 0, 1]
const turnOf = (turn: BodySpec['turn']) => (turn === undefined || typeof turn === 'number' ? unturned : turn)
const quaternion = (turn: ArrayLike<number>) => ({ x: turn[0]!, y: turn[1]!, z: turn[2]!, w: turn[3]! })

export const { buildRigid, withRigid } = builderOf({
  name: library,
  dimensions: 3,
  createWorld: (gravityMps2) => new World(vector(gravityMps2)),
  describeBody,
  describeShape,
  buildJoint,
  engineOf,
})

function describeBody(body: BodySpec): RigidBodyDesc {
  const described = body.fixed ? RigidBodyDesc.fixed() : RigidBodyDesc.dynamic()
  const [x, y, z] = [body.positionM[0]!, body.positionM[1]!, body.positionM[2]!]
  described
    .setTranslation(x, y, z)
    .setRotation(quaternion(turnOf(body.turn)))
    .setCanSleep(false)
  if (body.velocityMps) described.setLinvel(body.velocityMps[0]!, body.velocityMps[1]!, body.velocityMps[2]!)
  if (body.spinRadps !== undefined) described.setAngvel(vector(body.spinRadps as readonly number[]))
  if (body.fast) described.setCcdEnabled(true)
  if (body.extra) {
    const { massKg, centreM, inertiaKgm2 } = body.extra
    const inertia = vector(inertiaKgm2 as readonly number[])
    described.setAdditionalMassProperties(massKg, vector(centreM), inertia, quaternion(unturned))
  }
  return described
}

const outlines: {
  readonly [K in Outline['kind']]: (outline: Extract<Outline, { kind: K }>) => ColliderDesc | null
} = {
  ball: ({ radiusM }) => ColliderDesc.ball(radiusM),
  box: ({ halfM }) => ColliderDesc.cuboid(halfM[0]!, halfM[1]!, halfM[2]!),
  capsule: ({ halfLengthM, radiusM }) => ColliderDesc.capsule(halfLengthM, radiusM),
  cylinder: ({ halfLengthM, radiusM }) => ColliderDesc.cylinder(halfLengthM, radiusM),
  hull: ({ pointsM }) => ColliderDesc.convexHull(flatPoints(pointsM)),
  line: () => null,
}

function describeShape(shape: ShapeSpec, body: BodySpec, spec: RigidSpec, word: number): ColliderDesc {
  const described = outlines[shape.outline.kind](shape.outline as never)
  if (described === null) {
    throw refuse('impossible-value', {
      detail: `body ${body.name}: its points lie in one plane, expected a volume.`,
      where: { field: `rigid.body ${body.name}` },
    })
  }
  const { friction, restitution = 0, density } = shape.material
  const rule = (name: RigidSpec['frictionRule']) => CoefficientCombineRule[pairRules[name ?? 'average']]
  return described
    .setTranslation(shape.atM?.[0] ?? 0, shape.atM?.[1] ?? 0, shape.atM?.[2] ?? 0)
    .setRotation(quaternion(turnOf(shape.turn)))
    .setFriction(friction)
    .setFrictionCombineRule(rule(spec.frictionRule))
    .setRestitution(restitution)
    .setRestitutionCombineRule(rule(spec.restitutionRule))
    .setDensity(density)
    .setCollisionGroups(word)
}

function buildJoint(world: World, joint: JointSpec, spec: RigidSpec, bodies: readonly RigidBody[]): void {
  const [a, b] = bodyNumbersOf(joint, spec)
  const [poseA, poseB] = [poseOf(spec.bodies[a]!), poseOf(spec.bodies[b]!)]
  const [endA, endB] = [new Float64Array(3), new Float64Array(3)]
  worldPoint(poseA, joint.onAM, endA)
  worldPoint(poseB, joint.onBM, endB)
  if (joint.kind !== 'slider') checkGap(joint.name, distanceM(endA, endB), spec.sizeM ?? 1)
  if (joint.axis) checkAxes(joint, poseA, poseB)
  const data = jointKinds[joint.kind](joint, between(poseA, poseB))
  const made: ImpulseJoint = world.createImpulseJoint(data, bodies[a]!, bodies[b]!, true)
  made.setContactsEnabled(joint.touching === true)
  if (joint.range) (made as RevoluteImpulseJoint).setLimits(joint.range[0], joint.range[1])
}

function poseOf(body: BodySpec): Float64Array {
  return Float64Array.of(...body.positionM, ...turnOf(body.turn))
}

/** conj(a) b: the turn of b as seen from a. */
function between(a: Float64Array, b: Float64Array): number[] {
  const [ax, ay, az, aw] = [-a[3]!, -a[4]!, -a[5]!, a[6]!]
  const [bx, by, bz, bw] = [b[3]!, b[4]!, b[5]!, b[6]!]
  return [
    aw * bx + ax * bw + ay * bz - az * by,
    aw * by - ax * bz + ay * bw + az * bx,
    aw * bz + ax * by - ay * bx + az * bw,
    aw * bw - ax * bx - ay * by - az * bz,
  ]
}

/** The axis must point the same way from both bodies; those of a slider must also be turned alike. */
function checkAxes(joint: JointSpec, poseA: Float64Array, poseB: Float64Array): void {
  const [fromA, fromB] = [new Float64Array(3), new Float64Array(3)]
  turned(poseA, joint.axis!, fromA)
  turned(poseB, joint.axis!, fromB)
  const apart = distanceM(fromA, fromB)
  const turn = between(poseA, poseB)
  const spin =
    joint.kind === 'slider' ? Math.sqrt(turn[0]! * turn[0]! + turn[1]! * turn[1]! + turn[2]! * turn[2]!) : 0
  if (apart < 1e-5 && spin < 1e-5) return
  throw refuse('impossible-value', {
    detail:
      `joint ${joint.name}: its axis points ${apart.toPrecision(3)} apart from its two bodies, expected one direction` +
      `${joint.kind === 'slider' ? ' and bodies turned alike' : ''}.`,
    where: { field: `rigid.joint ${joint.name}` },
  })
}

const jointKinds: {
  readonly [kind in JointSpec['kind']]: (joint: JointSpec, turnOfB: readonly number[]) => JointData
} = {
  hinge: ({ onAM, onBM, axis }) => JointData.revolute(vector(onAM), vector(onBM), vector(axis!)),
  fixed: ({ onAM, onBM }, turnOfB) =>
    JointData.fixed(vector(onAM), quaternion(turnOfB), vector(onBM), quaternion(unturned)),
  slider: ({ onAM, onBM, axis }) => JointData.prismatic(vector(onAM), vector(onBM), vector(axis!)),
}

function write({ x, y, z }: Vector, out: Float64Array, first: number): void {
  out[first] = x
  out[first + 1] = y
  out[first + 2] = z
}

/** Angular momentum about the centre of mass. */
function spinMomentumOf(body: RigidBody, momentum: Float64Array): void {
  const inertia = fullMatrix(body.effectiveAngularInertia())
  const { x, y, z } = body.angvel()
  for (let k = 0; k < 3; k++)
    momentum[k] = inertia[3 * k]! * x + inertia[3 * k + 1]! * y + inertia[3 * k + 2]! * z
}

function engineOf(
  world: World,
  spec: RigidSpec,
  bodies: readonly RigidBody[],
  colliders: readonly Collider[],
  owners: ReadonlyMap<number, number>,
): EngineWorld {
  const at = { x: 0, y: 0, z: 0 }
  const turn = { x: 0, y: 0, z: 0, w: 1 }
  const masses = bodies.map(massOf)
  return {
    masses,
    step: () => world.step(),
    readPose(i, pose) {
      bodies[i]!.translation(at)
      write(at, pose, 0)
      bodies[i]!.rotation(turn)
      pose[3] = turn.x
      pose[4] = turn.y
      pose[5] = turn.z
      pose[6] = turn.w
    },
    readVelocity(i, velocity) {
      bodies[i]!.linvel(at)
      write(at, velocity, 0)
      bodies[i]!.angvel(at)
      write(at, velocity, 3)
    },
    readCentre(i, centre) {
      bodies[i]!.worldCom(at)
      write(at, centre, 0)
    },
    readInverseInertia(i, inverse) {
      inverse.set(fullMatrix(bodies[i]!.effectiveWorldInvInertia()))
    },
    kineticJ(i) {
      bodies[i]!.linvel(at)
      const along = masses[i]!.massKg * (at.x * at.x + at.y * at.y + at.z * at.z)
      const momentum = new Float64Array(3)
      spinMomentumOf(bodies[i]!, momentum)
      bodies[i]!.angvel(at)
      return (along + momentum[0]! * at.x + momentum[1]! * at.y + momentum[2]! * at.z) / 2
    },
    spinMomentum: (i, momentum) => spinMomentumOf(bodies[i]!, momentum),
    isAlive: (i) => bodies[i]!.isEnabled(),
    setLoad(i, force, torque) {
      const body = bodies[i]!
      body.resetForces(true)
      body.resetTorques(true)
      body.addForce(vector(force), true)
      body.addTorque(vector(torque), true)
    },
    place(i, pose, velocity) {
      const body = bodies[i]!
      body.setTranslation(vector(pose), true)
      body.setRotation(quaternion(pose.subarray(3)), true)
      body.setLinvel(vector(velocity), true)
      body.setAngvel(vector(velocity.subarray(3)), true)
    },
    contacts: () => contactsFrom(touchesOf(world, colliders, owners), spec),
    snapshot: () => world.takeSnapshot(),
    free: () => world.free(),
  }
}

/** The nine numbers of a symmetric matrix. */
function fullMatrix({ m11, m12, m13, m22, m23, m33 }: SdpMatrix3): number[] {
  return [m11, m12, m13, m12, m22, m23, m13, m23, m33]
}

function massOf(body: RigidBody): MassOf {
  const centre = body.localCom()
  const { x, y, z } = body.principalInertia()
  return {
    massKg: body.mass(),
    centreM: [centre.x, centre.y, centre.z],
    inertiaLeastKgm2: Math.min(x, y, z),
  }
}

/** Pairs of shapes that touch, each once, in the order of the description. */
function touchesOf(
  world: World,
  colliders: readonly Collider[],
  owners: ReadonlyMap<number, number>,
): Touch[] {
  const touches: Touch[] = []
  const order = new Map(colliders.map((collider, i) => [collider.handle, i]))
  for (const [i, collider] of colliders.entries()) {
    const others: Collider[] = []
    world.contactPairsWith(collider, (other) => {
      if (order.get(other.handle)! > i) others.push(other)
    })
    others.sort((a, b) => order.get(a.handle)! - order.get(b.handle)!)
    for (const other of others) {
      world.contactPair(collider, other, (manifold, flipped) => {
        let impulse = 0
        let [acrossX, acrossY] = [0, 0]
        let depthM = Number.NEGATIVE_INFINITY
        for (let k = 0; k < manifold.numContacts(); k++) {
          impulse += manifold.contactImpulse(k)
          const [x, y] = [manifold.contactTangentImpulseX(k), manifold.contactTangentImpulseY(k)]
          acrossX += x
          acrossY += y
          depthM = Math.max(depthM, -manifold.contactDist(k))
        }
        if (manifold.numContacts() === 0) return
        const { x, y, z } = manifold.normal()
        const sign = flipped ? -1 : 1
        const [a, b] = [owners.get(collider.handle)!, owners.get(other.handle)!]
        const normal = [sign * x + 0, sign * y + 0, sign * z + 0]
        const frictionImpulse = Math.sqrt(acrossX * acrossX + acrossY * acrossY)
        touches.push({ a, b, normal, impulse, frictionImpulse, depthM })
      })
    }
  }
  return touches
}
