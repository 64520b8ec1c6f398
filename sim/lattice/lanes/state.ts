// State in and out of the kernel's memory: what changes from step to step, what the caller may change between calls,
// and what sample() keeps.

import type { Lattice } from '../layout.js'
import { newTally, type Tally } from '../tally.js'
import * as header from './header.js'
import { numberPlace, type Pen, putWide, putWideRow, putWord } from './pen.js'

/** Everything that changes from step to step, from the lattices into the memory. */
export function writeState(pen: Pen, origins: Float64Array): void {
  const { places, sizes, variant, lanes } = pen
  const [lattice] = lanes as readonly [Lattice]
  const { wide } = variant
  for (let lane = 0; lane < lanes.length; lane++) writeNodes(pen, lane, origins)
  writeStarts(pen, origins)
  for (let g = 0; g < lattice.groupCount; g++) {
    const at = places.groups.first + g * sizes.group
    putWideRow(pen, at, 'rotors', 2 * g, 2)
    putWideRow(pen, at + 2 * wide, 'driven', 2 * g, 2)
    putWideRow(pen, at + 4 * wide, 'rotation', 2 * g, 2)
  }
  for (let j = 0; j < lattice.guidedCount; j++) {
    putWide(pen, places.guided.first + j * sizes.guided + sizes.guidedStrain + 5 * wide, 'guidedStrain', j)
  }
  for (let n = 0; n < lattice.sensorCount; n++) {
    putWide(pen, places.sensors.first + n * sizes.sensor + 16 + 2 * wide, 'sensed', n)
  }
  if (lattice.sensorCount > 0) putWideRow(pen, places.touching.first, 'touching', 0, lattice.nodeCount)
  putWord(pen, header.since, lattice.step - lattice.driveStartStep)
}

function writeNodes({ engine, variant, places, lanes }: Pen, lane: number, origins: Float64Array): void {
  const { nodes, stride, dimensions } = lanes[lane]!
  const { numbers } = engine
  const width = lanes.length
  const first = places.nodes.first / variant.numberBytes + lane
  for (let i = 0; i < nodes.length; i++) numbers[first + i * width] = nodes[i]!
  if (variant.numberBytes === 8) return
  for (let i = 0; i < nodes.length; i += stride) {
    for (let axis = 0; axis < dimensions; axis++) {
      numbers[first + (i + axis) * width] = nodes[i + axis]! - origins[3 * lane + axis]!
    }
  }
}

/** Where prescribed nodes swing about, counted from the origins. */
export function writeStarts({ engine, variant, places, sizes, lanes }: Pen, origins: Float64Array): void {
  for (const [lane, { prescribedCount, prescribedStartM, dimensions }] of lanes.entries()) {
    for (let n = 0; n < prescribedCount; n++) {
      const first = (places.prescribed.first + n * sizes.prescribed + 16) / variant.numberBytes + lane
      for (let axis = 0; axis < dimensions; axis++) {
        const start = prescribedStartM[dimensions * n + axis]!
        // x - 0 is x to the bit: in double precision nothing changes.
        engine.numbers[first + axis * lanes.length] = start - origins[3 * lane + axis]!
      }
    }
  }
}

/** What the caller may have changed in the lattices since the last call: drag and the strains wanted of guided struts. */
export function writeWishes(pen: Pen): void {
  const { engine, variant, places, sizes, lanes } = pen
  const drag = numberPlace(variant, header.dragAt) / variant.numberBytes
  for (let lane = 0; lane < lanes.length; lane++) engine.numbers[drag + lane] = lanes[lane]!.dragNspm
  for (let j = 0; j < lanes[0]!.guidedCount; j++) {
    putWide(
      pen,
      places.guided.first + j * sizes.guided + sizes.guidedStrain + 4 * variant.wide,
      'hostStrain',
      j,
    )
  }
}

/** The state of one lane back into its lattice. */
export function readState(pen: Pen, lane: number, origins: Float64Array, step: number): void {
  const { places, sizes, variant, lanes } = pen
  const lattice = lanes[lane]!
  const { wide } = variant
  readNodes(pen, lane, origins)
  for (let g = 0; g < lattice.groupCount; g++) {
    const at = places.groups.first + g * sizes.group
    for (let i = 0; i < 2; i++) {
      lattice.rotors[2 * g + i] = numberAt(pen, at + i * wide, lane)
      lattice.driven[2 * g + i] = numberAt(pen, at + (2 + i) * wide, lane)
      // Without a sweep it is shared by lattices and stays as it is.
      if (lattice.sweepSteps[g]! > 0) lattice.rotation[2 * g + i] = numberAt(pen, at + (4 + i) * wide, lane)
    }
  }
  for (let j = 0; j < lattice.guidedCount; j++) {
    const at = places.guided.first + j * sizes.guided + sizes.guidedStrain + 5 * wide
    lattice.guidedStrain[j] = numberAt(pen, at, lane)
  }
  for (let n = 0; n < lattice.sensorCount; n++) {
    lattice.sensed[n] = numberAt(pen, places.sensors.first + n * sizes.sensor + 16 + 2 * wide, lane)
  }
  for (let i = 0; lattice.sensorCount > 0 && i < lattice.nodeCount; i++) {
    lattice.touching[i] = numberAt(pen, places.touching.first + i * wide, lane)
  }
  lattice.step = step
}

