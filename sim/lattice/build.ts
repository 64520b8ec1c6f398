// From a description (spec.ts) to flat arrays: the control plane. Everything is checked here once, so that the
// kernel need not look. What is wrong is a Refusal that names the field and the numbers.

import { cos, sin } from '../../shared/detmath/trigonometry.js'
import { refuse } from '../../shared/refusals.js'
import { stride } from './kernel.js'
import { type ContactSpec, dimensions, type GroundSpec, type LatticeSpec, type StrutSpec } from './spec.js'
import { stepBound } from './stability.js'

/** A lattice laid out for the kernel, and its state. `nodes`, `rotors` and `step` are the whole state. */
export interface Lattice {
  readonly nodeCount: number
  readonly passiveCount: number
  readonly activeCount: number
  /** x y | vx vy | fx fy a node (kernel.ts). */
  readonly nodes: Float64Array
  /** 0 for nodes that are pinned or moved along a path. */
  readonly inverseMass: Float64Array
  readonly massKg: Float64Array
  /** Passive struts, then active ones: offsets of the records of their two nodes. */
  readonly ends: Int32Array
  readonly restM: Float64Array
  readonly stiffnessNpm: Float64Array
  readonly stiffnessRestN: Float64Array
  readonly dampingNspm: Float64Array
  /** Of active struts. */
  readonly strainCos: Float64Array
  readonly strainSin: Float64Array
  readonly limitN: Float64Array
  /** Place of its group's sin wt in `driven`. */
  readonly group: Int32Array
  readonly angularRadps: Float64Array
  readonly rotation: Float64Array
  /** sin wt, cos wt of every group; `driven` is the same times how far the drive has grown (0 to 1). */
  readonly rotors: Float64Array
  readonly driven: Float64Array
  readonly prescribed: readonly Prescribed[]
  readonly gravity: Float64Array
  /** May be changed between calls of advance(), e.g. for settling. */
  dragNspm: number
  readonly heightsM: Float64Array
  readonly terrain: Float64Array
  readonly contact: Float64Array
  readonly friction: Float64Array
  readonly depthLimitM: number
  readonly driveStartStep: number
  readonly rampSteps: number
  readonly stepSeconds: number
  /** Steps done. */
  step: number
}

export interface Prescribed {
  readonly offset: number
  readonly groupAt: number
  readonly startM: readonly number[]
  readonly amplitudeM: readonly number[]
  readonly cosine: number
  readonly sine: number
}

/** Checks a description and lays it out. Throws a Refusal ('impossible-value') naming the field. */
export function buildLattice(spec: LatticeSpec): Lattice {
  checkNodes(spec)
  checkStruts(spec)
  checkDrive(spec)
  if (spec.ground) checkGround(spec.ground, spec.contact)
  checkStep(spec)
  const fixed = new Set((spec.prescribed ?? []).map((path) => path.node))
  const groups = spec.groups ?? []
  const terrain = layOutGround(spec.ground)
  const h = spec.stepSeconds
  const drive = layOutDrive(spec)
  const nodes = layOutNodes(spec)
  // A drive that neither waits nor grows is at work from the first step.
  const atOnce = !spec.drive || (spec.drive.startSeconds < h / 2 && spec.drive.rampSeconds < h / 2)
  if (atOnce) startPrescribed(spec, drive.prescribed, nodes)
  return {
    nodeCount: spec.nodes.length,
    ...layOutStruts(spec),
    nodes,
    inverseMass: Float64Array.from(spec.nodes, (n, i) => (n.pinned || fixed.has(i) ? 0 : 1 / n.massKg)),
    massKg: Float64Array.from(spec.nodes, (n) => n.massKg),
    ...drive,
    angularRadps: Float64Array.from(groups, (g) => turn * g.frequencyHz),
    rotation: Float64Array.from(groups.flatMap((g) => sineAndCosine(turn * g.frequencyHz * h))),
    rotors: Float64Array.from(groups.flatMap(() => [0, 1])),
    driven: Float64Array.from(groups.flatMap(() => (atOnce ? [0, 1] : [0, 0]))),
    gravity: Float64Array.from(spec.gravityMps2),
    dragNspm: spec.dragNspm ?? 0,
    ...terrain,
    contact: layOutContact(spec.contact),
    friction: Float64Array.from(
      spec.nodes.flatMap((n) => [n.friction?.forward ?? 0, n.friction?.backward ?? 0]),
    ),
    depthLimitM: spec.contact?.depthLimitM ?? Number.POSITIVE_INFINITY,
    driveStartStep: Math.round((spec.drive?.startSeconds ?? 0) / h),
    rampSteps: Math.round((spec.drive?.rampSeconds ?? 0) / h),
    stepSeconds: h,
    step: 0,
  }
}

