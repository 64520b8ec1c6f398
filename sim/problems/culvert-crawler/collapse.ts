// When a crawler counts as broken: a bay turned inside out, or a strut squeezed or torn beyond what rubber does. Looked at
// in every lane again and again, so in plain loops over flat arrays, where the numbers lie. Struts are judged by the
// samples, so that nothing is missed between two looks.

import type { Fault } from '../../lattice/advance.js'
import type { NodePlaces } from '../../lattice/places.js'
import type { Machine } from './machine.js'
import { numbers } from './numbers.js'

/** What is looked at, made once for a machine. */
export interface Watch {
  readonly machine: Machine
  /** Node numbers of every bay, one after the other. */
  readonly bayNodes: Int32Array
  /** Least size of every bay, m^2 or m^3. */
  readonly bayLeast: Float64Array
  /** Least and most length of every strut, m. */
  readonly leastM: Float64Array
  readonly mostM: Float64Array
}

export function watchOf(machine: Machine): Watch {
  const { dimensions, positionsM, bays, members } = machine
  const built = new Float64Array(dimensions * positionsM.length)
  for (let i = 0; i < positionsM.length; i++) built.set(positionsM[i]!, dimensions * i)
  const places = { numbers: built, first: 0, nodeStep: dimensions, axisStep: 1 }
  const corners = 2 * dimensions === 4 ? 4 : 6
  const bayNodes = new Int32Array(corners * bays.length)
  for (let i = 0; i < bays.length; i++) bayNodes.set(bays[i]!, corners * i)
  const bayLeast = new Float64Array(bays.length)
  for (let i = 0; i < bays.length; i++) {
    bayLeast[i] = numbers.bayLeast * baySize(places, dimensions, bayNodes, i)
  }
  const leastM = new Float64Array(members.length)
  const mostM = new Float64Array(members.length)
  for (let i = 0; i < members.length; i++) {
    leastM[i] = numbers.strutRatioLeast * members[i]!.lengthM
    mostM[i] = numbers.strutRatioMost * members[i]!.lengthM
  }
  return { machine, bayNodes, bayLeast, leastM, mostM }
}

/** Signed area (four nodes) or volume (six nodes) of bay i. */
function baySize(places: NodePlaces, dimensions: 2 | 3, bays: Int32Array, i: number): number {
  return dimensions === 2 ? bayArea(places, bays, 4 * i) : bayVolume(places, bays, 6 * i)
}

/** Half the cross product of the diagonals; nodes lower, upper, next lower, next upper. */
function bayArea({ numbers, first, nodeStep, axisStep }: NodePlaces, bays: Int32Array, at: number): number {
  const lower = first + bays[at]! * nodeStep
  const upper = first + bays[at + 1]! * nodeStep
  const nextLower = first + bays[at + 2]! * nodeStep
  const nextUpper = first + bays[at + 3]! * nodeStep
  const risingX = numbers[nextUpper]! - numbers[lower]!
  const risingY = numbers[nextUpper + axisStep]! - numbers[lower + axisStep]!
  const fallingX = numbers[upper]! - numbers[nextLower]!
  const fallingY = numbers[upper + axisStep]! - numbers[nextLower + axisStep]!
  return (risingX * fallingY - risingY * fallingX) / 2
}

/**
 * A prism between two triangles, as three tetrahedra: nodes left, right, upper of a column, then of the next. Positive when
 * the next column lies ahead (+x) of a column whose right is at +z.
 */
function bayVolume(places: NodePlaces, bays: Int32Array, at: number): number {
  return (
    tetrahedron(places, bays, at + 1, at, at + 2, at + 5) +
    tetrahedron(places, bays, at + 1, at, at + 5, at + 3) +
    tetrahedron(places, bays, at + 1, at + 3, at + 5, at + 4)
  )
}

function tetrahedron(
  { numbers, first, nodeStep, axisStep: y }: NodePlaces,
  bays: Int32Array,
  a: number,
  b: number,
  c: number,
  d: number,
): number {
  const z = 2 * y
  const o = first + bays[a]! * nodeStep
  const p = first + bays[b]! * nodeStep
  const q = first + bays[c]! * nodeStep
  const r = first + bays[d]! * nodeStep
  const px = numbers[p]! - numbers[o]!
  const py = numbers[p + y]! - numbers[o + y]!
  const pz = numbers[p + z]! - numbers[o + z]!
  const qx = numbers[q]! - numbers[o]!
  const qy = numbers[q + y]! - numbers[o + y]!
  const qz = numbers[q + z]! - numbers[o + z]!
  const rx = numbers[r]! - numbers[o]!
  const ry = numbers[r + y]! - numbers[o + y]!
  const rz = numbers[r + z]! - numbers[o + z]!
  return (px * (qy * rz - qz * ry) + py * (qz * rx - qx * rz) + pz * (qx * ry - qy * rx)) / 6
}

/** The first bay that has collapsed, or -1. */
export function collapsedBay(places: NodePlaces, { machine, bayNodes, bayLeast }: Watch): number {
  for (let i = 0; i < bayLeast.length; i++) {
    if (baySize(places, machine.dimensions, bayNodes, i) < bayLeast[i]!) return i
  }
  return -1
}

export function bayFault(bay: number, seconds: number): Fault {
  return { reason: `bay ${bay + 1} collapsed`, seconds }
}

/** Told of a strut whose sampled lengths left their bounds, with the extremes so far. */
export function strutFault(
  { machine, leastM }: Watch,
  strut: number,
  { shortestM, longestM }: { readonly shortestM: Float64Array; readonly longestM: Float64Array },
  seconds: number,
): Fault {
  const { place, column, lengthM } = machine.members[strut]!
  const presentM = shortestM[strut]! < leastM[strut]! ? shortestM[strut]! : longestM[strut]!
  const percent = Math.round((100 * presentM) / lengthM)
  return { reason: `${place} of column ${column + 1} was at ${percent} % of its length`, seconds }
}
