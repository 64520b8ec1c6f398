// Mean stiffness of a periodic framework: least elastic energy of the cell for every mean strain, its nodes free to
// move and turn but periodic. Exact for walls of Euler-Bernoulli or Timoshenko type and for central-force lattices.
// (Hill, Elastic properties of reinforced solids: some theoretical principles, 1963, for the energy; the minimum is
// found where cells of springs have theirs, ../measure/condense.ts.)

import { condense } from '../measure/condense.js'
import { addInto, assemble } from './assemble.js'
import { buildFramework, type Framework } from './build.js'
import type { PlaneStiffness } from './moduli.js'
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
  const matrix = new Float64Array(all * all)
  assemble(framework, new Float64Array(all), new Float64Array(all), addInto(matrix, all))
  // The mean strains are the last unknowns; two of the movements that nothing resists are shifts of the whole.
  const { kept: k, mechanisms } = condense(matrix, all, 3)
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
  return { stiffness, mechanisms: mechanisms - 2 }
}