const turn = 2 * Math.PI

function sineAndCosine(angle: number): [number, number] {
  return [sin(angle), cos(angle)]
}

function layOutNodes(spec: LatticeSpec): Float64Array {
  const nodes = new Float64Array(spec.nodes.length * stride)
  for (const [i, node] of spec.nodes.entries()) {
    nodes.set(node.positionM, i * stride)
    nodes.set(node.velocityMps ?? [], i * stride + dimensions)
  }
  return nodes
}

function layOutStruts(spec: LatticeSpec) {
  const all: readonly StrutSpec[] = [...spec.struts, ...(spec.actuators ?? [])]
  const restM = Float64Array.from(all, (strut) => strut.restM ?? distanceM(spec, strut))
  const stiffnessNpm = Float64Array.from(all, (strut) => strut.stiffnessNpm)
  return {
    passiveCount: spec.struts.length,
    activeCount: spec.actuators?.length ?? 0,
    ends: Int32Array.from(all.flatMap((strut) => [strut.a * stride, strut.b * stride])),
    restM,
    stiffnessNpm,
    stiffnessRestN: stiffnessNpm.map((k, i) => k * restM[i]!),
    dampingNspm: Float64Array.from(all, (strut) => strut.dampingNspm),
  }
}

function layOutDrive(spec: LatticeSpec) {
  const actuators = spec.actuators ?? []
  // Strain times cosine and sine of (phase - lag angle), times the cosine of the lag angle.
  const turned = actuators.map((strut): readonly [number, number] => {
    const { frequencyHz, lagSeconds = 0 } = spec.groups![strut.group]!
    const tangent = turn * frequencyHz * lagSeconds
    const shrink = strut.strain / (1 + tangent * tangent)
    const [s, c] = sineAndCosine(turn * strut.phaseTurns)
    return [shrink * (c + s * tangent), shrink * (s - c * tangent)]
  })
  return {
    group: Int32Array.from(actuators, (strut) => 2 * strut.group),
    strainCos: Float64Array.from(turned, ([cosine]) => cosine),
    strainSin: Float64Array.from(turned, ([, sine]) => sine),
    limitN: Float64Array.from(actuators, (strut) => strut.forceLimitN ?? Number.POSITIVE_INFINITY),
    prescribed: (spec.prescribed ?? []).map((path): Prescribed => {
      const [sine, cosine] = sineAndCosine(turn * path.phaseTurns)
      const startM = spec.nodes[path.node]!.positionM
      const { amplitudeM } = path
      return { offset: path.node * stride, groupAt: 2 * path.group, startM, amplitudeM, cosine, sine }
    }),
  }
}

/** Nodes on a path start on it, at its speed. */
function startPrescribed(spec: LatticeSpec, paths: readonly Prescribed[], nodes: Float64Array): void {
  for (const { offset, groupAt, startM, amplitudeM, cosine, sine } of paths) {
    const angularRadps = turn * spec.groups![groupAt / 2]!.frequencyHz
    for (let i = 0; i < dimensions; i++) {
      nodes[offset + i] = startM[i]! + amplitudeM[i]! * sine
      nodes[offset + dimensions + i] = amplitudeM[i]! * angularRadps * cosine
    }
  }
}

