// What is measured of a body while it runs, sampled between steps: extremes, work and contacts, as flat arrays. The same
// sums, in the same order, are kept by the WebAssembly kernel (lanes), where sampling does not leave the kernel.

import { type ActuatorTally, loadedShare } from '../../shared/making/measures.js'
import { groundHeightM } from './ground.js'
import type { Lattice } from './layout.js'
import { commandedStrain } from './observe.js'

/** Struts in the order of the lattice; driven struts are active ones, then guided ones; a node each: node number. */
export interface Tally {
  samples: number
  /** Largest |tension| of every strut, N. */
  readonly peakTensionN: Float64Array
  /** Shortest and longest length of every strut, m. */
  readonly shortestM: Float64Array
  readonly longestM: Float64Array
  /** Mechanical work given to the nodes by every driven strut, J, positive part: what it is pushed gives nothing back. */
  readonly workJ: Float64Array
  /**
   * Samples in which the driven strut was under load, as the standard measure duty counts them: its |tension| above a tenth
   * of its force limit (shared/making/measures.ts). Without a limit there is no load to speak of, and this stays 0.
   */
  readonly loadedSamples: Float64Array
  /** Samples in which the node was in the ground. */
  readonly contacts: Float64Array
  /** Lowest and highest y of every node, m. */
  readonly lowestM: Float64Array
  readonly highestM: Float64Array
}

export function newTally({ nodeCount, passiveCount, activeCount, guidedCount }: Lattice): Tally {
  const driven = activeCount + guidedCount
  const struts = passiveCount + driven
  return {
    samples: 0,
    peakTensionN: new Float64Array(struts),
    shortestM: new Float64Array(struts).fill(Number.POSITIVE_INFINITY),
    longestM: new Float64Array(struts),
    workJ: new Float64Array(driven),
    loadedSamples: new Float64Array(driven),
    contacts: new Float64Array(nodeCount),
    lowestM: new Float64Array(nodeCount).fill(Number.POSITIVE_INFINITY),
    highestM: new Float64Array(nodeCount).fill(Number.NEGATIVE_INFINITY),
  }
}

/**
 * Takes one sample; `seconds` is the time between samples. With d, dv from a to b, q = d.d and scale = T / |d| as in the
 * force loops (reference/plane-struts.ts): |T| = |scale| sqrt(q), power given to the nodes = -scale (d . dv), under load
 * where |scale| > share * limit / |d|.
 */
export function takeSample(lattice: Lattice, tally: Tally, seconds: number): void {
  const { passiveCount, activeCount, guidedCount, ends, nodes, dimensions, limitN } = lattice
  const { peakTensionN, shortestM, longestM, workJ, loadedSamples } = tally
  tally.samples++
  for (let i = 0; i < passiveCount + activeCount + guidedCount; i++) {
    const a = ends[2 * i]!
    const b = ends[2 * i + 1]!
    let q = 0
    let along = 0
    for (let axis = 0; axis < dimensions; axis++) {
      const d = nodes[b + axis]! - nodes[a + axis]!
      q += d * d
      along += d * (nodes[b + dimensions + axis]! - nodes[a + dimensions + axis]!)
    }
    const length = Math.sqrt(q)
    const scale = scaleOf(lattice, i, q, along)
    peakTensionN[i] = Math.max(peakTensionN[i]!, Math.abs(scale) * length)
    shortestM[i] = Math.min(shortestM[i]!, length)
    longestM[i] = Math.max(longestM[i]!, length)
    if (i < passiveCount) continue
    const j = i - passiveCount
    workJ[j]! += Math.max(0, -scale * along) * seconds
    const most = limitN[j]! * (length * (1 / q))
    if (Math.abs(scale) > loadedShare * most) loadedSamples[j]!++
  }
  sampleNodes(lattice, tally)
}

/** What was sampled of driven strut j (active, then guided), as the standard measures of actuators take it. */
export function actuatorTally(tally: Tally, j: number): ActuatorTally {
  const strut = tally.peakTensionN.length - tally.workJ.length + j
  return {
    peakForce: tally.peakTensionN[strut]!,
    shortest: tally.shortestM[strut]!,
    longest: tally.longestM[strut]!,
    workJ: tally.workJ[j]!,
    loadedSamples: tally.loadedSamples[j]!,
    samples: tally.samples,
  }
}

/** The first strut that was shorter or longer in some sample than its bounds, one of each for every strut; or -1. */
export function strutBeyond(tally: Tally, leastM: Float64Array, mostM: Float64Array): number {
  const { shortestM, longestM } = tally
  for (let i = 0; i < leastM.length; i++) {
    if (shortestM[i]! < leastM[i]! || longestM[i]! > mostM[i]!) return i
  }
  return -1
}

/** T / |d| of strut i. */
function scaleOf(lattice: Lattice, i: number, q: number, along: number): number {
  const { passiveCount, stiffnessNpm, stiffnessRestN, dampingNspm, limitN, powerMostW } = lattice
  const perQ = 1 / q
  const perLength = Math.sqrt(q) * perQ
  const j = i - passiveCount
  const commandedN = j < 0 ? stiffnessRestN[i]! : stiffnessRestN[i]! * (1 + commandedStrain(lattice, j))
  const free = stiffnessNpm[i]! - commandedN * perLength + dampingNspm[i]! * along * perQ
  if (j < 0) return free
  const most = limitN[j]! * perLength
  const limited = Math.min(most, Math.max(-most, free))
  const powerW = -limited * along
  const mostW = powerMostW[j]!
  return powerW > mostW ? limited * (mostW / powerW) : limited
}

function sampleNodes(lattice: Lattice, { contacts, lowestM, highestM }: Tally): void {
  const { nodes, nodeCount, stride, dimensions } = lattice
  const top = lattice.terrain[2]!
  for (let i = 0; i < nodeCount; i++) {
    const o = i * stride
    const y = nodes[o + 1]!
    lowestM[i] = Math.min(lowestM[i]!, y)
    highestM[i] = Math.max(highestM[i]!, y)
    if (y < top && groundHeightM(lattice, nodes[o]!, dimensions === 3 ? nodes[o + 2]! : 0) > y) contacts[i]!++
  }
}
