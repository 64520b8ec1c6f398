// Everything about a description (spec.ts) that can be wrong, checked once: the kernel need not look. What is wrong is a
// Refusal that names the field, so the node or strut, and the numbers.

import { limits } from '../../shared/limits.js'
import { refuse } from '../../shared/refusals.js'
import { checkConnected } from './connected.js'
import type {
  ActuatorLimits,
  ContactSpec,
  FrictionSpec,
  GroundSpec,
  GuidedSpec,
  LatticeSpec,
  StrutSpec,
} from './spec.js'

/** Throws a Refusal ('impossible-value') at `lattice.FIELD` unless the truth holds. */
export function demand(truth: boolean, field: string, found: unknown, expected: string): asserts truth {
  if (!truth) {
    throw refuse('impossible-value', {
      detail: `found ${String(found)}, expected ${expected}.`,
      where: { field: `lattice.${field}` },
    })
  }
}

const isPositive = (x: number) => Number.isFinite(x) && x > 0
const isAtLeast0 = (x: number) => Number.isFinite(x) && x >= 0
/** Limits may be infinite, never NaN. */
const isLimit = (x: number | undefined) => x === undefined || x > 0

export function dimensionsOf(spec: LatticeSpec): 2 | 3 {
  return spec.dimensions ?? 2
}

/** All of a description but its step, which needs the stability bound (build.ts). */
export function checkSpec(spec: LatticeSpec): void {
  const dimensions = dimensionsOf(spec)
  demand(dimensions === 2 || dimensions === 3, 'dimensions', dimensions, '2 or 3')
  checkNodes(spec, dimensions)
  checkStruts(spec)
  checkFluid(spec)
  checkFills(spec, dimensions)
  checkSensors(spec)
  checkGroups(spec)
  checkDriven(spec, dimensions)
  if (spec.ground) checkGround(spec.ground, spec.contact, dimensions)
  checkConnected(spec)
}

function checkNodes(spec: LatticeSpec, dimensions: number): void {
  const { nodes, gravityMps2, dragNspm = 0 } = spec
  const isVector = (v: readonly number[]) => v.length === dimensions && v.every(Number.isFinite)
  demand(nodes.length > 0, 'nodes', 'none', 'at least one node')
  const most = limits.latticeNodesMost
  demand(nodes.length <= most, 'nodes', `${nodes.length} nodes`, `at most ${most}`)
  for (let i = 0; i < nodes.length; i++) {
    if (!isSoundNode(spec, i, isVector)) explainNode(spec, i, isVector)
  }
  demand(isVector(gravityMps2), 'gravityMps2', gravityMps2, `${dimensions} finite numbers`)
  demand(isAtLeast0(dragNspm), 'dragNspm', dragNspm, 'a finite number of at least 0')
}

type IsVector = (v: readonly number[]) => boolean

/** A quick look at what is nearly always so: words are made only for what is wrong. */
function isSoundNode({ nodes }: LatticeSpec, i: number, isVector: IsVector): boolean {
  const { positionM, velocityMps, massKg, friction, headingNode: ahead } = nodes[i]!
  const isPlaced = isVector(positionM) && (velocityMps === undefined || isVector(velocityMps))
  const isLed = ahead === undefined || (nodes[ahead] !== undefined && ahead !== i)
  return isPlaced && isLed && isPositive(massKg) && (friction === undefined || isFriction(friction))
}

function explainNode({ nodes, dimensions = 2 }: LatticeSpec, i: number, isVector: IsVector): void {
  const at = `nodes[${i}]`
  const { positionM, velocityMps, massKg, friction, headingNode } = nodes[i]!
  const vector = `${dimensions} finite numbers`
  demand(isVector(positionM), `${at}.positionM`, positionM, vector)
  demand(!velocityMps || isVector(velocityMps), `${at}.velocityMps`, velocityMps, vector)
  demand(isPositive(massKg), `${at}.massKg`, massKg, 'a finite mass above 0')
  demand(!friction || isFriction(friction), `${at}.friction`, JSON.stringify(friction), soundFriction)
  demand(false, `${at}.headingNode`, headingNode, `another node, 0 to ${nodes.length - 1}`)
}

export const soundFriction = 'finite coefficients of at least 0'

export function isFriction({ forward, backward, sideways = 0 }: FrictionSpec): boolean {
  return isAtLeast0(forward) && isAtLeast0(backward) && isAtLeast0(sideways)
}

