// The same body in another situation: ground, friction, lag, phases, drag, the makers' scatter of its parts. What does
// not differ is shared: a lattice made here holds the very arrays of the one it came from, so that many replicates
// of a body cost little and the kernel can see what they have in common.

import { demandStable } from './build.js'
import { checkGround, demand, isFriction, soundFriction } from './build-checks.js'
import {
  frictionOf,
  lagsOf,
  layOutGround,
  type Strokes,
  sineAndCosine,
  turn,
  turnStrains,
  zeros,
} from './build-parts.js'
import type { Lattice, Source } from './layout.js'
import type { FrictionSpec, GroundSpec } from './spec.js'
import { boundOf, steepestSlope } from './stability.js'

/** What may differ; as in the lattice given where absent. */
export interface Variation {
  readonly ground?: GroundSpec
  /** A node each; undefined for no friction. */
  readonly friction?: readonly (FrictionSpec | undefined)[]
  /** Of every drive group. */
  readonly lagSeconds?: number
  /** Of every driven strut (actuators, then guided struts). */
  readonly phaseTurns?: readonly number[] | Float64Array
  readonly dragNspm?: number
  /** Factors on stiffness and damping of every strut (passive, active, guided): the scatter of real parts. */
  readonly strutFactors?: readonly number[] | Float64Array
  /** A steepest slope that the caller promises; spares a look at the whole ground. */
  readonly steepestSlope?: number
}

/**
 * A lattice of the same body, at its start, in another situation. State (nodes, rotors, sensors, strains) is its own
 * and as `lattice` was built, whatever has happened to that one since. Throws a Refusal ('impossible-value') for
 * values that cannot be and where the step is not stable any more.
 */
export function varyLattice(lattice: Lattice, variation: Variation): Lattice {
  const { ground, friction, lagSeconds, phaseTurns, strutFactors } = variation
  const { spec } = lattice.source
  const dragNspm = variation.dragNspm ?? spec.dragNspm ?? 0
  demand(Number.isFinite(dragNspm) && dragNspm >= 0, 'dragNspm', dragNspm, 'a finite number of at least 0')
  if (ground) checkGround(ground, spec.contact, lattice.dimensions)
  const source: Source = strutFactors ? scaledRows(lattice, strutFactors) : lattice.source
  if (ground || strutFactors || variation.dragNspm !== undefined) {
    const steepest = variation.steepestSlope ?? steepestSlope(ground ?? spec.ground)
    demandStable(lattice.stepSeconds, boundOf(spec, source, ground ?? spec.ground, dragNspm, steepest))
  }
  const floor = ground ? layOutGround(ground, lattice.dimensions) : lattice
  const drive = lagSeconds !== undefined || phaseTurns ? drives(lattice, lagSeconds, phaseTurns) : lattice
  const material = strutFactors ? scaled(lattice, strutFactors) : lattice
  const { nodes, rotors, driven, rotation } = lattice.source.start
  // One spread and a list: many spreads cost more than all the arrays.
  return {
    ...lattice,
    nodes: nodes.slice(),
    touching: new Float64Array(lattice.nodeCount),
    sensed: zeros(lattice.sensorCount),
    guidedStrain: zeros(lattice.guidedCount),
    hostStrain: zeros(lattice.guidedCount),
    rotors: rotors.slice(),
    // Without a sweep it never changes.
    rotation: lattice.sweepSteps.some((steps) => steps > 0) ? rotation.slice() : lattice.rotation,
    driven: driven.slice(),
    step: 0,
    dragNspm,
    heightsM: floor.heightsM,
    terrain: floor.terrain,
    groundColumns: floor.groundColumns,
    groundRows: floor.groundRows,
    friction: friction ? frictions(lattice, friction) : lattice.friction,
    strainCos: drive.strainCos,
    strainSin: drive.strainSin,
    stiffnessNpm: material.stiffnessNpm,
    stiffnessRestN: material.stiffnessRestN,
    dampingNspm: material.dampingNspm,
    source,
  }
}

