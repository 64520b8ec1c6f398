// The parts of a lattice laid out one by one; what they mean stands in layout.ts. Checked before (build-checks.ts).

import { cos, sin } from '../../shared/detmath/trigonometry.js'
import { dimensionsOf, distanceM, signedSize } from './build-checks.js'
import type { Lattice } from './layout.js'
import { turnAt } from './reference/drive.js'
import type {
  ActuatorLimits,
  ContactSpec,
  DriveGroupSpec,
  FrictionSpec,
  GroundSpec,
  LatticeSpec,
  StrutSpec,
} from './spec.js'

export const turn = 2 * Math.PI
const unlimited = Number.POSITIVE_INFINITY

export function sineAndCosine(angle: number): [number, number] {
  return [sin(angle), cos(angle)]
}

const strideOf = (spec: LatticeSpec) => 3 * dimensionsOf(spec)
const offsets = (spec: LatticeSpec, nodes: readonly number[]) =>
  Int32Array.from(nodes, (node) => node * strideOf(spec))
const endsOf = (spec: LatticeSpec, list: readonly { readonly a: number; readonly b: number }[]) =>
  offsets(
    spec,
    list.flatMap(({ a, b }) => [a, b]),
  )

export function layOutStruts(spec: LatticeSpec) {
  const { struts, actuators = [], guided = [] } = spec
  const all: readonly StrutSpec[] = [...struts, ...actuators, ...guided]
  const restM = Float64Array.from(all, ({ restM, a, b }) => restM ?? distanceM(spec, a, b))
  const stiffnessNpm = Float64Array.from(all, (strut) => strut.stiffnessNpm)
  return {
    passiveCount: struts.length,
    activeCount: actuators.length,
    guidedCount: guided.length,
    ends: endsOf(spec, all),
    restM,
    stiffnessNpm,
    stiffnessRestN: stiffnessNpm.map((k, i) => k * restM[i]!),
    dampingNspm: Float64Array.from(all, (strut) => strut.dampingNspm),
  }
}

/** What turns a drive into the strain of one strut; phase and lag may be those of another situation (vary.ts). */
export interface Stroke extends ActuatorLimits {
  readonly group: DriveGroupSpec
  readonly strain: number
  readonly phaseTurns: number
}

/**
 * Strain times cosine and sine of (phase - lag angle), times the cosine of the lag angle. The stroke is first made
 * small enough for the limits of strain and rate; with a sweep at its highest frequency.
 */
export function turnedStrain(stroke: Stroke): readonly [number, number] {
  const { group, phaseTurns, strainLimit = unlimited, strainRateLimitPerSecond = unlimited } = stroke
  const { frequencyHz, lagSeconds = 0, sweep } = group
  const fastestRadps = turn * Math.max(frequencyHz, sweep?.toHz ?? 0)
  const most = Math.min(strainLimit, fastestRadps > 0 ? strainRateLimitPerSecond / fastestRadps : unlimited)
  const strain = Math.min(most, Math.max(-most, stroke.strain))
  const tangent = turn * frequencyHz * lagSeconds
  const shrink = strain / (1 + tangent * tangent)
  const [s, c] = sineAndCosine(turn * phaseTurns)
  return [shrink * (c + s * tangent), shrink * (s - c * tangent)]
}

/** The driven struts of a description: actuators, then guided struts. Guided ones are limited as they go. */
export function strokesOf({ groups = [], actuators = [], guided = [] }: LatticeSpec): readonly Stroke[] {
  const still: DriveGroupSpec = { frequencyHz: 0 }
  return [
    ...actuators.map((strut) => ({ ...strut, group: groups[strut.group]! })),
    ...guided.map(({ group, strain = 0, phaseTurns = 0 }) => {
      return group === undefined
        ? { group: still, strain: 0, phaseTurns: 0 }
        : { group: groups[group]!, strain, phaseTurns }
    }),
  ]
}

export function layOutDriven(spec: LatticeSpec) {
  const { actuators = [], guided = [] } = spec
  const turned = strokesOf(spec).map(turnedStrain)
  return {
    group: Int32Array.from([...actuators, ...guided], (strut) => 2 * (strut.group ?? 0)),
    strainCos: Float64Array.from(turned, ([cosine]) => cosine),
    strainSin: Float64Array.from(turned, ([, sine]) => sine),
    limitN: Float64Array.from([...actuators, ...guided], (strut) => strut.forceLimitN ?? unlimited),
  }
}

export function layOutGuided({ guided = [] }: LatticeSpec, h: number) {
  const feedback = guided.flatMap((strut) => strut.feedback ?? [])
  const feedbackFirst = new Int32Array(guided.length + 1)
  for (const [j, strut] of guided.entries()) {
    feedbackFirst[j + 1] = feedbackFirst[j]! + (strut.feedback?.length ?? 0)
  }
  return {
    guidedStrain: new Float64Array(guided.length),
    hostStrain: new Float64Array(guided.length),
    strokeMost: Float64Array.from(guided, (strut) => strut.strainLimit ?? unlimited),
    strainStepMost: Float64Array.from(guided, (strut) => (strut.strainRateLimitPerSecond ?? unlimited) * h),
    powerMostW: Float64Array.from(guided, (strut) => strut.powerLimitW ?? unlimited),
    feedbackFirst,
    feedbackSensor: Int32Array.from(feedback, (row) => row.sensor),
    feedbackGain: Float64Array.from(feedback, (row) => row.gain),
  }
}

