// The parts of a lattice laid out one by one; what they mean stands in layout.ts. Checked before (build-checks.ts).

import { cos, sin } from '../../shared/detmath/trigonometry.js'
import { dimensionsOf, distanceM, signedSize } from './build-checks.js'
import type { Lattice } from './layout.js'
import type { DrivenLimits } from './limits.js'
import { turnAt } from './reference/drive.js'
import type { ContactSpec, DriveGroupSpec, FrictionSpec, GroundSpec, LatticeSpec, StrutSpec } from './spec.js'

export const turn = 2 * Math.PI
const unlimited = Number.POSITIVE_INFINITY

export function sineAndCosine(angle: number): [number, number] {
  return [sin(angle), cos(angle)]
}

/** Shared by all that have none of something: it cannot be written to. */
const noNumbers = new Float64Array(0)
const noOffsets = new Int32Array(0)

/** A number of every item; a loop, because `from` asks an iterator for each of them. */
export function doubles<T>(list: readonly T[], read: (item: T, i: number) => number): Float64Array {
  if (list.length === 0) return noNumbers
  const values = new Float64Array(list.length)
  for (let i = 0; i < list.length; i++) values[i] = read(list[i]!, i)
  return values
}

export function zeros(count: number): Float64Array {
  return count === 0 ? noNumbers : new Float64Array(count)
}

export function integers<T>(list: readonly T[], read: (item: T, i: number) => number): Int32Array {
  if (list.length === 0) return noOffsets
  const values = new Int32Array(list.length)
  for (let i = 0; i < list.length; i++) values[i] = read(list[i]!, i)
  return values
}

const strideOf = (spec: LatticeSpec) => 3 * dimensionsOf(spec)
const offsets = (spec: LatticeSpec, nodes: readonly number[]) => {
  const stride = strideOf(spec)
  return integers(nodes, (node) => node * stride)
}
/** Both ends of every item, one after the other; a loop, because lists of lists are slow to make flat. */
function endsOf(spec: LatticeSpec, list: readonly { readonly a: number; readonly b: number }[]): Int32Array {
  if (list.length === 0) return noOffsets
  const stride = strideOf(spec)
  const ends = new Int32Array(2 * list.length)
  for (let i = 0; i < list.length; i++) {
    ends[2 * i] = list[i]!.a * stride
    ends[2 * i + 1] = list[i]!.b * stride
  }
  return ends
}

export function layOutStruts(spec: LatticeSpec) {
  const { struts, actuators = [], guided = [] } = spec
  const all: readonly StrutSpec[] = [...struts, ...actuators, ...guided]
  const restM = doubles(all, ({ restM, a, b }) => restM ?? distanceM(spec, a, b))
  const stiffnessNpm = doubles(all, (strut) => strut.stiffnessNpm)
  return {
    passiveCount: struts.length,
    activeCount: actuators.length,
    guidedCount: guided.length,
    ends: endsOf(spec, all),
    restM,
    stiffnessNpm,
    stiffnessRestN: doubles(all, (_, i) => stiffnessNpm[i]! * restM[i]!),
    dampingNspm: doubles(all, (strut) => strut.dampingNspm),
  }
}

/** What turns a drive into the strain of a driven strut; phase and lag may be those of another situation (vary.ts). */
export interface Strokes {
  /** Made small enough for the limits of strain and rate, with a sweep at its highest frequency. */
  readonly strain: Float64Array
  /** Sine and cosine of the phase. */
  readonly sine: Float64Array
  readonly cosine: Float64Array
  readonly angularRadps: Float64Array
}

