// The same body in another situation: ground, friction, lag, phases, drag, the makers' scatter of its parts. What does
// not differ is shared: a lattice made here holds the very arrays of the one it came from, so that many replicates
// of a body cost little and the kernel can see what they have in common.

import { demandStable } from './build.js'
import { checkGround, demand, isFriction } from './build-checks.js'
import { frictionOf, layOutGround, strokesOf, turnedStrain } from './build-parts.js'
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
  return {
    ...lattice,
    ...freshState(lattice),
    dragNspm,
    ...(ground ? layOutGround(ground, lattice.dimensions) : {}),
    ...(friction ? { friction: frictions(lattice, friction) } : {}),
    ...(lagSeconds !== undefined || phaseTurns ? drives(lattice, lagSeconds, phaseTurns) : {}),
    ...(strutFactors ? scaled(lattice, strutFactors) : {}),
    source,
  }
}

/** State as it was when the lattice was built. */
function freshState({ nodeCount, sensorCount, guidedCount, rotation, sweepSteps, source }: Lattice) {
  const { nodes, rotors, driven, rotation: turning } = source.start
  return {
    nodes: nodes.slice(),
    touching: new Float64Array(nodeCount),
    sensed: new Float64Array(sensorCount),
    guidedStrain: new Float64Array(guidedCount),
    hostStrain: new Float64Array(guidedCount),
    rotors: rotors.slice(),
    // Without a sweep it never changes.
    rotation: sweepSteps.some((steps) => steps > 0) ? turning.slice() : rotation,
    driven: driven.slice(),
    step: 0,
  }
}

function frictions({ dimensions, nodeCount }: Lattice, given: readonly (FrictionSpec | undefined)[]) {
  demand(given.length === nodeCount, 'friction', given.length, `one for each of ${nodeCount} nodes`)
  for (const [i, one] of given.entries()) {
    const sound = one === undefined || isFriction(one)
    demand(sound, `nodes[${i}].friction`, JSON.stringify(one), 'finite coefficients of at least 0')
  }
  return Float64Array.from(given.flatMap((one) => frictionOf(dimensions, one)))
}

function drives(
  { activeCount, guidedCount, source }: Lattice,
  lagSeconds: number | undefined,
  phaseTurns: readonly number[] | Float64Array | undefined,
) {
  const sound = lagSeconds === undefined || (Number.isFinite(lagSeconds) && lagSeconds >= 0)
  demand(sound, 'lagSeconds', lagSeconds, 'a finite time >= 0')
  const count = activeCount + guidedCount
  const known = !phaseTurns || phaseTurns.length === count
  demand(known, 'phaseTurns', phaseTurns?.length, `one for each of ${count} driven struts`)
  const strainCos = new Float64Array(count)
  const strainSin = new Float64Array(count)
  for (const [j, stroke] of strokesOf(source.spec).entries()) {
    const phase = phaseTurns ? phaseTurns[j]! : stroke.phaseTurns
    demand(Number.isFinite(phase), `phaseTurns[${j}]`, phase, 'a finite number')
    const lag = lagSeconds ?? stroke.group.lagSeconds ?? 0
    demand(
      lag === 0 || !stroke.group.sweep,
      'lagSeconds',
      lag,
      'no lag with a sweep: it holds for one frequency',
    )
    const turned = turnedStrain({ ...stroke, phaseTurns: phase, group: { ...stroke.group, lagSeconds: lag } })
    strainCos[j] = turned[0]
    strainSin[j] = turned[1]
  }
  return { strainCos, strainSin }
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