function frictions({ dimensions, nodeCount }: Lattice, given: readonly (FrictionSpec | undefined)[]) {
  demand(given.length === nodeCount, 'friction', given.length, `one for each of ${nodeCount} nodes`)
  for (let i = 0; i < nodeCount; i++) {
    const one = given[i]
    if (one === undefined || isFriction(one)) continue
    demand(false, `nodes[${i}].friction`, JSON.stringify(one), soundFriction)
  }
  const size = dimensions === 2 ? 2 : 3
  const friction = new Float64Array(size * nodeCount)
  for (let i = 0; i < nodeCount; i++) friction.set(frictionOf(dimensions, given[i]), size * i)
  return friction
}

function drives(
  { activeCount, guidedCount, group, sweepSteps, source }: Lattice,
  lagSeconds: number | undefined,
  phaseTurns: readonly number[] | Float64Array | undefined,
) {
  const sound = lagSeconds === undefined || (Number.isFinite(lagSeconds) && lagSeconds >= 0)
  demand(sound, 'lagSeconds', lagSeconds, 'a finite time >= 0')
  const count = activeCount + guidedCount
  const known = !phaseTurns || phaseTurns.length === count
  demand(known, 'phaseTurns', phaseTurns?.length, `one for each of ${count} driven struts`)
  const lags = lagSeconds === undefined ? lagsOf(source.spec) : undefined
  const isLagging = lagSeconds !== undefined && lagSeconds > 0
  const swept =
    isLagging && sweepSteps.some((steps) => steps > 0) && group.some((g) => sweepSteps[g / 2]! > 0)
  demand(!swept, 'lagSeconds', lagSeconds, 'no lag with a sweep: it holds for one frequency')
  const strokes = phaseTurns ? atPhases(source.strokes, phaseTurns) : source.strokes
  return turnStrains(strokes, (j) => lagSeconds ?? lags![j]!)
}

function atPhases(strokes: Strokes, phaseTurns: readonly number[] | Float64Array): Strokes {
  const sine = new Float64Array(phaseTurns.length)
  const cosine = new Float64Array(phaseTurns.length)
  for (let j = 0; j < phaseTurns.length; j++) {
    const phase = phaseTurns[j]!
    if (!Number.isFinite(phase)) demand(false, `phaseTurns[${j}]`, phase, 'a finite number')
    const [s, c] = sineAndCosine(turn * phase)
    sine[j] = s
    cosine[j] = c
  }
  return { ...strokes, sine, cosine }
}

function scaled({ stiffnessNpm, dampingNspm, restM }: Lattice, factors: readonly number[] | Float64Array) {
  const stiffness = stiffnessNpm.map((k, i) => k * factors[i]!)
  return {
    stiffnessNpm: stiffness,
    stiffnessRestN: stiffness.map((k, i) => k * restM[i]!),
    dampingNspm: dampingNspm.map((c, i) => c * factors[i]!),
  }
}

/** The sums behind the step with every strut's part scaled. */
function scaledRows(lattice: Lattice, factors: readonly number[] | Float64Array): Source {
  const { source, ends, stride, stiffnessNpm, dampingNspm } = lattice
  const count = stiffnessNpm.length
  demand(factors.length === count, 'strutFactors', factors.length, `one for each of ${count} struts`)
  const rowStiffnessNpm = source.rowStiffnessNpm.slice()
  const rowDampingNspm = source.rowDampingNspm.slice()
  for (let i = 0; i < count; i++) {
    const factor = factors[i]!
    demand(Number.isFinite(factor) && factor > 0, `strutFactors[${i}]`, factor, 'a finite factor above 0')
    for (const end of [ends[2 * i]! / stride, ends[2 * i + 1]! / stride]) {
      rowStiffnessNpm[end]! += 2 * stiffnessNpm[i]! * (factor - 1)
      rowDampingNspm[end]! += 2 * dampingNspm[i]! * (factor - 1)
    }
  }
  return { ...source, rowStiffnessNpm, rowDampingNspm }
}
