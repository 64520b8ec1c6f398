// Replicates side by side: lattices of one body in the lanes of the WebAssembly kernel, 4 at a time in double precision
// (1 and 2 have modules of their own; 3 take the module of 4), 8 in single.
//
//   const lanes = packLanes(lattices)            copies the lattices into the kernel
//   advanceLanes(lanes, steps)                   the same meaning as advance() on every lane; in double precision also
//                                                the same bits, whatever the other lanes are
//   unpackLane(lanes, i)                         copies the state of lane i back into lattices[i] for observe.* and all else
//   sampleLanes(lanes, seconds), laneTally(...)  what takeSample() keeps (tally.ts), without leaving the kernel;
//   advanceLanes(lanes, steps, everySteps)       samples on the way
//
// Between calls the lattices' own `dragNspm` and `hostStrain` may be changed, as with advance(). A lane that has a fault
// stands still: its lattice holds the state at the fault, advanceLanes() keeps telling the fault, the others go on.
//
// Memory is used again from one evaluation to the next, and nothing has to be released (lanes/engine.ts); releaseLanes()
// only spares a copy. Calls of any size are fine; the kernel itself is called for at most 64 steps at a time.

import { check } from '../../shared/check.js'
import { type Fault, look } from './advance.js'
import { demandOneBody, hasOwnMaterial } from './lanes/body.js'
import { prepareDrive, sweepEnds } from './lanes/drive.js'
import { settle, type Tenant } from './lanes/engine.js'
import { firstOrigins, follow, heightsCount, writeGround } from './lanes/frame.js'
import { sampleSecondsAt } from './lanes/header.js'
import { writeBody } from './lanes/image.js'
import { type Precision, placesOf, recordsOf, variantFor } from './lanes/layout.js'
import { numberPlace, type Pen, putEqual } from './lanes/pen.js'
import {
  clearSamples,
  placeM,
  readState,
  readTally,
  sampledBeyond,
  writeState,
  writeWishes,
} from './lanes/state.js'
import { type Lattice, lookEverySteps } from './layout.js'
import type { NodePlaces } from './places.js'
import type { Tally } from './tally.js'

export type { Precision } from './lanes/layout.js'

/** Most lattices side by side. */
export const lanesMost = { double: 4, single: 8 } as const

/** Lattices in the kernel. Made by packLanes(); what stands below `pen` is the kernel's own. */
export interface Lanes {
  readonly lattices: readonly Lattice[]
  readonly precision: Precision
  /** Steps done. */
  step: number
  /** Of every lattice; undefined while it moves. */
  readonly faults: (Fault | undefined)[]
  /** Samples taken. */
  samples: number

  readonly tenant: Tenant
  readonly pen: Pen
  /** x, y, z of every lane's origin, m; 0 in double precision. */
  readonly origins: Float64Array
  readonly sweepEnds: readonly number[]
  /** The step up to which fresh sines lie ready. */
  preparedStep: number
  /** A bit for every lane that moves. */
  moving: number
}

/**
 * Puts lattices of one body side by side: 1 to 4, or 1 to 8 with `precision: 'single'`. Throws a Refusal
 * ('impossible-value') naming the lattice and the field where they are not of one body, at one time and step.
 * Values of struts, nodes and fills may differ between them; where none does the kernel keeps them once.
 */
export function packLanes(
  lattices: readonly Lattice[],
  { precision = 'double' }: { readonly precision?: Precision } = {},
): Lanes {
  demandOneBody(lattices, lanesMost[precision])
  const [first] = lattices as readonly [Lattice]
  const variant = variantFor(first.dimensions, lattices.length, precision, hasOwnMaterial(lattices))
  const all = Array.from({ length: variant.lanes }, (_, lane) => lattices[lane] ?? first)
  const places = placesOf(variant, first, heightsCount(all, precision === 'single'))
  const tenant: Tenant = { module: variant.module, bytes: places.bytes, saved: undefined, released: false }
  const origins = firstOrigins(all, precision === 'single')
  let pen: Pen | undefined
  settle(tenant, (engine) => {
    pen = { engine, variant, sizes: recordsOf(variant), places, lanes: all }
    writeBody(pen)
    writeGround(pen, origins)
    writeState(pen, origins)
    clearSamples(pen)
  })
  return {
    lattices,
    precision,
    step: first.step,
    faults: lattices.map(() => undefined),
    samples: 0,
    tenant,
    pen: pen!,
    origins,
    sweepEnds: sweepEnds(all),
    preparedStep: first.groupCount === 0 ? Number.POSITIVE_INFINITY : first.step,
    moving: (1 << lattices.length) - 1,
  }
}

/**
 * `steps` steps of every lane that has no fault; the fault of every lattice, or undefined. Looks where advance() looks:
 * every 64 steps and at the end of the call. With `sampleEverySteps` a sample is taken after every so many steps of
 * the call, which costs less than a call for each of them.
 */