/** Of actuators, then guided struts; those are limited as they go. */
export function strokesOf(
  { groups = [], actuators = [], guided = [] }: LatticeSpec,
  limits: DrivenLimits,
): Strokes {
  const count = actuators.length + guided.length
  const strokes = {
    strain: zeros(count),
    sine: zeros(count),
    cosine: zeros(count),
    angularRadps: zeros(count),
  }
  for (let j = 0; j < count; j++) {
    const strut = actuators[j] ?? guided[j - actuators.length]!
    const { frequencyHz, sweep } = (strut.group === undefined ? undefined : groups[strut.group]) ?? still
    const most =
      j < actuators.length ? strainMost(limits, j, Math.max(frequencyHz, sweep?.toHz ?? 0)) : unlimited
    const strain = strut.group === undefined ? 0 : (strut.strain ?? 0)
    strokes.strain[j] = Math.min(most, Math.max(-most, strain))
    const angle = turn * (strut.phaseTurns ?? 0)
    strokes.sine[j] = sin(angle)
    strokes.cosine[j] = cos(angle)
    strokes.angularRadps[j] = turn * frequencyHz
  }
  return strokes
}

const still: DriveGroupSpec = { frequencyHz: 0 }

function strainMost({ strain, strainRatePerSecond }: DrivenLimits, j: number, fastestHz: number): number {
  const rate = strainRatePerSecond[j]!
  return Math.min(strain[j]!, fastestHz > 0 ? rate / (turn * fastestHz) : unlimited)
}

/**
 * Strain times cosine and sine of (phase - lag angle), times the cosine of the lag angle d, tan d = angular frequency *
 * lag. `lagOf` says the lag of a driven strut.
 */
export function turnStrains(strokes: Strokes, lagOf: (j: number) => number) {
  const { strain, sine, cosine, angularRadps } = strokes
  const strainCos = zeros(strain.length)
  const strainSin = zeros(strain.length)
  for (let j = 0; j < strain.length; j++) {
    const tangent = angularRadps[j]! * lagOf(j)
    const shrink = strain[j]! / (1 + tangent * tangent)
    strainCos[j] = shrink * (cosine[j]! + sine[j]! * tangent)
    strainSin[j] = shrink * (sine[j]! - cosine[j]! * tangent)
  }
  return { strainCos, strainSin }
}

/** Lag of every driven strut as described, s. */
export function lagsOf({ groups = [], actuators = [], guided = [] }: LatticeSpec): Float64Array {
  return doubles([...actuators, ...guided], ({ group }) =>
    group === undefined ? 0 : (groups[group]!.lagSeconds ?? 0),
  )
}

export function layOutDriven(spec: LatticeSpec, strokes: Strokes, limits: DrivenLimits) {
  const { actuators = [], guided = [] } = spec
  const struts = [...actuators, ...guided]
  const lags = lagsOf(spec)
  return {
    group: integers(struts, (strut) => 2 * (strut.group ?? 0)),
    ...turnStrains(strokes, (j) => lags[j]!),
    limitN: limits.forceN,
    powerMostW: limits.powerW,
  }
}

export function layOutGuided({ actuators = [], guided = [] }: LatticeSpec, h: number, limits: DrivenLimits) {
  const feedback = guided.flatMap((strut) => strut.feedback ?? [])
  const feedbackFirst = new Int32Array(guided.length + 1)
  for (const [j, strut] of guided.entries()) {
    feedbackFirst[j + 1] = feedbackFirst[j]! + (strut.feedback?.length ?? 0)
  }
  return {
    guidedStrain: zeros(guided.length),
    hostStrain: zeros(guided.length),
    strokeMost: limits.strain.slice(actuators.length),
    strainStepMost: limits.strainRatePerSecond.slice(actuators.length).map((rate) => rate * h),
    feedbackFirst,
    feedbackSensor: integers(feedback, (row) => row.sensor),
    feedbackGain: doubles(feedback, (row) => row.gain),
  }
}

export function layOutSensors({ sensors = [] }: LatticeSpec, h: number) {
  return {
    sensorCount: sensors.length,
    sensed: zeros(sensors.length),
    sensorKind: integers(sensors, ({ kind }) => (kind === 'contact' ? 0 : 1)),
    sensorAt: integers(sensors, (s) => (s.kind === 'contact' ? s.node : s.strut)),
    sensorRate: doubles(sensors, ({ filterSeconds = 0 }) => (filterSeconds > h ? h / filterSeconds : 1)),
  }
}

