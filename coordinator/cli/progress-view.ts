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
  /** By another machine, or only by another process of the same machine; absent while it is not confirmed. */
  readonly confirmedBy?: 'process' | 'host'
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
  readonly state: 'searching' | 'waiting' | 'paused' | 'ended'
  /** Why it waits, such as 'for emigrants of i2', or how it ended. */
  readonly because?: string
  readonly best?: BestView
  /** Of those who may breed now; absent with fewer than two. */
  readonly population?: PopulationView
}

/** Statistics of a population. */
export interface PopulationView {
  readonly members: number
  /** Members that have a failed simulation; they are left out of the quantiles. */
  readonly failed: number
  /** In the objective's own direction and unit: least, quartile, median, quartile, greatest. */
  readonly objectives: readonly {
    readonly name: string
    readonly unit: string
    readonly quantiles: readonly [number, number, number, number, number]
  }[]
  /** Mean distance of two members, 0 (all alike) to 1, over the genome and for every part. */
  readonly diversity: { readonly mean: number; readonly parts: { readonly [part: string]: number } }
  /** Commits of the island since they were proposed, of those born here; absent when nobody was. */
  readonly ageCommits?: { readonly median: number; readonly oldest: number }
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
