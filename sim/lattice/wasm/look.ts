// The choke point: which lanes hold a number that is none, or a node deeper in the ground than the contact allows. What
// exactly is wrong is found by the reference's own look() on the copy of that lane.

import { depthLimitAt, depthLimited, nodesEnd, nodesFirst, nodeTable, oneAt, topAt } from '../lanes/header'
import { depthOf } from './ground'
import { isHeld, nodeBytes, nodeRowBytes, number, specialAt, vx, vy, vz, word, x, y, z } from './record'
import { dimensions, vectors } from './variant'
import {
  add, anyOf, bitsOf, differ, either, less, read, sub, Vec, vectorBytes, vectorLanes,
} from './vector'

/** The sum of all places and speeds: finite as long as they are. */
@inline function sumOf(lane: usize): Vec {
  const end = word(nodesEnd)
  let sum = number(oneAt, lane)
  for (let o = word(nodesFirst); o < end; o += nodeBytes) {
    const first = add(read(o, x + lane), read(o, y + lane))
    const second = add(read(o, vx + lane), read(o, vy + lane))
    sum = add(sum, add(first, second))
    if (dimensions == 3) sum = add(sum, add(read(o, z + lane), read(o, vz + lane)))
  }
  return sum
}

function sunk(lane: usize): u32 {
  const end = word(nodesEnd)
  let row = word(nodeTable)
  let found: u32 = 0
  for (let o = word(nodesFirst); o < end; o += nodeBytes) {
    if ((word(row + specialAt) & isHeld) == 0 && anyOf(less(read(o, y + lane), number(topAt, lane)))) {
      found |= bitsOf(less(number(depthLimitAt, lane), depthOf(o, lane)))
    }
    row += nodeRowBytes
  }
  return found
}

@inline function lookAt(lane: usize): u32 {
  const sum = sumOf(lane)
  const rest = sub(sum, sum)
  const bits = bitsOf(differ(rest, rest))
  return word(depthLimited) != 0 ? bits | sunk(lane) : bits
}

/** One bit for every lane that has a fault. */
export function look(): u32 {
  const bits = lookAt(0)
  return vectors > 1 ? bits | (lookAt(vectorBytes) << <u32>vectorLanes) : bits
}
