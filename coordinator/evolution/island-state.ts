// What an island consists of, as plain structured-cloneable data: its counters, and the snapshot that a restart goes
// on from. Individuals stand once in a snapshot and are referred to by position: two copies of one individual (a
// resident and one that came back) may differ, so ids would not do.

import type { EvaluationResult } from '../../shared/result.js'
import type { RunningDigestState } from './running-digest.js'
import type { Ticket } from './tickets.js'
import type { Individual } from './types.js'

/** Numbers of an island that change with commits and proposals; plain data. */
export interface Counters {
  births: number
  evaluations: number
  proposedSimulations: number
  commits: number
  committedSimulations: number
  /** Sum of expected costs of the commits; divided by the lookahead it is the island's time in rounds. */
  costCommitted: number
  /** Virtual time of the last commit (order 'cost'). */
  virtualTime: number
  /** Last epoch whose work is done. */
  epochsPassed: number
  /** Island cost at the start of epoch 1; moves only when an ended island is set going again. */
  epochOriginCost: number
  /** Last epoch whose emigrants were taken in; at most one ahead of epochsPassed. */
  epochsReceived: number
  failedSimulations: number
  topUps: number
  /** Facts of the world that entered since the last commit, and while the present epoch's end was waited for. */
  factsWaiting: number
  factsSending: number
  /** Island cost at which the present best became the best. */
  bestSinceCost: number
}

/** A result that turned out wrong after it was committed, put right from a stated commit on. */
export interface Amendment {
  readonly individual: number
  readonly firstReplicate: number
  readonly result: EvaluationResult
}

export interface IslandState {
  readonly counters: Counters
  readonly digest: RunningDigestState
  readonly quota: number
  readonly mostReplicates: number
  readonly ended: boolean
  readonly paused: boolean
  readonly individuals: readonly Individual[]
  /** Positions in `individuals`. */
  readonly held: readonly number[]
  readonly best: number
  readonly topUpQueue: readonly number[]
  readonly tickets: readonly (Omit<Ticket, 'individual'> & { readonly individual: number })[]
  readonly amendments: readonly Amendment[]
  readonly bestScores: Float64Array
  readonly machine: unknown
}

export function newCounters(): Counters {
  return {
    births: 0,
    evaluations: 0,
    proposedSimulations: 0,
    commits: 0,
    committedSimulations: 0,
    costCommitted: 0,
    virtualTime: 0,
    epochsPassed: 0,
    epochOriginCost: 0,
    epochsReceived: 0,
    failedSimulations: 0,
    topUps: 0,
    factsWaiting: 0,
    factsSending: 0,
    bestSinceCost: 0,
  }
}

/** Gives every individual one position, in the order in which they are asked for. */
export class Positions {
  readonly individuals: Individual[] = []
  readonly #positions = new Map<Individual, number>()

  of(individual: Individual): number {
    const known = this.#positions.get(individual)
    if (known !== undefined) return known
    this.#positions.set(individual, this.individuals.length)
    return this.individuals.push(individual) - 1
  }
}
