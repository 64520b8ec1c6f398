// Whether a description can be built. Everything is checked here once, by name of body, shape and joint; what is
// wrong is a Refusal ('impossible-value') that says what was found, what was expected and where.
//
// The library counts in single precision (24 bits): numbers that would become infinite, 0 or too coarse there are
// refused as well. At a place 8 m from the origin its last digit is 1 micrometre.

import { refuse } from '../../shared/refusals.js'
import type { BodySpec, JointSpec, MaterialSpec, MotorSpec, Outline, RigidSpec, ShapeSpec } from './spec.js'

export const bodiesMost = 1_000
export const jointsMost = 1_000
export const shapesMost = 4_000
export const layersMost = 16
const placeMostM = 1e4
const sizeLeastM = 1e-4
const rateMost = 1e4
/** Speed (m/s) and spin (rad/s) beyond which the library cuts off: 400 of its length units a second, pi/4 a step. */
export function cutOffs({ sizeM = 1, stepSeconds }: RigidSpec): readonly [number, number] {
  return [400 * sizeM, Math.PI / 4 / stepSeconds]
}

/** How far apart the two ends of a joint may be when it is built, as a share of the world's size. */
const gapMost = 1e-3

function demand(truth: boolean, field: string, found: unknown, expected: string): asserts truth {
  if (truth) return
  throw refuse('impossible-value', {
    detail: `${field}: found ${String(found)}, expected ${expected}.`,
    where: { field: `rigid.${field}` },
    cure: 'Correct the number in the description of the rigid bodies, or let repair() keep genomes away from it.',
  })
}

const isIn = (x: number, low: number, high: number) => Number.isFinite(x) && x >= low && x <= high
const isSize = (x: number) => isIn(x, sizeLeastM, placeMostM)
const sizes = `a length of ${sizeLeastM} to ${placeMostM} m`

interface Checker {
  readonly dimensions: 2 | 3
  point(value: readonly number[] | undefined, field: string, most?: number): void
  turn(value: BodySpec['turn'], field: string): void
  direction(value: readonly number[] | undefined, field: string): void
}

function checkerOf(dimensions: 2 | 3): Checker {
  return {
    dimensions,
    point(value, field, most = placeMostM) {
      const sound =
        value === undefined || (value.length === dimensions && value.every((x) => isIn(x, -most, most)))
      demand(sound, field, value, `${dimensions} finite numbers within +-${most}`)
    },
    turn(value, field) {
      if (value === undefined) return
      if (typeof value === 'number') {
        demand(
          dimensions === 2 && isIn(value, -1e3, 1e3),
          field,
          value,
          'an angle (2-D) or a quaternion (3-D)',
        )
        return
      }
      const length = Math.sqrt(value.reduce((sum, x) => sum + x * x, 0))
      const sound = dimensions === 3 && value.length === 4 && Math.abs(length - 1) < 1e-6
      demand(sound, field, value, 'an angle (2-D) or a quaternion of length 1 (3-D)')
    },
    direction(value, field) {
      const length = value === undefined ? 0 : Math.sqrt(value.reduce((sum, x) => sum + x * x, 0))
      const sound = value?.length === dimensions && Math.abs(length - 1) < 1e-6
      demand(sound, field, value, `a direction of ${dimensions} numbers and length 1`)
    },
  }
}

/** Throws the Refusal of the first thing that cannot be built. */
export function checkRigid(spec: RigidSpec, dimensions: 2 | 3): void {
  const checker = checkerOf(dimensions)
  checkWorld(spec, checker)
  const names = new Set<string>()
  for (const body of spec.bodies) {
    demand(
      body.name !== '' && !names.has(body.name),
      `body ${body.name}`,
      body.name,
      'a name that no other has',
    )
    names.add(body.name)
    checkBody(body, checker)
    checkSpeed(body, spec)
  }
  const jointNames = new Set<string>()
  const bodies = new Map(spec.bodies.map((body) => [body.name, body]))
  for (const joint of spec.joints ?? []) {
    const isNew = joint.name !== '' && !jointNames.has(joint.name)
    demand(isNew, `joint ${joint.name}`, joint.name, 'a name that no other has')
    jointNames.add(joint.name)
    checkJoint(joint, bodies, checker)
  }
}