/** One cell more at each end, as high as the end, makes the ground level beyond. */
function layOutGround(ground: GroundSpec | undefined): { heightsM: Float64Array; terrain: Float64Array } {
  if (!ground) {
    return { heightsM: new Float64Array(2), terrain: Float64Array.of(0, 0, Number.NEGATIVE_INFINITY) }
  }
  const given = ground.heightsM
  const heightsM = Float64Array.of(given[0]!, ...given, given[given.length - 1]!)
  const highest = heightsM.reduce((a, b) => Math.max(a, b))
  return {
    heightsM,
    terrain: Float64Array.of(ground.firstXM - ground.spacingM, 1 / ground.spacingM, highest),
  }
}

function layOutContact(contact: ContactSpec | undefined): Float64Array {
  if (!contact) return new Float64Array(3)
  const { stiffness, damping, exponent } = contact
  return Float64Array.of(stiffness, damping, exponent === 1.5 ? 1 : 0)
}

function distanceM(spec: LatticeSpec, strut: StrutSpec): number {
  const a = spec.nodes[strut.a]!.positionM
  const b = spec.nodes[strut.b]!.positionM
  let squared = 0
  for (let i = 0; i < dimensions; i++) squared += (b[i]! - a[i]!) * (b[i]! - a[i]!)
  return Math.sqrt(squared)
}

function demand(truth: boolean, field: string, found: unknown, expected: string): asserts truth {
  if (!truth) {
    throw refuse('impossible-value', {
      detail: `found ${String(found)}, expected ${expected}.`,
      where: { field: `lattice.${field}` },
    })
  }
}

const isVector = (v: readonly number[]) => v.length === dimensions && v.every(Number.isFinite)
const isPositive = (x: number) => Number.isFinite(x) && x > 0
const isAtLeast0 = (x: number) => Number.isFinite(x) && x >= 0

function checkNodes({ nodes, gravityMps2, dragNspm = 0 }: LatticeSpec): void {
  demand(nodes.length > 0, 'nodes', 'none', 'at least one node')
  for (const [i, node] of nodes.entries()) {
    const at = `nodes[${i}]`
    demand(isVector(node.positionM), `${at}.positionM`, node.positionM, `${dimensions} finite numbers`)
    const velocity = node.velocityMps
    demand(!velocity || isVector(velocity), `${at}.velocityMps`, velocity, `${dimensions} finite numbers`)
    demand(isPositive(node.massKg), `${at}.massKg`, node.massKg, 'a finite mass above 0')
    const friction = node.friction
    const sound = !friction || (isAtLeast0(friction.forward) && isAtLeast0(friction.backward))
    demand(sound, `${at}.friction`, JSON.stringify(friction), 'finite coefficients of at least 0')
  }
  demand(isVector(gravityMps2), 'gravityMps2', gravityMps2, `${dimensions} finite numbers`)
  demand(isAtLeast0(dragNspm), 'dragNspm', dragNspm, 'a finite number of at least 0')
}

function checkStruts(spec: LatticeSpec): void {
  const isNode = (i: number) => Number.isInteger(i) && i >= 0 && i < spec.nodes.length
  const one = (strut: StrutSpec, at: string) => {
    demand(isNode(strut.a), `${at}.a`, strut.a, `a node, 0 to ${spec.nodes.length - 1}`)
    demand(isNode(strut.b), `${at}.b`, strut.b, `a node, 0 to ${spec.nodes.length - 1}`)
    demand(strut.a !== strut.b, at, `node ${strut.a} at both ends`, 'two different nodes')
    const lengthM = distanceM(spec, strut)
    demand(lengthM > 0, at, 'both nodes at one place', 'a length above 0')
    demand(isPositive(strut.restM ?? lengthM), `${at}.restM`, strut.restM, 'a finite length above 0')
    demand(isAtLeast0(strut.stiffnessNpm), `${at}.stiffnessNpm`, strut.stiffnessNpm, 'a finite number >= 0')
    demand(isAtLeast0(strut.dampingNspm), `${at}.dampingNspm`, strut.dampingNspm, 'a finite number >= 0')
  }
  for (const [i, strut] of spec.struts.entries()) one(strut, `struts[${i}]`)
  for (const [i, strut] of (spec.actuators ?? []).entries()) one(strut, `actuators[${i}]`)
}

