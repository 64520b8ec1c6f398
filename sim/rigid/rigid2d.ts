// Rigid bodies in the plane: builds a checked description with the library's 2-D build. Importing this file makes
// its WebAssembly ready (top-level await); a bundle that imports it carries the library, about 2.3 MB, and nothing of 3-D.

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
  version,
  World,
} from '@dimforge/rapier2d-deterministic-compat'
import { refuse } from '../../shared/refusals.js'
import { builderOf } from './build.js'
import { checkGap } from './check.js'
import type { EngineWorld, MassOf } from './engine.js'
import { worldPoint } from './joints.js'
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
checkVersion(version(), '0.20.0')

/** Name and version of the library: part of every digest; put it into the version of a problem. */
export const library = 'rapier2d-deterministic-0.20.0'

const vector = (point: readonly number[]) => ({ x: point[0]!, y: point[1]! })
const angle = (turn: BodySpec['turn']) => (typeof turn === 'number' ? turn : 0)

export const { buildRigid, withRigid } = builderOf({
  name: library,
  dimensions: 2,
  createWorld: (gravityMps2) => new World(vector(gravityMps2)),
  describeBody,
  describeShape,
  buildJoint,
  engineOf,
})

function describeBody(body: BodySpec): RigidBodyDesc {
  const described = body.fixed ? RigidBodyDesc.fixed() : RigidBodyDesc.dynamic()
  const [x, y] = [body.positionM[0]!, body.positionM[1]!]
  described.setTranslation(x, y).setRotation(angle(body.turn)).setCanSleep(false)
  if (body.velocityMps) described.setLinvel(body.velocityMps[0]!, body.velocityMps[1]!)
  if (typeof body.spinRadps === 'number') described.setAngvel(body.spinRadps)
  if (body.fast) described.setCcdEnabled(true)
  if (body.extra) {
    const { massKg, centreM, inertiaKgm2 } = body.extra
    described.setAdditionalMassProperties(massKg, vector(centreM), inertiaKgm2 as number)
  }
  return described
}

const outlines: {
  readonly [K in Outline['kind']]: (outline: Extract<Outline, { kind: K }>) => ColliderDesc | null
} = {
  ball: ({ radiusM }) => ColliderDesc.ball(radiusM),
  box: ({ halfM }) => ColliderDesc.cuboid(halfM[0]!, halfM[1]!),
  capsule: ({ halfLengthM, radiusM }) => ColliderDesc.capsule(halfLengthM, radiusM),
  cylinder: () => null,
  hull: ({ pointsM }) => ColliderDesc.convexHull(flatPoints(pointsM)),
  line: ({ pointsM }) => ColliderDesc.polyline(flatPoints(pointsM)),
}

function describeShape(shape: ShapeSpec, body: BodySpec, spec: RigidSpec, word: number): ColliderDesc {
  const described = outlines[shape.outline.kind](shape.outline as never)
  if (described === null) {
    throw refuse('impossible-value', {
      detail: `body ${body.name}: its points lie on one line or at one place, expected an area.`,
      where: { field: `rigid.body ${body.name}` },
    })
  }
  const { friction, restitution = 0, density } = shape.material
  const rule = (name: RigidSpec['frictionRule']) => CoefficientCombineRule[pairRules[name ?? 'average']]
  return described
    .setTranslation(shape.atM?.[0] ?? 0, shape.atM?.[1] ?? 0)
    .setRotation(angle(shape.turn))
    .setFriction(friction)
    .setFrictionCombineRule(rule(spec.frictionRule))
    .setRestitution(restitution)
    .setRestitutionCombineRule(rule(spec.restitutionRule))
    .setDensity(shape.outline.kind === 'line' ? 0 : density)
    .setCollisionGroups(word)
}

function buildJoint(world: World, joint: JointSpec, spec: RigidSpec, bodies: readonly RigidBody[]): void {
  const [a, b] = bodyNumbersOf(joint, spec)
  const [endA, endB] = [joint.onAM, joint.onBM]
  const [specA, specB] = [spec.bodies[a]!, spec.bodies[b]!]
  const gap = distanceM(endPlace(specA, endA), endPlace(specB, endB))
  if (joint.kind !== 'slider') checkGap(joint.name, gap, spec.sizeM ?? 1)
  const made: ImpulseJoint = world.createImpulseJoint(
    jointKinds[joint.kind](joint, angle(specB.turn) - angle(specA.turn)),
    bodies[a]!,
    bodies[b]!,
    true,
  )
  made.setContactsEnabled(joint.touching === true)
  if (joint.range) (made as RevoluteImpulseJoint).setLimits(joint.range[0], joint.range[1])
}

