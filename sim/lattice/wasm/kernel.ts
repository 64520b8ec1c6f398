// The lattice kernel, compiled to one WebAssembly module for every variant (variant.ts and vector.ts are made by the
// build script): dimensions, lanes, precision, material shared by all lanes or own to each. The host side is in
// ../lanes.ts, the meaning in ../reference/.
//
// The passes are exported beside run() so that the compiler keeps them functions of their own: V8 replaces slow code by
// fast code only when a function is called anew, never in the middle of a loop.

import { guidedEnd, guidedFirst, hasGround, sensorEnd, sensorFirst } from '../lanes/header'
import { drive } from './drive'
import { addFills } from './fills'
import { feelGround, measure } from './ground'
import { guide } from './guide'
import { integrate, special } from './nodes'
import { word } from './record'
import { addActive, addApart, addDrag, addGuided, addPassive } from './struts'

export { look } from './look'
export { sample } from './sample'
export { addActive, addApart, addDrag, addFills, addGuided, addPassive, drive, feelGround, guide, integrate, measure, special }

/** Some steps; the forces are 0 before and after. */
export function run(steps: i32): void {
  const guides = word(guidedEnd) != word(guidedFirst) || word(sensorEnd) != word(sensorFirst)
  const grounded = word(hasGround) != 0
  for (let i = 0; i < steps; i++) {
    if (guides) guide()
    addPassive()
    addActive()
    addGuided()
    addDrag()
    addFills()
    addApart()
    if (grounded) feelGround()
    integrate()
    drive()
  }
}
