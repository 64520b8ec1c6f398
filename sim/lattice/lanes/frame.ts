// Places in single precision. Near the origin single precision is good to a ten-thousandth of a millimetre, ten metres
// away only to a micrometre, which contact feels. So every lane counts places from an origin of its own, which is moved
// after the body whenever that has gone some decimetres; the ground, prescribed nodes and what is read out follow. A
// move is a multiple of a power of two and costs a place at most one rounding. In double precision the origin stays 0
// and nothing of this happens.

import type { Lattice } from '../layout.js'
import * as header from './header.js'
import { numberPlace, type Pen, putWord } from './pen.js'
import { shiftSamples, writeStarts } from './state.js'

/** Origins are multiples of this, m. */
const gridM = 0.25
/** The origin follows when the first node is farther from it than this, m. */
const farM = 0.5

/** x, y, z of the origin of every lane: 0, or in single precision near the first node. */
export function firstOrigins(lanes: readonly Lattice[], single: boolean): Float64Array {
  const origins = new Float64Array(3 * lanes.length)
  for (const [lane, { nodes, dimensions }] of lanes.entries()) {
    for (let axis = 0; single && axis < dimensions; axis++) origins[3 * lane + axis] = nearest(nodes[axis]!)
  }
  return origins
}

/** The nearest multiple of the grid; 0 for what is no number. */
function nearest(place: number): number {
  return Number.isFinite(place) ? Math.round(place / gridM) * gridM : 0
}

/** Single precision: moves the origins after bodies that have gone too far from them. */
export function follow(pen: Pen, origins: Float64Array): void {
  const { engine, variant, places, lanes } = pen
  const first = places.nodes.first / variant.numberBytes
  let moved = false
  for (const [lane, { dimensions }] of lanes.entries()) {
    for (let axis = 0; axis < dimensions; axis++) {
      const place = engine.numbers[first + axis * lanes.length + lane]!
      if (!(Math.abs(place) > farM)) continue
      const by = nearest(place)
      if (by === 0) continue
      moveOrigin(pen, lane, axis, by)
      origins[3 * lane + axis]! += by
      moved = true
    }
  }
  if (!moved) return
  writeStarts(pen, origins)
  writeGround(pen, origins)
}

function moveOrigin(pen: Pen, lane: number, axis: number, by: number): void {
  const { engine, variant, places, lanes } = pen
  const { nodes, stride } = lanes[lane]!
  const first = places.nodes.first / variant.numberBytes + lane
  for (let i = axis; i < nodes.length; i += stride) engine.numbers[first + i * lanes.length]! -= by
  if (axis === 1) shiftSamples(pen, lane, by)
}

/** Number of heights to make room for: in double precision lanes with one ground share it. */
export function heightsCount(lanes: readonly Lattice[], single: boolean): number {
  const grounds = lanes.map(({ heightsM }) => heightsM)
  const kept = single ? grounds : [...new Set(grounds)]
  return kept.reduce((sum, { length }) => sum + length, 0)
}

/** The ground of every lane, counted from its origin (x, y, z of each lane). */
export function writeGround(pen: Pen, origins: Float64Array): void {
  const { engine, lanes, places, variant } = pen
  const single = variant.numberBytes === 4
  const at = new Map<Float64Array, number>()
  let next = places.heights.first
  for (const [lane, lattice] of lanes.entries()) {
    const { heightsM } = lattice
    const known = single ? undefined : at.get(heightsM)
    const first = known ?? next
    if (known === undefined) {
      at.set(heightsM, first)
      next += heightsM.length * variant.numberBytes
      writeHeights(engine.numbers, first / variant.numberBytes, heightsM, origins[3 * lane + 1]!)
    }
    writeCells(pen, lane, lattice, origins, first)
  }
}

function writeHeights(
  numbers: Float64Array | Float32Array,
  first: number,
  heightsM: Float64Array,
  y: number,
): void {
  if (y === 0) numbers.set(heightsM, first)
  else for (let i = 0; i < heightsM.length; i++) numbers[first + i] = heightsM[i]! - y
}

/**
 * Cells are counted from the one under the origin, so that their numbers stay small: the cell `column` of the whole
 * ground is column - columnAtOrigin here, and the addresses of the heights begin there.
 */
function writeCells(pen: Pen, lane: number, lattice: Lattice, origins: Float64Array, first: number): void {
  const { engine, variant, places } = pen
  const { terrain, groundColumns, groundRows, depthLimitM } = lattice
  const put = (n: number, value: number) => {
    engine.numbers[numberPlace(variant, n) / variant.numberBytes + lane] = value
  }
  const along = axisOf(terrain[0]!, terrain[1]!, groundColumns, origins[3 * lane]!)
  put(header.firstXAt, along.first)
  put(header.perSpacingXAt, terrain[1]!)
  put(header.lowColumnAt, -along.shift)
  put(header.lastColumnAt, groundColumns - 2 - along.shift)
  put(header.topAt, terrain[2]! - origins[3 * lane + 1]!)
  put(header.depthLimitAt, depthLimitM)
  let shift = along.shift
  if (lattice.dimensions === 3) {
    const across = axisOf(terrain[3]!, terrain[4]!, groundRows, origins[3 * lane + 2]!)
    put(header.firstZAt, across.first)
    put(header.perSpacingZAt, terrain[4]!)
    put(header.lowRowAt, -across.shift)
    put(header.lastRowAt, groundRows - 2 - across.shift)
    put(header.columnsAt, groundColumns)
    shift += across.shift * groundColumns
  }
  putWord(pen, places.rows.first + 4 * lane, first + shift * variant.numberBytes)
}

/** The cell under the origin and its place counted from the origin. */
function axisOf(firstM: number, perSpacing: number, count: number, originM: number) {
  if (originM === 0 || perSpacing === 0) return { first: firstM - originM, shift: 0 }
  const cell = Math.floor((originM - firstM) * perSpacing)
  const shift = Math.min(Math.max(cell, 0), count - 2)
  return { first: firstM + shift / perSpacing - originM, shift }
}
