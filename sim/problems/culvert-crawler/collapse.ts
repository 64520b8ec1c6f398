// When a crawler counts as broken: a bay turned inside out, or a strut squeezed or torn beyond what rubber does. Looked at
// in every lane again and again, so in plain loops over flat arrays. A strut that is beyond it between two looks is found
// at the end, in the samples.

import type { Fault } from '../../lattice/advance.js'
import type { Lattice } from '../../lattice/layout.js'
import type { Tally } from '../../lattice/tally.js'
import type { Machine } from './machine.js'
import { numbers } from './numbers.js'

/** What is looked at, made once for a machine. */
export interface Watch {
  readonly machine: Machine
  /** Node numbers of every bay, one after the other. */
  readonly bayNodes: Int32Array
  /** Size of every bay as built, m^2 or m^3. */
  readonly bayRest: Float64Array
  /** Least and most squared length of every strut, m^2. */
  readonly leastSquared: Float64Array
  readonly mostSquared: Float64Array
}

export function watchOf(machine: Machine): Watch {
  const { dimensions, positionsM, bays, members } = machine
  const places = Float64Array.from(positionsM.flat())
  const bayNodes = Int32Array.from(bays.flat())
  const bound = (ratio: number) =>
    Float64Array.from(members, ({ lengthM }) => ratio * lengthM * (ratio * lengthM))
  return {
    machine,
    bayNodes,
    bayRest: Float64Array.from(bays, (_, i) => baySize(places, dimensions, dimensions, bayNodes, i)),
    leastSquared: bound(numbers.strutRatioLeast),
    mostSquared: bound(numbers.strutRatioMost),
  }
}

/** Signed area (four nodes) or volume (six nodes) of bay i; a node's coordinates are `stride` numbers apart. */
function baySize(
  nodes: Float64Array,
  stride: number,
  dimensions: number,
  bays: Int32Array,
  i: number,
): number {
  return dimensions === 2 ? bayArea(nodes, stride, bays, 4 * i) : bayVolume(nodes, stride, bays, 6 * i)
}

/** Half the cross product of the diagonals; nodes lower, upper, next lower, next upper. */
function bayArea(nodes: Float64Array, stride: number, bays: Int32Array, at: number): number {
  const lower = bays[at]! * stride
  const upper = bays[at + 1]! * stride
  const nextLower = bays[at + 2]! * stride
  const nextUpper = bays[at + 3]! * stride
  const risingX = nodes[nextUpper]! - nodes[lower]!
  const risingY = nodes[nextUpper + 1]! - nodes[lower + 1]!
  const fallingX = nodes[upper]! - nodes[nextLower]!
  const fallingY = nodes[upper + 1]! - nodes[nextLower + 1]!
  return (risingX * fallingY - risingY * fallingX) / 2
}

/**
 * A prism between two triangles, as three tetrahedra: nodes left, right, upper of a column, then of the next. Positive when
 * the next column lies ahead (+x) of a column whose right is at +z.
 */
function bayVolume(nodes: Float64Array, stride: number, bays: Int32Array, at: number): number {
  return (
    tetrahedron(nodes, stride, bays, at + 1, at, at + 2, at + 5) +
    tetrahedron(nodes, stride, bays, at + 1, at, at + 5, at + 3) +
    tetrahedron(nodes, stride, bays, at + 1, at + 3, at + 5, at + 4)
  )
}

function tetrahedron(
  nodes: Float64Array,
  stride: number,
  bays: Int32Array,
  a: number,
  b: number,
  c: number,
  d: number,
): number {
  const o = bays[a]! * stride
  const p = bays[b]! * stride
  const q = bays[c]! * stride
  const r = bays[d]! * stride
  const px = nodes[p]! - nodes[o]!
  const py = nodes[p + 1]! - nodes[o + 1]!
  const pz = nodes[p + 2]! - nodes[o + 2]!
  const qx = nodes[q]! - nodes[o]!
  const qy = nodes[q + 1]! - nodes[o + 1]!
  const qz = nodes[q + 2]! - nodes[o + 2]!
  const rx = nodes[r]! - nodes[o]!
  const ry = nodes[r + 1]! - nodes[o + 1]!
  const rz = nodes[r + 2]! - nodes[o + 2]!
  return (px * (qy * rz - qz * ry) + py * (qz * rx - qx * rz) + pz * (qx * ry - qy * rx)) / 6
}

/** The first thing that is broken now, or nothing. */
export function collapse(
  { nodes, stride, ends, dimensions, step, stepSeconds }: Lattice,
  watch: Watch,
): Fault | undefined {
  const { machine, bayNodes, bayRest, leastSquared, mostSquared } = watch
  const seconds = step * stepSeconds
  for (let i = 0; i < bayRest.length; i++) {
    if (baySize(nodes, stride, dimensions, bayNodes, i) < numbers.bayLeast * bayRest[i]!) {
      return { reason: `bay ${i + 1} collapsed`, seconds }
    }
  }
  for (let i = 0; i < leastSquared.length; i++) {
    const a = ends[2 * i]!
    const b = ends[2 * i + 1]!
    let squared = 0
    for (let axis = 0; axis < dimensions; axis++) {
      const d = nodes[b + axis]! - nodes[a + axis]!
      squared += d * d
    }
    if (squared < leastSquared[i]! || squared > mostSquared[i]!) {
      return { reason: lengthWords(machine, i, Math.sqrt(squared), 'is'), seconds }
    }
  }
  return undefined
}

/** The first strut that was beyond its limits in any sample, told with the time of the end. */
export function overstrained(tally: Tally, { machine, leastSquared, mostSquared }: Watch): Fault | undefined {
  const { shortestM, longestM } = tally
  const seconds = numbers.settleSeconds + numbers.trialSeconds
  for (let i = 0; i < leastSquared.length; i++) {
    const [least, most] = [shortestM[i]!, longestM[i]!]
    if (least * least < leastSquared[i]!) return { reason: lengthWords(machine, i, least, 'was'), seconds }
    if (most * most > mostSquared[i]!) return { reason: lengthWords(machine, i, most, 'was'), seconds }
  }
  return undefined
}

function lengthWords({ members }: Machine, i: number, presentM: number, verb: string): string {
  const { place, column, lengthM } = members[i]!
  const percent = Math.round((100 * presentM) / lengthM)
  return `${place} of column ${column + 1} ${verb} at ${percent} % of its length`
}
