// One build of a mount under one pump, in all cases at once: the cases lie side by side in the lanes of the kernel, the
// sensor's motion is recorded, and what arrives of the pump's shaking is read off the record.

import type { Stream } from '../../../shared/streams.js'
import { buildLattice } from '../../lattice/build.js'
import {
  advanceLanes,
  lanePlaceM,
  laneTally,
  packLanes,
  releaseLanes,
  sampleLanes,
} from '../../lattice/lanes.js'
import type { DriveGroupSpec, LatticeSpec } from '../../lattice/spec.js'
import { chooseStep, stepBound } from '../../lattice/stability.js'
import type { Tally } from '../../lattice/tally.js'
import { toneAt } from '../../measure/tones.js'
import { crestM, latticeOf, type Mount } from './body.js'
import { type CaseName, cases, numbers } from './numbers.js'
import { atRest, slowestHz } from './statics.js'

/** Everything random about one simulation. */
export interface MountCondition {
  /** Factors, 1 for what is drawn on paper. */
  readonly sensor: number
  readonly batch: number
  readonly speed: number
  readonly leanRad: number
}

/** Draws are cut off here, in standard deviations. */
const scatterMost = 3

export function drawMount(stream: Stream): MountCondition {
  const scatter = (sd: number) => sd * Math.min(scatterMost, Math.max(-scatterMost, stream.normal()))
  return {
    sensor: 1 + scatter(numbers.sensorScatter),
    batch: 1 + scatter(numbers.batchScatter),
    speed: 1 + scatter(numbers.speedScatter),
    leanRad: scatter(numbers.leanRad),
  }
}

/** Turns per second over time: constant, or in a straight line from one to the other. */
export interface Speed {
  readonly fromHz: number
  readonly toHz: number
  readonly seconds: number
}

export interface Shaking {
  /** At rest, with the base's paths; its drive group is replaced. */
  readonly spec: LatticeSpec
  readonly sensorNode: number
  readonly stepSeconds: number
  readonly stepsPerSample: number
  readonly samples: number
}

/** The sensor's centre of mass, relative to where it was at rest, m, one entry a sample; and the struts' extremes. */
export interface Recording {
  readonly x: Float64Array
  readonly y: Float64Array
  readonly tally: Tally
}
export interface Broken {
  readonly reason: string
}

export const groupOf = ({ fromHz, toHz, seconds }: Speed): DriveGroupSpec =>
  seconds > 0 ? { frequencyHz: fromHz, sweep: { toHz, seconds } } : { frequencyHz: fromHz }

/** Shakes up to four copies side by side, one a speed. The first sample is taken at the start. */
export function shake(shaking: Shaking, speeds: readonly Speed[]): (Recording | Broken)[] {
  const { spec, sensorNode, stepSeconds, stepsPerSample, samples } = shaking
  const lattices = speeds.map((speed) =>
    buildLattice({
      ...spec,
      groups: [groupOf(speed)],
      drive: { startSeconds: 0, rampSeconds: numbers.growSeconds },
      stepSeconds,
    }),
  )
  const lanes = packLanes(lattices)
  const [startX, startY] = spec.nodes[sensorNode]!.positionM as [number, number]
  const paths = speeds.map(() => ({ x: new Float64Array(samples), y: new Float64Array(samples) }))
  for (let n = 0; n < samples; n++) {
    if (n > 0) advanceLanes(lanes, stepsPerSample)
    sampleLanes(lanes, stepsPerSample * stepSeconds)
    for (const [lane, { x, y }] of paths.entries()) {
      x[n] = lanePlaceM(lanes, lane, sensorNode, 0) - startX
      y[n] = lanePlaceM(lanes, lane, sensorNode, 1) - startY
    }
  }
  const recordings = paths.map((path, lane) => {
    const fault = lanes.faults[lane]
    if (fault) return { reason: `${fault.reason} at ${fault.seconds.toFixed(2)} s` }
    return { ...path, tally: laneTally(lanes, lane) }
  })
  releaseLanes(lanes)
  return recordings
}

/** The sensor's farthest way from where it was at rest, m. */
export function farthestM({ x, y }: Pick<Recording, 'x' | 'y'>): number {
  let squared = 0
  for (let n = 0; n < x.length; n++) squared = Math.max(squared, x[n]! * x[n]! + y[n]! * y[n]!)
  return Math.sqrt(squared)
}

