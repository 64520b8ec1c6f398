// How lattices lie in the kernel's memory: sizes of records and where every list begins. The kernel has the same sizes in
// ../wasm/record.ts; what the words and numbers of the head mean is in header.ts, which both read.
//
// A quantity of all lanes is `wide` bytes. A material value is one number for all lanes, or `wide` bytes where every
// lane has its own.

import type { Lattice } from '../layout.js'
import { listsAt } from './header.js'

/** Which module moves the lanes, and what follows for the memory. */
export interface Variant {
  readonly module: string
  readonly dimensions: 2 | 3
  readonly lanes: number
  readonly numberBytes: 4 | 8
  readonly own: boolean
  readonly wide: number
  readonly materialBytes: number
}

export type Precision = 'double' | 'single'

/** The smallest module that holds `count` lattices. */
export function variantFor(dimensions: 2 | 3, count: number, precision: Precision, own: boolean): Variant {
  const lanes = precision === 'single' ? 8 : count === 1 ? 1 : count === 2 ? 2 : 4
  const numberBytes = precision === 'single' ? 4 : 8
  const wide = lanes * numberBytes
  const apart = own && lanes > 1
  const name = `${dimensions === 2 ? 'plane' : 'space'}-${precision}${lanes}${apart ? '-own' : ''}`
  const materialBytes = apart ? wide : numberBytes
  return { module: name, dimensions, lanes, numberBytes, own: apart, wide, materialBytes }
}

const round16 = (bytes: number) => Math.ceil(bytes / 16) * 16

/** Offsets inside records, and their sizes; bytes. */
export function recordsOf({ dimensions, own, wide, materialBytes }: Variant) {
  const first = own ? 16 : 8
  const friction = round16(materialBytes)
  const heading = friction + 2 * dimensions * wide
  const activeStrain = round16(5 * materialBytes + 12)
  const guidedStrain = round16(32 + 5 * materialBytes)
  return {
    node: 3 * dimensions * wide,
    friction,
    heading,
    nodeRow: heading + 16,
    /** Of the material of drag struts and pairs. */
    first,
    passive: round16(3 * materialBytes + 8),
    activeStrain,
    active: activeStrain + 2 * wide,
    guidedStrain,
    guided: guidedStrain + 6 * wide,
    feedback: 16 + wide,
    sensor: 16 + 3 * wide,
    drag: round16(first + 2 * materialBytes),
    fill: round16(16 + 2 * materialBytes),
    apart: round16(first + 2 * materialBytes),
    group: 14 * wide,
    prescribed: 16 + 2 * dimensions * wide + 2 * wide,
    strutSample: 3 * wide,
    drivenSample: 2 * wide,
    nodeSample: 3 * wide,
  }
}

/** Address and number of bytes of every list. */
export interface Place {
  readonly first: number
  readonly end: number
}

/** Lists begin at multiples of 64, and neighbours not at the same place of a page of 4096 bytes. */
export function placesOf(variant: Variant, lattice: Lattice, heights: number) {
  const sizes = recordsOf(variant)
  let next = listsAt
  const place = (count: number, bytes: number): Place => {
    const first = Math.ceil(next / 64) * 64
    const end = first + count * bytes
    next = end + 64
    return { first, end }
  }
  const struts = lattice.passiveCount + lattice.activeCount + lattice.guidedCount
  const driven = lattice.activeCount + lattice.guidedCount
  const places = {
    nodes: place(lattice.nodeCount, sizes.node),
    nodeTable: place(lattice.nodeCount, sizes.nodeRow),
    passive: place(lattice.passiveCount, sizes.passive),
    active: place(lattice.activeCount, sizes.active),
    guided: place(lattice.guidedCount, sizes.guided),
    feedback: place(lattice.feedbackGain.length, sizes.feedback),
    sensors: place(lattice.sensorCount, sizes.sensor),
    touching: place(lattice.sensorCount > 0 ? lattice.nodeCount : 0, variant.wide),
    drag: place(lattice.dragCount, sizes.drag),
    fills: place(lattice.fillCount, sizes.fill),
    apart: place(lattice.apartCount, sizes.apart),
    groups: place(lattice.groupCount, sizes.group),
    prescribed: place(lattice.prescribedCount, sizes.prescribed),
    strutSamples: place(struts, sizes.strutSample),
    drivenSamples: place(driven, sizes.drivenSample),
    nodeSamples: place(lattice.nodeCount, sizes.nodeSample),
    rows: place(variant.lanes, 4),
    heights: place(heights, variant.numberBytes),
  }
  return { ...places, bytes: next }
}

export type Places = ReturnType<typeof placesOf>
export type Sizes = ReturnType<typeof recordsOf>
