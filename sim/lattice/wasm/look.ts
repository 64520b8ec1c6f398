// The choke point: which lanes hold a number that is none, or a node deeper in the ground than the contact allows. What
// exactly is wrong is found by the reference's own look() on the copy of that lane.

import { depthLimitAt, depthLimited, nodesEnd, nodesFirst, nodeTable, topAt } from '../lanes/header'
import { depthOf } from './ground'
import { isHeld, nodeBytes, nodeRowBytes, number, specialAt, wide, word, y } from './record'
import { dimensions, vectors } from './variant'
import {
  add, anyOf, bitsOf, differ, either, less, read, sub, Vec, vectorBytes, vectorLanes,
} from './vector'

/** 0 as long as all numbers of all nodes are finite, no number otherwise. */
function strangeness(lane: usize): Vec {
  const end = word(nodesEnd)
  let sum = sub(number(depthLimitAt, lane), number(depthLimitAt, lane))
  for (let o = word(nodesFirst); o < end; o += nodeBytes) {
    for (let c: usize = 0; c < 2 * dimensions * wide; c += wide) {
      const value = read(o + c, lane)
      sum = add(sum, sub(value, value))
    }
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
  const sum = strangeness(lane)
  const bits = bitsOf(differ(sum, sum))
  return word(depthLimited) != 0 ? bits | sunk(lane) : bits
}

/** One bit for every lane that has a fault. */
export function look(): u32 {
  const bits = lookAt(0)
  return vectors > 1 ? bits | (lookAt(vectorBytes) << <u32>vectorLanes) : bits
}