/** Layers of a world in the order of their first use; '' first. */
export function layersOf(spec: RigidSpec): string[] {
  const used = spec.bodies.flatMap((body) => body.shapes.map((shape) => shape.layer ?? ''))
  return [...new Set(['', ...used])]
}

function checkWorld(spec: RigidSpec, checker: Checker): void {
  const {
    bodies,
    joints = [],
    stepSeconds,
    solverRounds = 4,
    solverSweeps = 1,
    sizeM = 1,
    contactHz = 30,
  } = spec
  checker.point(spec.gravityMps2, 'gravityMps2', 1e3)
  demand(isIn(stepSeconds, 1e-5, 0.1), 'stepSeconds', stepSeconds, 'a step of 1e-5 to 0.1 s')
  demand(bodies.length > 0, 'bodies', 'none', 'at least one body')
  demand(bodies.length <= bodiesMost, 'bodies', bodies.length, `at most ${bodiesMost}`)
  demand(joints.length <= jointsMost, 'joints', joints.length, `at most ${jointsMost}`)
  const shapes = bodies.reduce((sum, body) => sum + body.shapes.length, 0)
  demand(shapes <= shapesMost, 'shapes', shapes, `at most ${shapesMost}`)
  for (const [name, count] of Object.entries({ solverRounds, solverSweeps })) {
    demand(Number.isInteger(count) && isIn(count, 1, 64), name, count, 'a whole number of 1 to 64')
  }
  demand(isIn(sizeM, 1e-3, 1e3), 'sizeM', sizeM, 'a length of 0.001 to 1000 m')
  demand(isIn(contactHz, 0.1, 1e4), 'contactHz', contactHz, 'a frequency of 0.1 to 10000 Hz')
  const layers = layersOf(spec)
  demand(layers.length <= layersMost, 'layers', layers.length, `at most ${layersMost}`)
  for (const [a, b] of spec.apart ?? []) {
    for (const name of [a, b])
      demand(layers.includes(name), 'apart', name, `a layer in use: ${layers.join(', ')}`)
  }
}

function checkBody(body: BodySpec, checker: Checker): void {
  const at = `body ${body.name}`
  checker.point(body.positionM, `${at}.positionM`)
  checker.turn(body.turn, `${at}.turn`)
  checker.point(body.velocityMps, `${at}.velocityMps`, rateMost)
  if (typeof body.spinRadps === 'number') {
    const sound = checker.dimensions === 2 && isIn(body.spinRadps, -rateMost, rateMost)
    demand(sound, `${at}.spinRadps`, body.spinRadps, 'a finite number (2-D) or three (3-D)')
  } else if (body.spinRadps !== undefined) {
    demand(checker.dimensions === 3, `${at}.spinRadps`, body.spinRadps, 'a finite number in 2-D')
    checker.point(body.spinRadps, `${at}.spinRadps`, rateMost)
  }
  let massKg = 0
  for (const [i, shape] of body.shapes.entries()) {
    checkShape(shape, `${at}.shapes[${i}]`, body.fixed === true, checker)
    massKg += shape.material.density
  }
  if (body.extra) {
    const { massKg: extraKg, centreM, inertiaKgm2 } = body.extra
    demand(isIn(extraKg, 1e-6, 1e9), `${at}.extra.massKg`, extraKg, 'a finite mass above 0')
    checker.point(centreM, `${at}.extra.centreM`)
    const inertias = typeof inertiaKgm2 === 'number' ? [inertiaKgm2] : inertiaKgm2
    const count = checker.dimensions === 2 ? 1 : 3
    const sound = inertias.length === count && inertias.every((x) => isIn(x, 1e-12, 1e12))
    demand(sound, `${at}.extra.inertiaKgm2`, inertiaKgm2, `${count} finite number above 0`)
    massKg += extraKg
  }
  demand(body.fixed === true || massKg > 0, at, 'no mass', 'a shape with density or extra mass')
}

