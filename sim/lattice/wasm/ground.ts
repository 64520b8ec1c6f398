// The ground under nodes: how deep a node is and how steep it is there. Plane: straight lines; space: bilinear patches.
// Formulas and order of operations: ../reference/plane-nodes.ts, ../reference/space-nodes.ts.

import {
  columnsAt, firstXAt, firstZAt, lastColumnAt, lastRowAt, lowColumnAt, lowRowAt, nodesEnd, nodesFirst, nodeTable, oneAt,
  perSpacingXAt, perSpacingZAt, rowsFirst, topAt,
} from '../lanes/header'
import { depthAt, insideAt, nodeBytes, nodeRowBytes, number, slopeXAt, slopeZAt, word, x, y, z } from './record'
import { dimensions, vectors } from './variant'
import {
  add, anyOf, atLeast, atMost, either, floor, gather, less, mul, numberBytes, only, read, sub, Vec, vectorBytes, write,
} from './vector'

/** Cell of a place along one side: along > low ? (along < last ? floor(along) : last) : low; low for what is no number. */
@inline function cellOf(along: Vec, low: Vec, last: Vec): Vec {
  return atMost(last, atLeast(low, floor(along)))
}

@inline function isInside(depth: Vec, lane: usize): bool {
  const one = number(oneAt, lane)
  return anyOf(less(sub(one, one), depth))
}

/** Where the addresses of the heights of this vector's lanes stand. */
@inline function rowsOf(lane: usize): usize {
  return word(rowsFirst) + (lane / numberBytes) * 4
}

/**
 * Depth of one vector of a node (0 above the highest ground) and the slopes there, into the node's row; whether some lane
 * is in the ground.
 */
export function measure(o: usize, row: usize, lane: usize): bool {
  const rows = rowsOf(lane)
  const perSpacingX = number(perSpacingXAt, lane)
  const alongX = mul(sub(read(o + lane, x), number(firstXAt, lane)), perSpacingX)
  const column = cellOf(alongX, number(lowColumnAt, lane), number(lastColumnAt, lane))
  const u = sub(alongX, column)
  if (dimensions == 2) {
    const left = gather(rows, column, 0)
    const rise = sub(gather(rows, column, numberBytes), left)
    const height = read(o + lane, y)
    const depth = only(less(height, number(topAt, lane)), sub(add(left, mul(rise, u)), height))
    write(row + lane, depthAt, depth)
    write(row + lane, slopeXAt, mul(rise, perSpacingX))
    return isInside(depth, lane)
  } else {
    const perSpacingZ = number(perSpacingZAt, lane)
    const alongZ = mul(sub(read(o + lane, z), number(firstZAt, lane)), perSpacingZ)
    const line = cellOf(alongZ, number(lowRowAt, lane), number(lastRowAt, lane))
    const columns = number(columnsAt, lane)
    const corner = add(mul(line, columns), column)
    const opposite = add(corner, columns)
    const near = gather(rows, corner, 0)
    const far = gather(rows, opposite, 0)
    const nearRise = sub(gather(rows, corner, numberBytes), near)
    const farRise = sub(gather(rows, opposite, numberBytes), far)
    const w = sub(alongZ, line)
    const nearHeight = add(near, mul(nearRise, u))
    const across = sub(add(far, mul(farRise, u)), nearHeight)
    const height = read(o + lane, y)
    const depth = only(less(height, number(topAt, lane)), sub(add(nearHeight, mul(across, w)), height))
    write(row + lane, depthAt, depth)
    write(row + lane, slopeXAt, mul(add(nearRise, mul(sub(farRise, nearRise), w)), perSpacingX))
    write(row + lane, slopeZAt, mul(across, perSpacingZ))
    return isInside(depth, lane)
  }
}

@inline function isLow(o: usize): bool {
  const first = less(read(o, y), number(topAt, 0))
  if (vectors > 1) return anyOf(either(first, less(read(o, y + vectorBytes), number(topAt, vectorBytes))))
  return anyOf(first)
}

/**
 * Measures the ground under nodes that are lower than its highest place in some lane, and marks those that are in it in
 * some lane. (Not in it, the reference's contact law gives the results of the free step to the bit: it adds 0 to a force
 * that is never -0, because forces are sums that began with 0.) A pass of its own before the nodes move: one long chain of operations for every node would leave the processor nothing to overlap.
 */
export function feelGround(): void {
  const end = word(nodesEnd)
  let row = word(nodeTable)
  for (let o = word(nodesFirst); o < end; o += nodeBytes) {
    let inside: u32 = 0
    if (isLow(o)) {
      inside = <u32>measure(o, row, 0)
      if (vectors > 1) inside |= <u32>measure(o, row, vectorBytes)
    }
    store<u32>(row + insideAt, inside)
    row += nodeRowBytes
  }
}

/** Height under `along` from the heights `place` and the next one. */
@inline function between(rows: usize, place: Vec, u: Vec): Vec {
  const near = gather(rows, place, 0)
  return add(near, mul(sub(gather(rows, place, numberBytes), near), u))
}

/** How deep one vector of a node is where it is now, for the choke point and for samples; 0 above the highest ground. */
export function depthOf(o: usize, lane: usize): Vec {
  const rows = rowsOf(lane)
  const along = mul(sub(read(o, x + lane), number(firstXAt, lane)), number(perSpacingXAt, lane))
  const column = cellOf(along, number(lowColumnAt, lane), number(lastColumnAt, lane))
  const u = sub(along, column)
  const at = read(o, y + lane)
  const below = less(at, number(topAt, lane))
  if (dimensions == 2) return only(below, sub(between(rows, column, u), at))
  const across = mul(sub(read(o, z + lane), number(firstZAt, lane)), number(perSpacingZAt, lane))
  const line = cellOf(across, number(lowRowAt, lane), number(lastRowAt, lane))
  const columns = number(columnsAt, lane)
  const corner = add(mul(line, columns), column)
  const near = between(rows, corner, u)
  const far = between(rows, add(corner, columns), u)
  return only(below, sub(add(near, mul(sub(far, near), sub(across, line))), at))
}
