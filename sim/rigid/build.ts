// From a checked description to a world that moves: what rigid2d.ts and rigid3d.ts do alike. Each hands in its library
// as a table of what differs between the plane and space.

import { checkRigid, layersOf } from './check.js'
import type { EngineWorld } from './engine.js'
import { layerWords } from './library.js'
import type { BodySpec, JointSpec, RigidSpec, ShapeSpec } from './spec.js'
import { RigidWorld } from './world.js'

/** What is used of the library's world here. */
interface LibraryWorld<Body, Collider, BodyDescription, ColliderDescription> {
  readonly integrationParameters: {
    dt: number
    numSolverIterations: number
    numInternalPgsIterations: number
    lengthUnit: number
    contact_natural_frequency: number
  }
  createRigidBody(described: BodyDescription): Body
  createCollider(described: ColliderDescription, body: Body): Collider
  free(): void
}

export interface Library<World, Body, Collider, BodyDescription, ColliderDescription> {
  /** Name and version. */
  readonly name: string
  readonly dimensions: 2 | 3
  readonly createWorld: (gravityMps2: readonly number[]) => World
  readonly describeBody: (body: BodySpec) => BodyDescription
  /** `word`: what the shape's layer is and meets. */
  readonly describeShape: (
    shape: ShapeSpec,
    body: BodySpec,
    spec: RigidSpec,
    word: number,
  ) => ColliderDescription
  readonly buildJoint: (world: World, joint: JointSpec, spec: RigidSpec, bodies: readonly Body[]) => void
  /** `owners`: the body's number by its collider's handle. */
  readonly engineOf: (
    world: World,
    spec: RigidSpec,
    bodies: readonly Body[],
    colliders: readonly Collider[],
    owners: ReadonlyMap<number, number>,
  ) => EngineWorld
}

/** The two ways into a library: a world to keep, and one that is given back. */
export interface Builder {
  /** Checks a description and builds it. Throws a Refusal ('impossible-value') that names the body or joint. */
  readonly buildRigid: (spec: RigidSpec) => RigidWorld
  /** Builds a world, hands it to `use`, and gives its memory back whatever happens. */
  readonly withRigid: <T>(spec: RigidSpec, use: (world: RigidWorld) => T) => T
}

export function builderOf<
  World extends LibraryWorld<Body, Collider, BodyDescription, ColliderDescription>,
  Body extends { recomputeMassPropertiesFromColliders(): void },
  Collider extends { readonly handle: number },
  BodyDescription,
  ColliderDescription,
>(library: Library<World, Body, Collider, BodyDescription, ColliderDescription>): Builder {
  const buildRigid = (spec: RigidSpec): RigidWorld => {
    checkRigid(spec, library.dimensions)
    const world = library.createWorld(spec.gravityMps2)
    try {
      return new RigidWorld(library.name, library.dimensions, spec, fill(library, world, spec))
    } catch (error) {
      world.free()
      throw error
    }
  }
  return {
    buildRigid,
    withRigid(spec, use) {
      const world = buildRigid(spec)
      try {
        return use(world)
      } finally {
        world.free()
      }
    },
  }
}

function fill<
  World extends LibraryWorld<Body, Collider, BodyDescription, ColliderDescription>,
  Body extends { recomputeMassPropertiesFromColliders(): void },
  Collider extends { readonly handle: number },
  BodyDescription,
  ColliderDescription,
>(
  library: Library<World, Body, Collider, BodyDescription, ColliderDescription>,
  world: World,
  spec: RigidSpec,
): EngineWorld {
  const { integrationParameters: settings } = world
  settings.dt = spec.stepSeconds
  settings.numSolverIterations = spec.solverRounds ?? 4
  settings.numInternalPgsIterations = spec.solverSweeps ?? 1
  settings.lengthUnit = spec.sizeM ?? 1
  if (spec.contactHz !== undefined) settings.contact_natural_frequency = spec.contactHz
  const bodies = spec.bodies.map((body) => world.createRigidBody(library.describeBody(body)))
  const owners = new Map<number, number>()
  const colliders: Collider[] = []
  const words = layerWords(layersOf(spec), spec.apart)
  for (const [i, body] of spec.bodies.entries()) {
    for (const shape of body.shapes) {
      const described = library.describeShape(shape, body, spec, words.get(shape.layer ?? '')!)
      const collider = world.createCollider(described, bodies[i]!)
      owners.set(collider.handle, i)
      colliders.push(collider)
    }
  }
  for (const body of bodies) body.recomputeMassPropertiesFromColliders()
  for (const joint of spec.joints ?? []) library.buildJoint(world, joint, spec, bodies)
  return library.engineOf(world, spec, bodies, colliders, owners)
}
