// The words of evolution: individuals, births, the interface of a method and of variation. Types only.
//
// Everything here is pure: no clock, no I/O; randomness comes in as streams. Scores are always minimised: an
// objective to maximise enters with its sign turned. A failed individual scores +Infinity on every objective.

import type { Genome, GenomeSpec } from '../../shared/genome.js'
import type { Stream } from '../../shared/streams.js'

export interface Individual {
  /** shared/ids.ts; home island and number of birth. */
  readonly id: number
  readonly genome: Genome
  readonly parents: readonly number[]
  readonly origin: Origin
  /** Commits on the home island when it was proposed. */
  readonly bornAtCommit: number
  /** Which evaluations its values came from, in the order of `values`. */
  blocks: readonly Block[]
  /** Rows of all simulations so far (result.ts), block after block. */
  values: Float64Array
  replicates: number
  failedSimulations: number
  /** One number an objective, smaller is better; estimates change only at a commit. */
  score: Float64Array
  /** For methods that count age (age-fitness-pareto), in generations; 0 elsewhere. */
  age: number
}

/** One committed evaluation of an individual. */
export interface Block {
  readonly island: number
  readonly evaluation: number
  readonly firstReplicate: number
  readonly replicates: number
  /** Simulations of this block that failed. */
  readonly failedSimulations: number
}

export type Origin = 'founder' | 'crossed' | 'mutated' | 'crossed-mutated' | 'copied'

export interface Birth {
  readonly genome: Genome
  readonly parents: readonly number[]
  readonly origin: Origin
  readonly age: number
}

/** Making genomes from nothing or from parents; built from the operator rows for one genome specification. */
export interface Variation {
  founder(stream: Stream): Genome
  /** One child of two parents by the crossover of each part. */
  cross(a: Genome, b: Genome, stream: Stream): Genome
  mutate(genome: Genome, stream: Stream): Genome
  /** 0 (equal) to 1; mean over parts of a distance scaled per encoding. For diversity. */
  distance(a: Genome, b: Genome): number
}

/** A setting of a method or operator in the search file: a row of a table, so that help, schema and check agree. */
export type SettingRow =
  | {
      readonly kind: 'number'
      readonly default: number
      readonly low: number
      readonly high: number
      readonly help: string
    }
  | {
      readonly kind: 'integer'
      readonly default: number
      readonly low: number
      readonly high: number
      readonly help: string
    }
  | {
      readonly kind: 'choice'
      readonly default: string
      readonly options: readonly string[]
      readonly help: string
    }
export type SettingTable = { readonly [name: string]: SettingRow }
/** Checked values of a SettingTable: every row present. */
export type Settings = { readonly [name: string]: number | string }

export interface MethodContext {
  readonly spec: GenomeSpec
  /** How many objectives a score has. */
  readonly objectives: number
  readonly population: number
  readonly settings: Settings
  readonly variation: Variation
}

/**
 * One island's evolutionary algorithm as a deterministic machine. The island calls it; it never calls out.
 * All randomness of a proposal comes from the stream it is given (one stream per birth).
 */
export interface MethodMachine {
  /** The next birth, or 'wait' until another commit. Called for every free slot. */
  propose(stream: Stream): Birth | 'wait'
  /** A newly evaluated individual, in commit order. The stream is this commit's own. */
  commit(individual: Individual, stream: Stream): void
  /** The estimate of an individual changed (a top-up or a correction). It may be no member any more. */
  reconsider(individual: Individual): void
  /** Individuals from elsewhere, already evaluated. Placement is one of the rows of arrival rules. */
  immigrate(arrivals: readonly Individual[], placement: Placement, stream: Stream): void
  /** Those who may breed now, in a fixed order. */
  members(): readonly Individual[]
  /** Everybody the machine refers to: members and those committed but not yet members. For snapshots. */
  held(): readonly Individual[]
  /** Members best first, total order (last tie-break: id). */
  ranked(): readonly Individual[]
  /** Everything needed to go on, structured-cloneable; individuals by id only. */
  save(): unknown
}

export type Placement = 'worst' | 'random' | 'if-better'

export interface Method {
  readonly name: string
  readonly title: string
  /** One line for --help and docs. */
  readonly summary: string
  /** Title, year, equation or 'common practice, no source'. */
  readonly source: string
  readonly settings: SettingTable
  readonly defaultPopulation: number
  /** 'generational' methods propose a whole generation, then wait. */
  readonly pace: 'steady' | 'generational'
  readonly objectives: 'one' | 'any'
  readonly create: (context: MethodContext) => MethodMachine
  /** The machine that save() described; `individual` finds members by id. */
  readonly restore: (
    context: MethodContext,
    saved: unknown,
    individual: (id: number) => Individual,
  ) => MethodMachine
}
