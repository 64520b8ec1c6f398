// Peak and root mean square tension of every strut, sampled between steps. The peak is what a strut and its joints must
// stand once, the rms what they (and a motor's windings) stand for long. A node's ground force is not kept here: contact
// laws give it from the depth (observe.depthM).

import type { Lattice } from '../lattice/layout.js'
import { tensionN } from '../lattice/observe.js'

/** Running sums of all struts in the lattice's order: passive, active, guided. */
export interface ForceRecord {
  samples: number
  /** Largest tension and largest thrust so far, N, both not negative. */
  readonly tensionN: Float64Array
  readonly thrustN: Float64Array
  /** Sum of squares, N^2. */
  readonly squares: Float64Array
}

export function newForceRecord({ passiveCount, activeCount, guidedCount }: Lattice): ForceRecord {
  const count = passiveCount + activeCount + guidedCount
  return {
    samples: 0,
    tensionN: new Float64Array(count),
    thrustN: new Float64Array(count),
    squares: new Float64Array(count),
  }
}

/** Takes the tensions of all struts at this instant in. */
export function takeForces(lattice: Lattice, record: ForceRecord): void {
  record.samples++
  for (let i = 0; i < record.squares.length; i++) {
    const tension = tensionN(lattice, i)
    record.tensionN[i] = Math.max(record.tensionN[i]!, tension)
    record.thrustN[i] = Math.max(record.thrustN[i]!, -tension)
    record.squares[i]! += tension * tension
  }
}

/** Largest size of the force in a strut, N. */
export function peakForceN({ tensionN: tension, thrustN }: ForceRecord, strut: number): number {
  return Math.max(tension[strut]!, thrustN[strut]!)
}

/** Root mean square of the force in a strut, N; equal weight for every sample, 0 without samples. */
export function rmsForceN({ samples, squares }: ForceRecord, strut: number): number {
  return samples === 0 ? 0 : Math.sqrt(squares[strut]! / samples)
}