function checkSpeed({ name, velocityMps = [], spinRadps = 0 }: BodySpec, spec: RigidSpec): void {
  const size = (v: readonly number[]) => Math.sqrt(v.reduce((sum, x) => sum + x * x, 0))
  const [speedMost, spinMost] = cutOffs(spec)
  const spins = typeof spinRadps === 'number' ? [spinRadps] : spinRadps
  const [slower, calmer] = [
    `less than ${speedMost} m/s (400 sizeM a second)`,
    `less than ${spinMost.toPrecision(4)}`,
  ]
  demand(size(velocityMps) < speedMost, `body ${name}.velocityMps`, velocityMps, slower)
  demand(
    size(spins) < spinMost,
    `body ${name}.spinRadps`,
    spinRadps,
    `${calmer} rad/s (an eighth of a turn a step)`,
  )
}

function checkShape(
  { outline, material, ...shape }: ShapeSpec,
  at: string,
  fixed: boolean,
  checker: Checker,
): void {
  checker.point(shape.atM, `${at}.atM`)
  checker.turn(shape.turn, `${at}.turn`)
  checkMaterial(material, at)
  demand(outline.kind !== 'line' || fixed, at, 'a line on a moving body', 'lines on fixed bodies only')
  outlineChecks[outline.kind](outline as never, at, checker)
}

type OutlineChecks = {
  readonly [K in Outline['kind']]: (
    outline: Extract<Outline, { kind: K }>,
    at: string,
    checker: Checker,
  ) => void
}

const outlineChecks: OutlineChecks = {
  ball: ({ radiusM }, at) => demand(isSize(radiusM), `${at}.radiusM`, radiusM, sizes),
  box: ({ halfM }, at, { dimensions }) => {
    const sound = halfM.length === dimensions && halfM.every(isSize)
    demand(sound, `${at}.halfM`, halfM, `${dimensions} numbers, each ${sizes}`)
  },
  capsule: ({ halfLengthM, radiusM }, at) => {
    demand(isSize(halfLengthM), `${at}.halfLengthM`, halfLengthM, sizes)
    demand(isSize(radiusM), `${at}.radiusM`, radiusM, sizes)
  },
  cylinder: ({ halfLengthM, radiusM }, at, { dimensions }) => {
    demand(dimensions === 3, at, 'a cylinder', 'one of the outlines of 2-D')
    demand(isSize(halfLengthM), `${at}.halfLengthM`, halfLengthM, sizes)
    demand(isSize(radiusM), `${at}.radiusM`, radiusM, sizes)
  },
  hull: ({ pointsM }, at, checker) => {
    const least = checker.dimensions + 1
    demand(
      pointsM.length >= least && pointsM.length <= 256,
      `${at}.pointsM`,
      pointsM.length,
      `${least} to 256 points`,
    )
    for (const [i, point] of pointsM.entries()) checker.point(point, `${at}.pointsM[${i}]`)
    const flat = checker.dimensions === 2 ? 'one line' : 'one plane'
    demand(isSolid(pointsM), `${at}.pointsM`, `points on ${flat}`, `points that do not lie on ${flat}`)
  },
  line: ({ pointsM }, at, checker) => {
    demand(checker.dimensions === 2, at, 'a line', 'one of the outlines of 3-D')
    demand(
      pointsM.length >= 2 && pointsM.length <= 4_096,
      `${at}.pointsM`,
      pointsM.length,
      '2 to 4096 points',
    )
    for (const [i, point] of pointsM.entries()) checker.point(point, `${at}.pointsM[${i}]`)
  },
}

