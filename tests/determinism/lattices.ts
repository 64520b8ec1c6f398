// Golden lattices: random bodies of ../reference/lattice-bodies.ts, in which every law acts at once (passive, active and
// guided struts, sensors, directional drag, areas or volumes, pairs kept apart, sweeping drives, friction, ground).

import { stream } from '../../shared/streams.js'
import { advance } from '../../sim/lattice/advance.js'
import { buildLattice } from '../../sim/lattice/build.js'
import {
  advanceLanes,
  laneTally,
  type Precision,
  packLanes,
  sampleLanes,
  unpackLane,
} from '../../sim/lattice/lanes.js'
import type { Lattice } from '../../sim/lattice/layout.js'
import { newTally, type Tally, takeSample } from '../../sim/lattice/tally.js'
import { varyLattice } from '../../sim/lattice/vary.js'
import { randomBody, randomVariation } from '../reference/lattice-bodies.js'

const seed = 20_261_209
const bodies = 2
const samples = 28
const stepsASample = 50
const sampleSeconds = 0.005

export const golden = { bodies, steps: samples * stepsASample }

/** Situations of a body; with own material (every strut differs between them) in every second body. */
export function situations(dimensions: 2 | 3, body: number, count: number): Lattice[] {
  const draw = stream(seed, 'spare', body, dimensions)
  const spec = randomBody(draw, dimensions)
  const lattice = buildLattice(spec)
  return Array.from({ length: count }, () =>
    varyLattice(lattice, randomVariation(draw, spec, body % 2 === 1)),
  )
}

function numbersOf(lattice: Lattice, tally: Tally): number[] {
  const { nodes, sensed, guidedStrain, rotors, step } = lattice
  const { peakTensionN, workJ, loadedSamples, contacts, highestM, lowestM } = tally
  const struts = [peakTensionN, workJ, loadedSamples]
  const parts = [nodes, sensed, guidedStrain, rotors, ...struts, contacts, highestM, lowestM]
  return [step, ...parts.flatMap((part) => Array.from(part))]
}

/** As the reference moves them, one after the other. */
export function referenceNumbers(dimensions: 2 | 3, count: number): number[] {
  const numbers: number[] = []
  for (let body = 0; body < bodies; body++) {
    for (const lattice of situations(dimensions, body, count)) {
      const tally = newTally(lattice)
      for (let sample = 0; sample < samples; sample++) {
        advance(lattice, stepsASample)
        takeSample(lattice, tally, sampleSeconds)
      }
      numbers.push(...numbersOf(lattice, tally))
    }
  }
  return numbers
}

/** As the kernel moves them side by side. In double precision the same numbers as referenceNumbers(). */
export function lanesNumbers(dimensions: 2 | 3, count: number, precision: Precision): number[] {
  const numbers: number[] = []
  for (let body = 0; body < bodies; body++) {
    const lattices = situations(dimensions, body, count)
    const lanes = packLanes(lattices, { precision })
    for (let sample = 0; sample < samples; sample++) {
      advanceLanes(lanes, stepsASample)
      sampleLanes(lanes, sampleSeconds)
    }
    for (const i of lattices.keys()) numbers.push(...numbersOf(unpackLane(lanes, i), laneTally(lanes, i)))
  }
  return numbers
}