export function layOutSensors({ sensors = [] }: LatticeSpec, h: number) {
  return {
    sensorCount: sensors.length,
    sensed: new Float64Array(sensors.length),
    sensorKind: Int32Array.from(sensors, ({ kind }) => (kind === 'contact' ? 0 : 1)),
    sensorAt: Int32Array.from(sensors, (s) => (s.kind === 'contact' ? s.node : s.strut)),
    sensorRate: Float64Array.from(sensors, ({ filterSeconds = 0 }) =>
      filterSeconds > h ? h / filterSeconds : 1,
    ),
  }
}

export function layOutFluid(spec: LatticeSpec) {
  const { dragStruts = [] } = spec
  return {
    dragCount: dragStruts.length,
    dragEnds: endsOf(spec, dragStruts),
    dragNormal: Float64Array.from(dragStruts, (strut) => strut.normalNspm2),
    dragDifference: Float64Array.from(dragStruts, (strut) => strut.normalNspm2 - strut.tangentNspm2),
  }
}

export function layOutFills(spec: LatticeSpec) {
  const fills = [
    ...(spec.areas ?? []).map((a) => ({ nodes: a.nodes, stiffness: a.stiffnessNpm, rest: a.restM2 })),
    ...(spec.volumes ?? []).map((v) => ({ nodes: v.nodes, stiffness: v.stiffnessPa, rest: v.restM3 })),
  ]
  const fillRest = Float64Array.from(fills, ({ nodes, rest }) => rest ?? signedSize(spec, nodes))
  return {
    fillCount: fills.length,
    fillEnds: offsets(
      spec,
      fills.flatMap(({ nodes }) => [...nodes]),
    ),
    fillRest,
    fillStiffness: Float64Array.from(fills, ({ stiffness }, i) => stiffness / fillRest[i]!),
  }
}

export function layOutPairs(spec: LatticeSpec) {
  const { keepApart = [] } = spec
  return {
    apartCount: keepApart.length,
    apartEnds: endsOf(spec, keepApart),
    apartStiffnessNpm: Float64Array.from(keepApart, (pair) => pair.stiffnessNpm),
    apartStiffnessLeastN: Float64Array.from(keepApart, (pair) => pair.stiffnessNpm * pair.leastM),
  }
}

/** Coefficients of one node: two numbers in 2-D, three in 3-D. */
export function frictionOf(dimensions: 2 | 3, friction: FrictionSpec | undefined): readonly number[] {
  const { forward, backward, sideways } = friction ?? { forward: 0, backward: 0 }
  return dimensions === 2 ? [forward, backward] : [forward, backward, sideways ?? Math.max(forward, backward)]
}

export function layOutFriction(spec: LatticeSpec): Float64Array {
  const dimensions = dimensionsOf(spec)
  return Float64Array.from(spec.nodes.flatMap(({ friction }) => frictionOf(dimensions, friction)))
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
    const from = dimensions === 2 ? 0 : Math.min(rows - 1, Math.max(0, row - 1))
    for (let column = 0; column < groundColumns; column++) {
      const height = given[from * columns + Math.min(columns - 1, Math.max(0, column - 1))]!
      heightsM[row * groundColumns + column] = height
      if (height > highest) highest = height
    }
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

/** Groups that nobody gave (guided struts without one) stand still. */
export function layOutDrive(spec: LatticeSpec, groupCount: number, h: number) {
  const groups: readonly DriveGroupSpec[] = spec.groups?.length
    ? spec.groups
    : new Array<DriveGroupSpec>(groupCount).fill({ frequencyHz: 0 })
  const sweepSteps = Int32Array.from(groups, ({ sweep }) =>
    sweep ? Math.max(1, Math.round(sweep.seconds / h)) : 0,
  )
  const angularRadps = Float64Array.from(groups, (g) => turn * g.frequencyHz)
  const sweepRadps2 = Float64Array.from(groups, ({ sweep }, i) =>
    sweep ? (turn * sweep.toHz - angularRadps[i]!) / (sweepSteps[i]! * h) : 0,
  )
  const parts = { angularRadps, sweepRadps2, sweepSteps, stepSeconds: h }
  return {
    ...parts,
    rotation: Float64Array.from(groups.flatMap((_, g) => sineAndCosine(turnAt(parts, g, 0)))),
    rotationTurn: Float64Array.from(groups.flatMap((_, g) => sineAndCosine(sweepRadps2[g]! * h * h))),
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
    prescribedGroup: Int32Array.from(prescribed, (path) => 2 * path.group),
    prescribedStartM: Float64Array.from(prescribed.flatMap((path) => spec.nodes[path.node]!.positionM)),
    prescribedAmplitudeM: Float64Array.from(prescribed.flatMap((path) => path.amplitudeM)),
    prescribedCos: Float64Array.from(turned, ([, cosine]) => cosine),
    prescribedSin: Float64Array.from(turned, ([sine]) => sine),
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