export function advanceLanes(
  lanes: Lanes,
  steps: number,
  sampleEverySteps = 0,
): readonly (Fault | undefined)[] {
  const { pen, tenant } = lanes
  settle(tenant)
  writeWishes(pen)
  if (sampleEverySteps > 0) putSampleSeconds(pen, sampleEverySteps * pen.lanes[0]!.stepSeconds)
  let left = steps
  let untilLook = lookEverySteps
  let untilSample = sampleEverySteps > 0 ? sampleEverySteps : steps + 1
  while (left > 0 && lanes.moving !== 0) {
    const some = Math.min(left, untilLook, untilSample)
    run(lanes, some)
    left -= some
    untilLook -= some
    untilSample -= some
    if (untilSample === 0) {
      pen.engine.sample()
      lanes.samples++
      untilSample = sampleEverySteps
    }
    if (untilLook > 0 && left > 0) continue
    lookAtLanes(lanes)
    untilLook = lookEverySteps
  }
  return lanes.faults
}

function lookAtLanes(lanes: Lanes): void {
  const { pen } = lanes
  const bits = pen.engine.look() & lanes.moving
  if (bits !== 0) findFaults(lanes, bits)
  if (lanes.precision === 'single') follow(pen, lanes.origins)
}

function run(lanes: Lanes, steps: number): void {
  const { pen } = lanes
  let left = steps
  while (left > 0) {
    if (lanes.step >= lanes.preparedStep) {
      lanes.preparedStep = lanes.step + prepareDrive(pen, lanes.step, lanes.sweepEnds)
    }
    const some = Math.min(left, lanes.preparedStep - lanes.step)
    pen.engine.run(some)
    lanes.step += some
    left -= some
  }
}

/** What the kernel suspects, the reference's own look decides. */
function findFaults(lanes: Lanes, bits: number): void {
  for (const [lane, lattice] of lanes.lattices.entries()) {
    if ((bits & (1 << lane)) === 0) continue
    readState(lanes.pen, lane, lanes.origins, lanes.step)
    const fault = look(lattice)
    if (!fault) continue
    lanes.faults[lane] = fault
    lanes.moving &= ~(1 << lane)
  }
}

/** Copies the state of lane i back into its lattice. After a fault it holds the state at the fault already. */
export function unpackLane(lanes: Lanes, i: number): Lattice {
  settle(lanes.tenant)
  if ((lanes.moving & (1 << i)) !== 0) readState(lanes.pen, i, lanes.origins, lanes.step)
  return lanes.lattices[i]!
}

/** Component `axis` of a node's place in lane i, m, without copying the lane. */
export function lanePlaceM(lanes: Lanes, i: number, node: number, axis: 0 | 1 | 2): number {
  const lattice = lanes.lattices[i]!
  if ((lanes.moving & (1 << i)) === 0) return lattice.nodes[node * lattice.stride + axis]!
  settle(lanes.tenant)
  return placeM(lanes.pen, i, node, axis, lanes.origins)
}

/**
 * Where the nodes of lane i are, without a copy; good until the next call that takes lanes. Double precision only, where
 * places are counted from the world's origin. Not for a lane with a fault.
 */
export function lanePlaces(lanes: Lanes, i: number): NodePlaces {
  check(lanes.precision === 'double', 'places in the kernel are those of the world')
  const { engine, places, sizes, variant } = lanes.pen
  settle(lanes.tenant)
  const { numberBytes, wide } = variant
  const first = places.nodes.first / numberBytes + i
  return {
    numbers: engine.numbers,
    first,
    nodeStep: sizes.node / numberBytes,
    axisStep: wide / numberBytes,
  }
}

/** As strutBeyond() of the samples of lane i. */
export function laneStrutBeyond(lanes: Lanes, i: number, leastM: Float64Array, mostM: Float64Array): number {
  settle(lanes.tenant)
  return sampledBeyond(lanes.pen, i, leastM, mostM)
}

/** Takes one sample of every lane inside the kernel, as takeSample() does; `seconds` is the time between samples. */
export function sampleLanes(lanes: Lanes, seconds: number): void {
  settle(lanes.tenant)
  putSampleSeconds(lanes.pen, seconds)
  lanes.pen.engine.sample()
  lanes.samples++
}

function putSampleSeconds(pen: Pen, seconds: number): void {
  putEqual(pen, numberPlace(pen.variant, sampleSecondsAt), seconds)
}

/** Says that these lanes are not used any more, which spares saving them when others need the kernel's memory. */
export function releaseLanes(lanes: Lanes): void {
  lanes.tenant.released = true
}

/** What has been sampled of lane i so far. Meaningless after a fault of the lane. */
export function laneTally(lanes: Lanes, i: number): Tally {
  settle(lanes.tenant)
  return readTally(lanes.pen, i, lanes.samples, lanes.origins)
}
