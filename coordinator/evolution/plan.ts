// A search, decided: what the search file says once defaults are filled in and everything is checked.
// evolution and engine read this and never the file. Plain data, structured-cloneable.

import type { GenomeSpec } from '../../shared/genome.js'
import type { Needs } from '../../shared/needs.js'
import type { CaseCombination, Direction, Exactness, Reduction, Tolerance } from '../../shared/problem.js'
import type { Placement, Settings } from './types.js'

export interface ObjectivePlan {
  readonly name: string
  readonly direction: Direction
  readonly unit: string
  readonly reduce: Reduction
  readonly overCases: CaseCombination
}

/** What the search needs to know of its problem; made from the pinned plug-in. */
export interface ProblemPlan {
  readonly name: string
  readonly version: string
  /** Hex SHA-256 of the bundled plug-in. */
  readonly digest: string
  readonly spec: GenomeSpec
  readonly objectives: readonly ObjectivePlan[]
  readonly measures: readonly {
    readonly name: string
    readonly low: number
    readonly high: number
    readonly unit: string
  }[]
  readonly cases: readonly string[]
  /** How far results repeat; 'bits' where nothing is said. */
  readonly exactness?: Exactness
  /** What one simulation asks of a machine and of the site; as usual (shared/needs.ts) where nothing is said. */
  readonly needs?: Needs
  /** For exactness 'tolerance' and 'statistical': one entry a column of a result. */
  readonly tolerances?: readonly Tolerance[]
}

export type CommitOrder = 'proposal' | 'cost' | 'arrival'

export interface IslandPlan {
  /** 1, 2, ...; a control's from ids.firstControl on. */
  readonly island: number
  readonly method: string
  readonly settings: Settings
  readonly population: number
  /** L: how many evaluations may be outstanding. */
  readonly lookahead: number
  readonly order: CommitOrder
  /** Weight in the split of the budget. */
  readonly share: number
  /** Per part of the genome: rows of the operator tables with their settings. */
  readonly operators: { readonly [part: string]: OperatorPlan }
}
export interface OperatorPlan {
  readonly crossover: { readonly operator: string; readonly settings: Settings }
  readonly mutation: { readonly operator: string; readonly settings: Settings }
}

export interface ReplicatePlan {
  readonly first: number
  readonly topUp: number
  readonly most: number
  /** True: rivals share condition j; false: conditions are the individual's own. */
  readonly shared: boolean
}

export type Topology = 'ring' | 'two-way-ring' | 'torus-4' | 'torus-8' | 'complete' | 'random'
export interface MigrationPlan {
  readonly everyRounds: number
  readonly emigrants: number
  readonly topology: Topology
  /** Epochs, at least 1. */
  readonly lag: number
  readonly leave: 'best' | 'random'
  readonly arrive: Placement
}

export interface BudgetPlan {
  /** Simulations over all islands (controls have their own of the same size each). */
  readonly simulations: number
  readonly coreHours?: number
  /** ISO date and time. */
  readonly until?: string
  /** First objective, in its own direction and unit. */
  readonly target?: number
  /** Rounds without a better best on an island. */
  readonly stagnationRounds?: number
}

export interface SearchPlan {
  readonly name: string
  /** 0 to 2^53 - 1. */
  readonly seed: number
  /** Which rules of the search apply; a change that alters results gets a new number. */
  readonly semantics: number
  readonly problem: ProblemPlan
  readonly islands: readonly IslandPlan[]
  readonly controls: readonly IslandPlan[]
  /** Absent with a single island or `migration: none`. */
  readonly migration?: MigrationPlan
  readonly replicates: ReplicatePlan
  readonly budget: BudgetPlan
  readonly confirm: { readonly fraction: number }
  readonly genomes: 'all' | 'survivors' | 'none'
}