/**
 * What arrives of a shaking of amplitude `shakeM`. At constant speed: amplitude of the sensor at that frequency, both
 * axes together, over the last `measureSeconds`. Through a change of speed: the sensor's farthest way from rest.
 */
export function arriving(
  { x, y }: Pick<Recording, 'x' | 'y'>,
  speed: Speed,
  samplesPerSecond: number,
  shakeM: number,
): number {
  if (speed.seconds > 0) return farthestM({ x, y }) / shakeM
  const from = x.length - Math.round(numbers.measureSeconds * samplesPerSecond)
  const amplitude = (path: Float64Array) =>
    toneAt(path.subarray(Math.max(0, from)), 1 / samplesPerSecond, speed.fromHz).amplitude
  const [across, along] = [amplitude(x), amplitude(y)]
  return Math.sqrt(across * across + along * along) / shakeM
}

export interface Loaded {
  readonly shaking: Shaking
  /** How far the sensor has come down, m. */
  readonly sagM: number
  readonly slowestHz: number
}

/** The longest step of a simulation: 1/64 of a sample of the fastest shaking stays far from it, s. */
const stepMostSeconds = 1 / 6400

const samples = Math.round(numbers.seconds * numbers.samplesPerSecond) + 1

function stepsPerSampleOf(spec: LatticeSpec): number {
  const sampleSeconds = 1 / numbers.samplesPerSecond
  return Math.round(sampleSeconds / chooseStep(stepBound(spec), sampleSeconds, stepMostSeconds, 1))
}

/** Strut steps of one simulation, a node counted as two struts; from the mount as drawn. */
export function strutSteps(mount: Mount): number {
  const { sensorKg } = numbers
  const spec = latticeOf(mount, { batch: 1, sensorKg, shakeM: crestM(0) })
  return (spec.struts.length + 2 * spec.nodes.length) * stepsPerSampleOf(spec) * samples
}

/**
 * Why a mount is not strong enough, whatever the condition: the softest rubber and the heaviest sensor that can be drawn,
 * at `weightsCarried` times its weight. Not left to the draw: a search would find mounts that pass by luck.
 */
export function weakness(mount: Mount): Broken | undefined {
  const { sensorKg, sensorScatter, batchScatter, weightsCarried } = numbers
  const spec = latticeOf(mount, {
    batch: 1 - scatterMost * batchScatter,
    sensorKg: sensorKg * (1 + scatterMost * sensorScatter),
    shakeM: [0, 0],
  })
  if (atRest(spec, weightsCarried)) return undefined
  return {
    reason: `gives way under ${weightsCarried} times the sensor's weight, softest rubber and heaviest sensor`,
  }
}

/** The mount under its sensor, at rest; or why it does not carry it. `divide` makes the step finer. */
export function load(mount: Mount, condition: MountCondition, divide: number): Loaded | Broken {
  const spec = atRest(
    latticeOf(mount, {
      batch: condition.batch,
      sensorKg: numbers.sensorKg * condition.sensor,
      shakeM: crestM(condition.leanRad),
    }),
  )
  if (!spec) return { reason: 'gives way under the sensor' }
  const stepsPerSample = divide * stepsPerSampleOf(spec)
  const shaking: Shaking = {
    spec,
    sensorNode: mount.sensorNode,
    stepSeconds: 1 / numbers.samplesPerSecond / stepsPerSample,
    stepsPerSample,
    samples,
  }
  const sagM = mount.positionsM[mount.sensorNode]![1] - spec.nodes[mount.sensorNode]!.positionM[1]!
  return { shaking, sagM, slowestHz: slowestHz(spec) }
}

export const speedIn = (name: CaseName, { speed }: MountCondition): Speed => {
  const { fromHz, toHz, seconds } = cases[name]
  return { fromHz: fromHz * speed, toHz: toHz * speed, seconds }
}

/** The strut that comes nearest to what it bears: its share of that, 1 for the limit. */
export function worstTravel(
  { members }: Mount,
  { shortestM, longestM }: Tally,
): { share: number; name: string } {
  let worst = { share: 0, name: '' }
  for (const [i, { name, lengthM, travelMostM }] of members.entries()) {
    const travelM = Math.max(longestM[i]! - lengthM, lengthM - shortestM[i]!)
    if (travelM / travelMostM > worst.share) worst = { share: travelM / travelMostM, name }
  }
  return worst
}