function checkDrive(spec: LatticeSpec): void {
  const groups = spec.groups ?? []
  const isGroup = (g: number) => Number.isInteger(g) && g >= 0 && g < groups.length
  for (const [i, { frequencyHz, lagSeconds = 0 }] of groups.entries()) {
    demand(isAtLeast0(frequencyHz), `groups[${i}].frequencyHz`, frequencyHz, 'a finite frequency >= 0')
    demand(isAtLeast0(lagSeconds), `groups[${i}].lagSeconds`, lagSeconds, 'a finite time >= 0')
  }
  for (const [i, strut] of (spec.actuators ?? []).entries()) {
    const at = `actuators[${i}]`
    demand(isGroup(strut.group), `${at}.group`, strut.group, `one of ${groups.length} groups`)
    demand(Math.abs(strut.strain) < 1, `${at}.strain`, strut.strain, 'a strain between -1 and 1')
    demand(Number.isFinite(strut.phaseTurns), `${at}.phaseTurns`, strut.phaseTurns, 'a finite number')
    const limit = strut.forceLimitN
    demand(limit === undefined || limit > 0, `${at}.forceLimitN`, limit, 'a force above 0')
  }
  for (const [i, path] of (spec.prescribed ?? []).entries()) {
    const at = `prescribed[${i}]`
    demand(spec.nodes[path.node] !== undefined, `${at}.node`, path.node, 'a node')
    demand(isGroup(path.group), `${at}.group`, path.group, `one of ${groups.length} groups`)
    demand(isVector(path.amplitudeM), `${at}.amplitudeM`, path.amplitudeM, `${dimensions} finite numbers`)
    demand(Number.isFinite(path.phaseTurns), `${at}.phaseTurns`, path.phaseTurns, 'a finite number')
  }
  const { startSeconds = 0, rampSeconds = 0 } = spec.drive ?? {}
  demand(isAtLeast0(startSeconds), 'drive.startSeconds', startSeconds, 'a finite time >= 0')
  demand(isAtLeast0(rampSeconds), 'drive.rampSeconds', rampSeconds, 'a finite time >= 0')
}

function checkGround(ground: GroundSpec, contact: ContactSpec | undefined): void {
  const { heightsM, spacingM, firstXM } = ground
  demand(heightsM.length >= 2, 'ground.heightsM', heightsM.length, 'at least 2 heights')
  demand(Array.from(heightsM).every(Number.isFinite), 'ground.heightsM', 'a height', 'finite heights')
  demand(isPositive(spacingM), 'ground.spacingM', spacingM, 'a finite spacing above 0')
  demand(Number.isFinite(firstXM), 'ground.firstXM', firstXM, 'a finite number')
  demand(contact !== undefined, 'contact', 'none', 'a contact law, because there is a ground')
  const { stiffness, damping, exponent, depthLimitM } = contact
  demand(isPositive(stiffness), 'contact.stiffness', stiffness, 'a finite stiffness above 0')
  demand(isAtLeast0(damping), 'contact.damping', damping, 'a finite number >= 0')
  demand(exponent === 1 || exponent === 1.5, 'contact.exponent', exponent, '1 or 1.5')
  demand(isPositive(depthLimitM), 'contact.depthLimitM', depthLimitM, 'a finite depth above 0')
}

function checkStep(spec: LatticeSpec): void {
  const h = spec.stepSeconds
  demand(isPositive(h), 'stepSeconds', h, 'a finite time above 0')
  const bound = stepBound(spec)
  demand(
    h < bound.limitSeconds,
    'stepSeconds',
    `${h} s`,
    `a step below ${bound.limitSeconds} s: the highest frequency is at most ${bound.highestRadps} rad/s ` +
      `with damping ratio ${bound.dampingRatio}`,
  )
}