/** Two different nodes that are not at one place. */
function checkEnds(
  spec: LatticeSpec,
  { a, b }: { readonly a: number; readonly b: number },
  at: string,
): void {
  const isNode = (i: number) => Number.isInteger(i) && i >= 0 && i < spec.nodes.length
  demand(isNode(a), `${at}.a`, a, `a node, 0 to ${spec.nodes.length - 1}`)
  demand(isNode(b), `${at}.b`, b, `a node, 0 to ${spec.nodes.length - 1}`)
  demand(a !== b, at, `node ${a} at both ends`, 'two different nodes')
  demand(distanceM(spec, a, b) > 0, at, `nodes ${a} and ${b} at one place`, 'a length above 0')
}

/** Distance of two nodes at the start, m. */
export function distanceM(spec: LatticeSpec, nodeA: number, nodeB: number): number {
  const a = spec.nodes[nodeA]!.positionM
  const b = spec.nodes[nodeB]!.positionM
  let squared = 0
  for (let i = 0; i < a.length; i++) squared += (b[i]! - a[i]!) * (b[i]! - a[i]!)
  return Math.sqrt(squared)
}

/** A quick look at what is nearly always so: words are made only for what is wrong. */
function isSoundStrut(spec: LatticeSpec, { a, b, restM = 1, stiffnessNpm, dampingNspm }: StrutSpec): boolean {
  if (spec.nodes[a] === undefined || spec.nodes[b] === undefined || a === b) return false
  const isStiff = isAtLeast0(stiffnessNpm) && isAtLeast0(dampingNspm)
  return isStiff && isPositive(restM) && distanceM(spec, a, b) > 0
}

function checkStruts(spec: LatticeSpec): void {
  const one = (strut: StrutSpec, list: string, i: number) => {
    if (isSoundStrut(spec, strut)) return
    const at = `${list}[${i}]`
    checkEnds(spec, strut, at)
    demand(
      strut.restM === undefined || isPositive(strut.restM),
      `${at}.restM`,
      strut.restM,
      'a finite length above 0',
    )
    demand(isAtLeast0(strut.stiffnessNpm), `${at}.stiffnessNpm`, strut.stiffnessNpm, 'a finite number >= 0')
    demand(isAtLeast0(strut.dampingNspm), `${at}.dampingNspm`, strut.dampingNspm, 'a finite number >= 0')
  }
  const {
    struts,
    actuators = [],
    guided = [],
    keepApart = [],
    dragStruts = [],
    areas = [],
    volumes = [],
  } = spec
  const parts = [struts, actuators, guided, keepApart, dragStruts, areas, volumes]
  const count = parts.reduce((sum, list) => sum + list.length, 0)
  demand(count <= limits.latticePartsMost, 'struts', `${count} parts`, `at most ${limits.latticePartsMost}`)
  for (const [i, strut] of struts.entries()) one(strut, 'struts', i)
  for (const [i, strut] of actuators.entries()) one(strut, 'actuators', i)
  for (const [i, strut] of guided.entries()) one(strut, 'guided', i)
  for (const [i, pair] of keepApart.entries()) {
    const at = `keepApart[${i}]`
    checkEnds(spec, pair, at)
    demand(isPositive(pair.leastM), `${at}.leastM`, pair.leastM, 'a finite distance above 0')
    demand(isAtLeast0(pair.stiffnessNpm), `${at}.stiffnessNpm`, pair.stiffnessNpm, 'a finite number >= 0')
  }
}

function checkFluid(spec: LatticeSpec): void {
  for (const [i, strut] of (spec.dragStruts ?? []).entries()) {
    const at = `dragStruts[${i}]`
    checkEnds(spec, strut, at)
    demand(isAtLeast0(strut.normalNspm2), `${at}.normalNspm2`, strut.normalNspm2, 'a finite number >= 0')
    demand(isAtLeast0(strut.tangentNspm2), `${at}.tangentNspm2`, strut.tangentNspm2, 'a finite number >= 0')
  }
}

function checkFills(spec: LatticeSpec, dimensions: number): void {
  const { areas = [], volumes = [] } = spec
  demand(
    dimensions === 2 || areas.length === 0,
    'areas',
    areas.length,
    'none in 3-D, where volumes are meant',
  )
  demand(
    dimensions === 3 || volumes.length === 0,
    'volumes',
    volumes.length,
    'none in 2-D, where areas are meant',
  )
  const corners = (nodes: readonly number[], at: string) => {
    const known = nodes.every((node) => spec.nodes[node] !== undefined)
    const different = new Set(nodes).size === nodes.length
    demand(known && different, `${at}.nodes`, nodes, `${dimensions + 1} different nodes`)
  }
  for (const [i, area] of areas.entries()) {
    const at = `areas[${i}]`
    corners(area.nodes, at)
    const restM2 = area.restM2 ?? signedSize(spec, area.nodes)
    demand(isPositive(restM2), at, `an area of ${restM2} m^2`, 'counter-clockwise nodes, an area above 0')
    demand(isAtLeast0(area.stiffnessNpm), `${at}.stiffnessNpm`, area.stiffnessNpm, 'a finite number >= 0')
  }
  for (const [i, volume] of volumes.entries()) {
    const at = `volumes[${i}]`
    corners(volume.nodes, at)
    const restM3 = volume.restM3 ?? signedSize(spec, volume.nodes)
    demand(
      isPositive(restM3),
      at,
      `a volume of ${restM3} m^3`,
      'nodes in right-handed order, a volume above 0',
    )
    demand(isAtLeast0(volume.stiffnessPa), `${at}.stiffnessPa`, volume.stiffnessPa, 'a finite number >= 0')
  }
}