export function layOutFluid(spec: LatticeSpec) {
  const { dragStruts = [] } = spec
  return {
    dragCount: dragStruts.length,
    dragEnds: endsOf(spec, dragStruts),
    dragNormal: doubles(dragStruts, (strut) => strut.normalNspm2),
    dragDifference: doubles(dragStruts, (strut) => strut.normalNspm2 - strut.tangentNspm2),
  }
}

export function layOutFills(spec: LatticeSpec) {
  const fills = [
    ...(spec.areas ?? []).map((a) => ({ nodes: a.nodes, stiffness: a.stiffnessNpm, rest: a.restM2 })),
    ...(spec.volumes ?? []).map((v) => ({ nodes: v.nodes, stiffness: v.stiffnessPa, rest: v.restM3 })),
  ]
  const fillRest = doubles(fills, ({ nodes, rest }) => rest ?? signedSize(spec, nodes))
  return {
    fillCount: fills.length,
    fillEnds: offsets(
      spec,
      fills.flatMap(({ nodes }) => [...nodes]),
    ),
    fillRest,
    fillStiffness: doubles(fills, ({ stiffness }, i) => stiffness / fillRest[i]!),
  }
}

export function layOutPairs(spec: LatticeSpec) {
  const { keepApart = [] } = spec
  return {
    apartCount: keepApart.length,
    apartEnds: endsOf(spec, keepApart),
    apartStiffnessNpm: doubles(keepApart, (pair) => pair.stiffnessNpm),
    apartStiffnessLeastN: doubles(keepApart, (pair) => pair.stiffnessNpm * pair.leastM),
  }
}

/** Coefficients of one node: two numbers in 2-D, three in 3-D. */
export function frictionOf(dimensions: 2 | 3, friction: FrictionSpec | undefined): readonly number[] {
  const { forward, backward, sideways } = friction ?? { forward: 0, backward: 0 }
  return dimensions === 2 ? [forward, backward] : [forward, backward, sideways ?? Math.max(forward, backward)]
}

export function layOutFriction(spec: LatticeSpec): Float64Array {
  const dimensions = dimensionsOf(spec)
  const coefficients = new Float64Array(dimensions * spec.nodes.length)
  for (let i = 0; i < spec.nodes.length; i++) {
    coefficients.set(frictionOf(dimensions, spec.nodes[i]!.friction), dimensions * i)
  }
  return coefficients
}

/** One cell more at each end, as high as the end, makes the ground level beyond. */
export function layOutGround(ground: GroundSpec | undefined, dimensions: 2 | 3) {
  if (!ground) {
    const heightsM = new Float64Array(dimensions === 2 ? 2 : 4)
    const terrain = Float64Array.of(0, 0, Number.NEGATIVE_INFINITY, 0, 0)
    return { heightsM, terrain, groundColumns: 2, groundRows: dimensions === 2 ? 1 : 2 }
  }
  const { heightsM: given, spacingM, firstXM, rows = 1, firstZM = 0, spacingZM = spacingM } = ground
  const columns = given.length / rows
  const groundColumns = columns + 2
  const groundRows = dimensions === 2 ? 1 : rows + 2
  const heightsM = new Float64Array(groundColumns * groundRows)
  let highest = Number.NEGATIVE_INFINITY
  for (let row = 0; row < groundRows; row++) {
    const from = (dimensions === 2 ? 0 : Math.min(rows - 1, Math.max(0, row - 1))) * columns
    const to = row * groundColumns
    for (let column = 0; column < columns; column++) {
      const height = given[from + column]!
      heightsM[to + 1 + column] = height
      if (height > highest) highest = height
    }
    heightsM[to] = given[from]!
    heightsM[to + columns + 1] = given[from + columns - 1]!
  }
  const terrain = Float64Array.of(
    firstXM - spacingM,
    1 / spacingM,
    highest,
    firstZM - spacingZM,
    1 / spacingZM,
  )
  return { heightsM, terrain, groundColumns, groundRows }
}

