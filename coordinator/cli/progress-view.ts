// What a person (and a script, with --json) may know of a search at one moment. Made by coordinator/main.ts from the
// record; drawn by terminal.ts. Names here are names of the JSON, so they may grow but not change.

export type SearchState = 'new' | 'searching' | 'paused' | 'stopped' | 'finished'

/** An estimate: never a number without its unit, spread and sample size. */
export interface EstimateView {
  readonly objective: string
  readonly unit: string
  readonly value: number
  /** Standard error over replicates; absent with fewer than two, or where the reduction has none. */
  readonly standardError?: number
}

export interface BestView {
  /** 'i3-01842' */
  readonly id: string
  readonly replicates: number
  /** In order of declaration. */
  readonly estimates: readonly EstimateView[]
  /** False while a second simulation is still to confirm it. */
  readonly confirmed: boolean
}

export interface IslandView {
  /** 'i3', or 'c1' for a control. */
  readonly name: string
  readonly method: string
  /** Evaluations. */
  readonly committed: number
  /** Evaluations. */
  readonly proposed: number
  readonly simulations: number
  /** Simulations. */
  readonly quota: number
  readonly epoch: number
  readonly state: 'searching' | 'waiting' | 'ended'
  /** Why it waits, such as 'for emigrants of i2', or how it ended. */
  readonly because?: string
  readonly best?: BestView
  /** 0 (all alike) to 1. */
  readonly diversity?: number
}

export interface ProgressView {
  readonly state: SearchState
  /** Why it is paused or stopped, as part of a sentence. */
  readonly because?: string
  readonly name: string
  /** Folder of the record. */
  readonly record: string
  readonly recordVersion: number
  readonly semantics: number
  /** Evaluations, controls not counted. */
  readonly committed: number
  /** Evaluations, controls not counted. */
  readonly proposed: number
  /** Controls not counted. */
  readonly simulations: number
  /** Simulations, controls not counted. */
  readonly budget: number
  readonly failedSimulations: number
  /** Evaluations given up after their last try. */
  readonly setAside: number
  readonly best?: BestView
  readonly islands: readonly IslandView[]
  readonly controls: readonly IslandView[]
  /** Hex; the search digest: the hash of the island digests in id order. */
  readonly digest: string
  /** 'none', or the facts of the world that entered, each a sentence. */
  readonly purity: 'none' | readonly string[]
  /** Of the running coordinator; absent when none runs. Controls counted: they use the same cores. */
  readonly rate?: {
    readonly simulationsPerSecond: number
    readonly busyFraction: number
    readonly cores: number
    /** Of everything that is left, controls too. */
    readonly secondsLeft?: number
  }
}