/** Signed area of a triangle (m^2) or volume of a tetrahedron (m^3) at the start. */
export function signedSize(spec: LatticeSpec, nodes: readonly number[]): number {
  const [first, ...others] = nodes.map((node) => spec.nodes[node]!.positionM)
  const [p = [], q = [], r = []] = others.map((other) => other.map((value, axis) => value - first![axis]!))
  if (nodes.length === 3) return 0.5 * (p[0]! * q[1]! - p[1]! * q[0]!)
  const cross = (m: number, n: number) => q[m]! * r[n]! - q[n]! * r[m]!
  return (p[0]! * cross(1, 2) + p[1]! * cross(2, 0) + p[2]! * cross(0, 1)) / 6
}

function checkSensors(spec: LatticeSpec): void {
  const struts = spec.struts.length + (spec.actuators?.length ?? 0) + (spec.guided?.length ?? 0)
  for (const [i, sensor] of (spec.sensors ?? []).entries()) {
    const at = `sensors[${i}]`
    if (sensor.kind === 'contact') {
      demand(spec.nodes[sensor.node] !== undefined, `${at}.node`, sensor.node, 'a node')
    } else {
      const known = Number.isInteger(sensor.strut) && sensor.strut >= 0 && sensor.strut < struts
      demand(known, `${at}.strut`, sensor.strut, `a strut, 0 to ${struts - 1}`)
    }
    const filter = sensor.filterSeconds ?? 0
    demand(isAtLeast0(filter), `${at}.filterSeconds`, filter, 'a finite time >= 0')
  }
}

function checkGroups(spec: LatticeSpec): void {
  for (const [i, { frequencyHz, lagSeconds = 0, sweep }] of (spec.groups ?? []).entries()) {
    const at = `groups[${i}]`
    demand(isAtLeast0(frequencyHz), `${at}.frequencyHz`, frequencyHz, 'a finite frequency >= 0')
    demand(isAtLeast0(lagSeconds), `${at}.lagSeconds`, lagSeconds, 'a finite time >= 0')
    if (!sweep) continue
    demand(isAtLeast0(sweep.toHz), `${at}.sweep.toHz`, sweep.toHz, 'a finite frequency >= 0')
    demand(isPositive(sweep.seconds), `${at}.sweep.seconds`, sweep.seconds, 'a finite time above 0')
    demand(
      lagSeconds === 0,
      `${at}.lagSeconds`,
      lagSeconds,
      'no lag with a sweep: it holds for one frequency',
    )
  }
  const { startSeconds = 0, rampSeconds = 0 } = spec.drive ?? {}
  demand(isAtLeast0(startSeconds), 'drive.startSeconds', startSeconds, 'a finite time >= 0')
  demand(isAtLeast0(rampSeconds), 'drive.rampSeconds', rampSeconds, 'a finite time >= 0')
}

function checkLimits(given: ActuatorLimits, at: string): void {
  const { actuator, forceLimitN, strainLimit, strainRateLimitPerSecond, powerLimitW } = given
  const isKind = actuator === undefined || actuator === 'unlimited' || actuator.motion === 'linear'
  demand(isKind, `${at}.actuator`, isKind || actuator.name, "a class that moves in a line, or 'unlimited'")
  demand(isLimit(forceLimitN), `${at}.forceLimitN`, forceLimitN, 'a force above 0')
  const strained = isLimit(strainLimit) && (strainLimit ?? 0) < 1
  demand(strained, `${at}.strainLimit`, strainLimit, 'a strain above 0 and below 1')
  const rate = strainRateLimitPerSecond
  demand(isLimit(rate), `${at}.strainRateLimitPerSecond`, rate, 'a rate above 0')
  demand(isLimit(powerLimitW), `${at}.powerLimitW`, powerLimitW, 'a power above 0')
}

