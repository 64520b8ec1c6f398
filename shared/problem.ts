// What a problem is: the plug-in that says what is evolved, how it is simulated and what is measured.
// Types only (defineProblem, which checks one, lives in sim/problem.ts).
//
// One *simulation* is one individual under one situation. A situation is one condition (everything random)
// and, where the problem names cases, one of its cases. A *replicate* is all cases under one condition, so
// a replicate costs max(1, cases) simulations.

import type { Frames } from './frames.js'
import type { Genome, GenomeOf, GenomeSpec } from './genome.js'
import type { noMachine, Parts, Process, Use } from './making/types.js'
import type { NeedsInput } from './needs.js'
import type { Stream } from './streams.js'

export type { FrameBody, FrameGroundGrid, FrameLink, FrameMotor, Frames, FrameWall } from './frames.js'

export type Direction = 'maximise' | 'minimise'
/** How the replicates of an individual become one number. 'worst' is the worst for the objective's direction. */
export type Reduction = 'mean' | 'median' | 'worst' | { readonly quantile: number }
/** How the cases of one replicate become one number. */
export type CaseCombination = 'mean' | 'worst' | 'sum'

export interface Objective {
  readonly direction: Direction
  readonly unit: string
  readonly reduce: Reduction
  readonly overCases: CaseCombination
}
export interface Measure {
  readonly low: number
  readonly high: number
  readonly unit: string
}

/** How far a problem's results repeat (design: bits is the default and what our own kernels promise). */
export type Exactness = 'bits' | 'bits-per-processor' | 'tolerance' | 'statistical'
/** How far two simulations of the same may be apart: absolute (in the number's unit) plus relative to the larger. */
export interface Tolerance {
  readonly absolute?: number
  readonly relative?: number
}

export interface Situation<Condition> {
  readonly condition: Condition
  /** Name of the case, or '' where the problem has none. */
  readonly case: string
}

export interface Measured {
  readonly objectives: { readonly [name: string]: number }
  readonly measures?: { readonly [name: string]: number }
}
/** A simulation that could not give numbers, with the reason a person can read (at most 200 characters kept). */
export interface FailedSimulation {
  readonly failed: string
}
export type SimulationOutcome = Measured | FailedSimulation

/** What a machine is used for; a function where it depends on the genome. */
export type UseOf<S extends GenomeSpec> = Use | typeof noMachine | ((genome: GenomeOf<S>) => Use)

/** A caution that leaves with every picture, replay and sheet of the machine. */
export interface Caution {
  readonly hazard: string
  readonly because: string
  readonly consult: string
}

export interface Problem<S extends GenomeSpec = GenomeSpec, Condition = unknown> {
  readonly name: string
  /** Changes whenever results change. */
  readonly version: string
  readonly summary: string
  readonly genome: S
  readonly objectives: { readonly [name: string]: Objective }
  readonly measures: { readonly [name: string]: Measure }
  readonly cases: readonly string[]
  readonly exactness: Exactness
  /**
   * For every objective and measure, with exactness 'tolerance' how far results of honest machines are apart at most,
   * with 'statistical' what chance hardly ever exceeds.
   */
  readonly tolerance?: { readonly [name: string]: Tolerance }
  /** Draws everything random about one simulation. The same stream gives the same condition. */
  readonly drawCondition: (stream: Stream) => Condition
  /** One outcome for each situation, in order. Gets all simulations of an evaluation at once. */
  readonly simulate: (genome: GenomeOf<S>, situations: readonly Situation<Condition>[]) => SimulationOutcome[]
  /**
   * As simulate, with the simulator's step divided by the whole number `divide`: from it `check` tells how much the
   * size of the step changes the results.
   */
  readonly simulateFiner?: (
    genome: GenomeOf<S>,
    situations: readonly Situation<Condition>[],
    divide: number,
  ) => SimulationOutcome[]
  /**
   * What one simulation asks of its machine and of the site: cores (1 unless said), memoryMB (1,024), and tokens, licences
   * by name of which it holds so many while it runs. No more run at once than there is room and licences for.
   */
  readonly needs?: NeedsInput
  /** Positive integer: what a simulation of this genome should cost, relative to others. */
  readonly expectedCost: (genome: GenomeOf<S>) => number
  /** Makes a freshly varied genome buildable; must be pure and idempotent. */
  readonly repair: (genome: GenomeOf<S>) => GenomeOf<S>
  readonly frames?: (genome: GenomeOf<S>, situation: Situation<Condition>) => Frames
  /** Lines for a person: part by part, with units. */
  readonly describe?: (genome: GenomeOf<S>) => readonly string[]
  /** Beyond those that follow from `use` and `process` (shared/making/cautions.ts). */
  readonly cautions?: (genome: GenomeOf<S>) => readonly Caution[]
  /** What the workshop can make, and of what. */
  readonly process?: Process
  /** What the genome describes, to compare with `process`; what cannot be made fails when it is simulated. */
  readonly parts?: (genome: GenomeOf<S>) => Parts
  /** Energy, place and touch, from which the cautions follow; what is not declared counts as unknown. */
  readonly use?: UseOf<S>
}

/** A problem whose genome is known only at run time; what coordinator and worker handle. */
export type AnyProblem = Problem<GenomeSpec, unknown> & {
  readonly simulate: (genome: Genome, situations: readonly Situation<unknown>[]) => SimulationOutcome[]
  readonly simulateFiner?: (
    genome: Genome,
    situations: readonly Situation<unknown>[],
    divide: number,
  ) => SimulationOutcome[]
}