/** Whether points span an area (2-D) or a volume (3-D): the farthest from one point, from that line, from that plane. */
function isSolid(points: readonly (readonly number[])[]): boolean {
  const first = points[0]!
  // What is left of every way from the first point when the directions found so far are taken off.
  let ways = points.map((point) => point.map((x, i) => x - first[i]!))
  const length = (v: readonly number[]) => Math.sqrt(v.reduce((sum, x) => sum + x * x, 0))
  for (let axis = 0; axis < first.length; axis++) {
    const farthest = ways.reduce((a, b) => (length(b) > length(a) ? b : a))
    const far = length(farthest)
    if (far < sizeLeastM) return false
    const unit = farthest.map((x) => x / far)
    ways = ways.map((way) => {
      const along = way.reduce((sum, x, i) => sum + x * unit[i]!, 0)
      return way.map((x, i) => x - along * unit[i]!)
    })
  }
  return true
}

function checkMaterial({ friction, restitution = 0, density }: MaterialSpec, at: string): void {
  demand(isIn(friction, 0, 1e3), `${at}.friction`, friction, 'a finite coefficient of at least 0')
  demand(isIn(restitution, 0, 1), `${at}.restitution`, restitution, 'a coefficient of 0 to 1')
  demand(isIn(density, 0, 1e6), `${at}.density`, density, 'a finite density of at least 0')
}

function checkJoint(joint: JointSpec, bodies: ReadonlyMap<string, BodySpec>, checker: Checker): void {
  const at = `joint ${joint.name}`
  const [a, b] = [bodies.get(joint.a), bodies.get(joint.b)]
  demand(a !== undefined, `${at}.a`, joint.a, 'the name of a body')
  demand(b !== undefined, `${at}.b`, joint.b, 'the name of a body')
  demand(a !== b, at, `body ${joint.a} at both ends`, 'two different bodies')
  demand(a.fixed !== true || b.fixed !== true, at, 'two fixed bodies', 'at least one body that moves')
  checker.point(joint.onAM, `${at}.onAM`)
  checker.point(joint.onBM, `${at}.onBM`)
  const needsAxis = joint.kind === 'slider' || (joint.kind === 'hinge' && checker.dimensions === 3)
  if (needsAxis) {
    checker.direction(joint.axis, `${at}.axis`)
    checker.direction(joint.axisOnB ?? joint.axis, `${at}.axisOnB`)
  }
  if (joint.range) {
    const [low, high] = joint.range
    const most = joint.kind === 'hinge' ? Math.PI : placeMostM
    const sound = isIn(low, -most, most) && isIn(high, -most, most) && low < high && joint.kind !== 'fixed'
    demand(sound, `${at}.range`, joint.range, `two places in order within +-${most} of a hinge or slider`)
  }
  if (joint.motor) {
    demand(joint.kind !== 'fixed', `${at}.motor`, 'a motor in a fixed joint', 'a hinge or a slider')
    checkMotor(joint.motor, `${at}.motor`)
  }
}

/** How far apart the ends of a joint are, m, at building: refused by the builder, which knows the places. */
export function checkGap(joint: string, gapM: number, sizeM: number): void {
  const most = gapMost * sizeM
  demand(
    gapM <= most,
    `joint ${joint}`,
    `ends ${gapM.toPrecision(3)} m apart`,
    `ends at one place (within ${most} m)`,
  )
}

function checkMotor(motor: MotorSpec, at: string): void {
  const isAtLeast0 = (x: number) => isIn(x, 0, 1e9)
  demand(isAtLeast0(motor.stiffness), `${at}.stiffness`, motor.stiffness, 'a finite number of at least 0')
  demand(isAtLeast0(motor.damping), `${at}.damping`, motor.damping, 'a finite number of at least 0')
  const works = motor.stiffness > 0 || motor.damping > 0
  demand(works, at, 'neither stiffness nor damping', 'one of them above 0')
  const { rampMost } = motor
  const ramps = rampMost === undefined || isIn(rampMost, 1e-9, 1e9)
  demand(ramps, `${at}.rampMost`, rampMost, 'a finite number above 0')
  for (const name of ['effortMost', 'rateMost', 'powerMostW'] as const) {
    demand(isIn(motor[name], 1e-9, 1e9), `${at}.${name}`, motor[name], 'a finite number above 0')
  }
}