function endPlace(body: BodySpec, own: readonly number[]): Float64Array {
  const place = new Float64Array(2)
  worldPoint(Float64Array.of(...body.positionM, angle(body.turn)), own, place)
  return place
}

const jointKinds: {
  readonly [kind in JointSpec['kind']]: (joint: JointSpec, turnOfB: number) => JointData
} = {
  hinge: ({ onAM, onBM }) => JointData.revolute(vector(onAM), vector(onBM)),
  fixed: ({ onAM, onBM }, turnOfB) => JointData.fixed(vector(onAM), turnOfB, vector(onBM), 0),
  slider: ({ name, onAM, onBM, axis }, turnOfB) => {
    if (Math.abs(turnOfB) > 1e-6) throw turnedSlider(name, turnOfB)
    return JointData.prismatic(vector(onAM), vector(onBM), vector(axis!))
  },
}

function turnedSlider(name: string, turnOfB: number): Error {
  return refuse('impossible-value', {
    detail: `joint ${name}: its bodies are turned by ${turnOfB} rad against each other, expected bodies of a slider turned alike.`,
    where: { field: `rigid.joint ${name}` },
  })
}

function engineOf(
  world: World,
  spec: RigidSpec,
  bodies: readonly RigidBody[],
  colliders: readonly Collider[],
  owners: ReadonlyMap<number, number>,
): EngineWorld {
  const at = { x: 0, y: 0 }
  const masses = bodies.map(massOf)
  return {
    masses,
    step: () => world.step(),
    readPose(i, pose) {
      bodies[i]!.translation(at)
      pose[0] = at.x
      pose[1] = at.y
      pose[2] = bodies[i]!.rotation()
    },
    readVelocity(i, velocity) {
      bodies[i]!.linvel(at)
      velocity[0] = at.x
      velocity[1] = at.y
      velocity[2] = bodies[i]!.angvel()
    },
    readCentre(i, centre) {
      bodies[i]!.worldCom(at)
      centre[0] = at.x
      centre[1] = at.y
    },
    readInverseInertia(i, inverse) {
      inverse[0] = 1 / masses[i]!.inertiaLeastKgm2
    },
    kineticJ(i) {
      bodies[i]!.linvel(at)
      const spin = bodies[i]!.angvel()
      const { massKg, inertiaLeastKgm2 } = masses[i]!
      return (massKg * (at.x * at.x + at.y * at.y) + inertiaLeastKgm2 * spin * spin) / 2
    },
    spinMomentum(i, momentum) {
      momentum[0] = masses[i]!.inertiaLeastKgm2 * bodies[i]!.angvel()
    },
    isAlive: (i) => bodies[i]!.isEnabled(),
    setLoad(i, force, torque) {
      const body = bodies[i]!
      body.resetForces(true)
      body.resetTorques(true)
      at.x = force[0]!
      at.y = force[1]!
      body.addForce(at, true)
      body.addTorque(torque[0]!, true)
    },
    place(i, pose, velocity) {
      const body = bodies[i]!
      body.setTranslation({ x: pose[0]!, y: pose[1]! }, true)
      body.setRotation(pose[2]!, true)
      body.setLinvel({ x: velocity[0]!, y: velocity[1]! }, true)
      body.setAngvel(velocity[2]!, true)
    },
    contacts: () => contactsFrom(touchesOf(world, colliders, owners), spec),
    snapshot: () => world.takeSnapshot(),
    free: () => world.free(),
  }
}

function massOf(body: RigidBody): MassOf {
  const { x, y } = body.localCom()
  return { massKg: body.mass(), centreM: [x, y], inertiaLeastKgm2: body.principalInertia() }
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
        let frictionImpulse = 0
        let depthM = Number.NEGATIVE_INFINITY
        for (let k = 0; k < manifold.numContacts(); k++) {
          impulse += manifold.contactImpulse(k)
          frictionImpulse += manifold.contactTangentImpulse(k)
          depthM = Math.max(depthM, -manifold.contactDist(k))
        }
        if (manifold.numContacts() === 0) return
        const { x, y } = manifold.normal()
        const sign = flipped ? -1 : 1
        const [a, b] = [owners.get(collider.handle)!, owners.get(other.handle)!]
        const normal = [sign * x + 0, sign * y + 0]
        touches.push({ a, b, normal, impulse, frictionImpulse: Math.abs(frictionImpulse), depthM })
      })
    }
  }
  return touches
}