export function layOutContact(contact: ContactSpec | undefined): Float64Array {
  if (!contact) return new Float64Array(3)
  const { stiffness, damping, exponent } = contact
  return Float64Array.of(stiffness, damping, exponent === 1.5 ? 1 : 0)
}

/** Pairs (sine, cosine) of `count` angles, which are mostly the same. */
function sinesAndCosines(count: number, angleOf: (i: number) => number): Float64Array {
  const pairs = new Float64Array(2 * count)
  let known = 0
  let pair: readonly [number, number] = [0, 1]
  for (let i = 0; i < count; i++) {
    const angle = angleOf(i)
    if (angle !== known) {
      known = angle
      pair = sineAndCosine(angle)
    }
    pairs[2 * i] = pair[0]
    pairs[2 * i + 1] = pair[1]
  }
  return pairs
}

/** Groups that nobody gave (guided struts without one) stand still. */
export function layOutDrive(spec: LatticeSpec, groupCount: number, h: number) {
  const groups: readonly DriveGroupSpec[] = spec.groups?.length
    ? spec.groups
    : new Array<DriveGroupSpec>(groupCount).fill({ frequencyHz: 0 })
  const sweepSteps = integers(groups, ({ sweep }) => (sweep ? Math.max(1, Math.round(sweep.seconds / h)) : 0))
  const angularRadps = doubles(groups, (g) => turn * g.frequencyHz)
  const sweepRadps2 = doubles(groups, ({ sweep }, i) =>
    sweep ? (turn * sweep.toHz - angularRadps[i]!) / (sweepSteps[i]! * h) : 0,
  )
  const parts = { angularRadps, sweepRadps2, sweepSteps, stepSeconds: h }
  return {
    ...parts,
    rotation: sinesAndCosines(groupCount, (g) => turnAt(parts, g, 0)),
    rotationTurn: sinesAndCosines(groupCount, (g) => sweepRadps2[g]! * h * h),
    driveStartStep: Math.round((spec.drive?.startSeconds ?? 0) / h),
    rampSteps: Math.round((spec.drive?.rampSeconds ?? 0) / h),
  }
}

export function layOutPrescribed(spec: LatticeSpec) {
  const { prescribed = [] } = spec
  const turned = prescribed.map((path) => sineAndCosine(turn * path.phaseTurns))
  return {
    prescribedCount: prescribed.length,
    prescribedEnds: offsets(
      spec,
      prescribed.map((path) => path.node),
    ),
    prescribedGroup: integers(prescribed, (path) => 2 * path.group),
    prescribedStartM: Float64Array.from(prescribed.flatMap((path) => spec.nodes[path.node]!.positionM)),
    prescribedAmplitudeM: Float64Array.from(prescribed.flatMap((path) => path.amplitudeM)),
    prescribedCos: doubles(turned, ([, cosine]) => cosine),
    prescribedSin: doubles(turned, ([sine]) => sine),
  }
}

type PathParts = Pick<
  Lattice,
  | 'dimensions'
  | 'nodes'
  | 'angularRadps'
  | 'prescribedCount'
  | 'prescribedEnds'
  | 'prescribedGroup'
  | 'prescribedStartM'
  | 'prescribedAmplitudeM'
  | 'prescribedCos'
  | 'prescribedSin'
>

/** Nodes on a path start on it, at its speed. */
export function startPrescribed(parts: PathParts): void {
  const { dimensions, nodes, prescribedStartM, prescribedAmplitudeM, prescribedCos, prescribedSin } = parts
  for (let n = 0; n < parts.prescribedCount; n++) {
    const o = parts.prescribedEnds[n]!
    const angularRadps = parts.angularRadps[parts.prescribedGroup[n]! / 2]!
    for (let i = 0; i < dimensions; i++) {
      const amplitudeM = prescribedAmplitudeM[dimensions * n + i]!
      nodes[o + i] = prescribedStartM[dimensions * n + i]! + amplitudeM * prescribedSin[n]!
      nodes[o + dimensions + i] = amplitudeM * angularRadps * prescribedCos[n]!
    }
  }
}