export function numberAt({ engine, variant }: Pen, at: number, lane: number): number {
  return engine.numbers[at / variant.numberBytes + lane]!
}

function readNodes({ engine, variant, places, lanes }: Pen, lane: number, origins: Float64Array): void {
  const { nodes, stride, dimensions } = lanes[lane]!
  const { numbers } = engine
  const width = lanes.length
  const first = places.nodes.first / variant.numberBytes + lane
  for (let i = 0; i < nodes.length; i++) nodes[i] = numbers[first + i * width]!
  if (variant.numberBytes === 8) return
  for (let i = 0; i < nodes.length; i += stride) {
    for (let axis = 0; axis < dimensions; axis++) nodes[i + axis]! += origins[3 * lane + axis]!
  }
}

/** Component `axis` of the place of a node, in the world. */
export function placeM(pen: Pen, lane: number, node: number, axis: number, origins: Float64Array): number {
  const local = numberAt(pen, pen.places.nodes.first + node * pen.sizes.node + axis * pen.variant.wide, lane)
  return pen.variant.numberBytes === 8 ? local : local + origins[3 * lane + axis]!
}

/** Empty samples for all lanes. */
export function clearSamples({ engine, variant, places, lanes }: Pen): void {
  const { numbers } = engine
  const { numberBytes } = variant
  const [{ nodeCount }] = lanes as readonly [Lattice]
  const width = lanes.length
  const strut = places.strutSamples.first / numberBytes
  const struts = (places.strutSamples.end - places.strutSamples.first) / (3 * variant.wide)
  const row = (first: number, value: number) => numbers.fill(value, first, first + width)
  for (let i = 0; i < struts; i++) {
    row(strut + 3 * i * width, 0)
    row(strut + (3 * i + 1) * width, Number.POSITIVE_INFINITY)
    row(strut + (3 * i + 2) * width, 0)
  }
  numbers.fill(0, places.drivenSamples.first / numberBytes, places.drivenSamples.end / numberBytes)
  const node = places.nodeSamples.first / numberBytes
  for (let i = 0; i < nodeCount; i++) {
    row(node + 3 * i * width, 0)
    row(node + (3 * i + 1) * width, Number.POSITIVE_INFINITY)
    row(node + (3 * i + 2) * width, Number.NEGATIVE_INFINITY)
  }
}

/** What the kernel has kept of one lane. */
export function readTally(pen: Pen, lane: number, samples: number, origins: Float64Array): Tally {
  const { places, variant } = pen
  const { wide } = variant
  const tally = newTally(pen.lanes[lane]!)
  tally.samples = samples
  const read = (values: Float64Array, first: number, each: number, at: number) => {
    for (let i = 0; i < values.length; i++) values[i] = numberAt(pen, first + i * each + at, lane)
  }
  read(tally.peakTensionN, places.strutSamples.first, 3 * wide, 0)
  read(tally.shortestM, places.strutSamples.first, 3 * wide, wide)
  read(tally.longestM, places.strutSamples.first, 3 * wide, 2 * wide)
  read(tally.workJ, places.drivenSamples.first, 2 * wide, 0)
  read(tally.loadedSamples, places.drivenSamples.first, 2 * wide, wide)
  read(tally.contacts, places.nodeSamples.first, 3 * wide, 0)
  read(tally.lowestM, places.nodeSamples.first, 3 * wide, wide)
  read(tally.highestM, places.nodeSamples.first, 3 * wide, 2 * wide)
  const y = origins[3 * lane + 1]!
  if (y !== 0)
    for (const values of [tally.lowestM, tally.highestM])
      for (let i = 0; i < values.length; i++) values[i]! += y
  return tally
}

/** The first strut of a lane whose sampled lengths left their bounds, or -1. */
export function sampledBeyond(
  { engine, variant, places, sizes, lanes }: Pen,
  lane: number,
  leastM: Float64Array,
  mostM: Float64Array,
): number {
  const { numbers } = engine
  const step = sizes.strutSample / variant.numberBytes
  let at = places.strutSamples.first / variant.numberBytes + lanes.length + lane
  for (let i = 0; i < leastM.length; i++) {
    if (numbers[at]! < leastM[i]! || numbers[at + lanes.length]! > mostM[i]!) return i
    at += step
  }
  return -1
}

/** After the origin of a lane has moved by `by` along y, in single precision: kept heights of nodes follow. */
export function shiftSamples({ engine, variant, places, lanes }: Pen, lane: number, by: number): void {
  const width = lanes.length
  const first = places.nodeSamples.first / variant.numberBytes + lane
  for (let i = 0; i < lanes[lane]!.nodeCount; i++) {
    engine.numbers[first + (3 * i + 1) * width]! -= by
    engine.numbers[first + (3 * i + 2) * width]! -= by
  }
}
