// How deep a node lies below the ground, for the choke point and for samples: one formula for plane and space. Lanes
// above the highest ground are 0.

import {
  columnsAt, firstXAt, firstZAt, lastColumnAt, lastRowAt, lowColumnAt, lowRowAt, perSpacingXAt, perSpacingZAt, rowsFirst,
  topAt,
} from '../lanes/header'
import { number, word, x, y, z } from './record'
import { dimensions } from './variant'
import {
  add, atLeast, atMost, floor, gather, less, mul, numberBytes, only, read, sub, Vec,
} from './vector'

/** Cell of a place along one side: along > low ? (along < last ? floor(along) : last) : low; low for what is no number. */
@inline export function cellOf(along: Vec, low: Vec, last: Vec): Vec {
  return atMost(last, atLeast(low, floor(along)))
}

/** Height under `along` from the heights `place` and the next one. */
@inline function between(rows: usize, place: Vec, u: Vec): Vec {
  const near = gather(rows, place, 0)
  return add(near, mul(sub(gather(rows, place, numberBytes), near), u))
}

export function depthOf(o: usize, lane: usize): Vec {
  const rows = word(rowsFirst) + (lane / numberBytes) * 4
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
