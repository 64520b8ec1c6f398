// Where nodes are, for code that reads places and nothing else, wherever they lie: in a lattice, or in a lane of the kernel.

import type { Lattice } from './layout.js'

/** Component `axis` of node i is numbers[first + i * nodeStep + axis * axisStep], m. */
export interface NodePlaces {
  readonly numbers: Float64Array | Float32Array
  readonly first: number
  readonly nodeStep: number
  readonly axisStep: number
}

export function latticePlaces({ nodes, stride }: Lattice): NodePlaces {
  return { numbers: nodes, first: 0, nodeStep: stride, axisStep: 1 }
}
