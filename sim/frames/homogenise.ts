// Mean stiffness of a periodic framework: least elastic energy of the cell for every mean strain, its nodes free to
// move and turn but periodic. Exact for walls of Euler-Bernoulli or Timoshenko type and for central-force lattices.
// (Hill, Elastic properties of reinforced solids: some theoretical principles, 1963, for the energy; the static
// condensation is common practice.)

import { addInto, assemble } from './assemble.js'
import { buildFramework, type Framework } from './build.js'
import type { PlaneStiffness } from './moduli.js'
import { eliminate } from './semidefinite.js'
import type { FrameworkSpec } from './spec.js'

export interface Homogenised {
  readonly stiffness: PlaneStiffness
  /** Movements of the cell's nodes that no bar resists, the two shifts of the whole left out. */
  readonly mechanisms: number
}

/** Stiffness of a sheet made of this cell. Throws a Refusal where the description is not sound. */
export function homogenise(spec: FrameworkSpec): Homogenised {
  return homogeniseFramework(buildFramework(spec))
}

/** The same for a framework that is built already; it must be periodic. */
export function homogeniseFramework(framework: Framework): Homogenised {
  const all = framework.unknownCount
  // The first node stays: it only names the shift of the whole.
  const kept: number[] = []
  for (let i = 0; i < all; i++) {
    if (i !== framework.nodeUnknown[0]! && i !== framework.nodeUnknown[0]! + 1) kept.push(i)
  }
  const place = new Int32Array(all).fill(-1)
  for (const [i, unknown] of kept.entries()) place[unknown] = i
  const size = kept.length
  const matrix = new Float64Array(size * size)
  assemble(framework, new Float64Array(all), new Float64Array(all), addInto(matrix, size, place))
  const { kept: k, mechanisms } = eliminate(matrix, size, 3)
  const perArea = 1 / framework.cellAreaM2
  // The unknown is e12, the stiffness that of 2 e12.
  const stiffness = {
    c11: k[0]! * perArea,
    c22: k[4]! * perArea,
    c12: k[1]! * perArea,
    c66: (k[8]! * perArea) / 4,
    c16: (k[2]! * perArea) / 2,
    c26: (k[5]! * perArea) / 2,
  }
  return { stiffness, mechanisms }
}