function checkDriven(spec: LatticeSpec, dimensions: number): void {
  const groups = spec.groups ?? []
  const isGroup = (g: number) => Number.isInteger(g) && g >= 0 && g < groups.length
  for (const [i, strut] of (spec.actuators ?? []).entries()) {
    const at = `actuators[${i}]`
    demand(isGroup(strut.group), `${at}.group`, strut.group, `one of ${groups.length} groups`)
    demand(Math.abs(strut.strain) < 1, `${at}.strain`, strut.strain, 'a strain between -1 and 1')
    demand(Number.isFinite(strut.phaseTurns), `${at}.phaseTurns`, strut.phaseTurns, 'a finite number')
    checkLimits(strut, at)
  }
  for (const [i, strut] of (spec.guided ?? []).entries()) {
    const at = `guided[${i}]`
    demand(strut.group === undefined || isGroup(strut.group), `${at}.group`, strut.group, 'a group or none')
    checkGuided(spec, strut, at)
    checkLimits(strut, at)
  }
  for (const [i, path] of (spec.prescribed ?? []).entries()) {
    const at = `prescribed[${i}]`
    demand(spec.nodes[path.node] !== undefined, `${at}.node`, path.node, 'a node')
    demand(isGroup(path.group), `${at}.group`, path.group, `one of ${groups.length} groups`)
    const { amplitudeM } = path
    const sound = amplitudeM.length === dimensions && amplitudeM.every(Number.isFinite)
    demand(sound, `${at}.amplitudeM`, amplitudeM, `${dimensions} finite numbers`)
    demand(Number.isFinite(path.phaseTurns), `${at}.phaseTurns`, path.phaseTurns, 'a finite number')
  }
}

function checkGuided(spec: LatticeSpec, strut: GuidedSpec, at: string): void {
  const { strain = 0, phaseTurns = 0, feedback = [] } = strut
  demand(Math.abs(strain) < 1, `${at}.strain`, strain, 'a strain between -1 and 1')
  demand(Number.isFinite(phaseTurns), `${at}.phaseTurns`, phaseTurns, 'a finite number')
  for (const [row, { sensor, gain }] of feedback.entries()) {
    const known = spec.sensors?.[sensor] !== undefined
    demand(known, `${at}.feedback[${row}].sensor`, sensor, `one of ${spec.sensors?.length ?? 0} sensors`)
    demand(Number.isFinite(gain), `${at}.feedback[${row}].gain`, gain, 'a finite number')
  }
}

function firstNotFinite(values: readonly number[] | Float64Array): number {
  for (let i = 0; i < values.length; i++) if (!Number.isFinite(values[i]!)) return i
  return -1
}

/** Also of a ground that comes later (vary.ts). */
export function checkGround(ground: GroundSpec, contact: ContactSpec | undefined, dimensions: number): void {
  const { heightsM, spacingM, firstXM, rows = 1, firstZM = 0, spacingZM = spacingM } = ground
  demand(dimensions === 3 || rows === 1, 'ground.rows', rows, 'one row of heights in 2-D')
  demand(Number.isInteger(rows) && rows >= 1, 'ground.rows', rows, 'a whole number of rows')
  demand(
    heightsM.length % rows === 0,
    'ground.heightsM',
    heightsM.length,
    `${rows} rows of equally many heights`,
  )
  demand(heightsM.length / rows >= 2, 'ground.heightsM', heightsM.length, 'at least 2 heights a row')
  const most = limits.latticeHeightsMost
  demand(heightsM.length <= most, 'ground.heightsM', heightsM.length, `at most ${most} heights`)
  const wrong = firstNotFinite(heightsM)
  demand(wrong < 0, `ground.heightsM[${wrong}]`, heightsM[wrong], 'a finite height')
  demand(isPositive(spacingM), 'ground.spacingM', spacingM, 'a finite spacing above 0')
  demand(isPositive(spacingZM), 'ground.spacingZM', spacingZM, 'a finite spacing above 0')
  demand(Number.isFinite(firstXM), 'ground.firstXM', firstXM, 'a finite number')
  demand(Number.isFinite(firstZM), 'ground.firstZM', firstZM, 'a finite number')
  demand(contact !== undefined, 'contact', 'none', 'a contact law, because there is a ground')
  const { stiffness, damping, exponent, depthLimitM } = contact
  demand(isPositive(stiffness), 'contact.stiffness', stiffness, 'a finite stiffness above 0')
  demand(isAtLeast0(damping), 'contact.damping', damping, 'a finite number >= 0')
  demand(exponent === 1 || exponent === 1.5, 'contact.exponent', exponent, '1 or 1.5')
  demand(isPositive(depthLimitM), 'contact.depthLimitM', depthLimitM, 'a finite depth above 0')
}
