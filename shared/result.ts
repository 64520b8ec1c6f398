// What comes back from an evaluation, and how its individual is named.
//
// values: one row a simulation (replicate-major, then case), one column a declared number: objectives in
// order of declaration, then measures in order of declaration. Finite always, -0 never; the row of a failed
// simulation is all zeros and `failures` names it.

export interface SimulationFailure {
  /** Row in `values`. */
  readonly simulation: number
  /** For a person; at most limits.failureReasonLength characters, control characters removed. */
  readonly reason: string
}

export interface EvaluationResult {
  readonly values: Float64Array
  readonly failures: readonly SimulationFailure[]
}

/** One piece of work: a block of replicates of one individual. */
export interface WorkItem {
  readonly island: number
  /** Number of the evaluation on its island, 1, 2, ... in order of proposal. */
  readonly evaluation: number
  /** Id of the individual (see ids.ts). */
  readonly individual: number
  readonly firstReplicate: number
  readonly replicates: number
  /** Canonical bytes of the genome (encodings.ts). */
  readonly genome: Uint8Array
  readonly expectedCost: number
  /** Which try this is, from 1. Results count whatever their try; tries serve leases and blame only. */
  readonly attempt: number
  readonly purpose: 'evaluate' | 'confirm'
  /** 'alone': in a process of its own, because shared ones died with it. */
  readonly isolation: 'shared' | 'alone'
  /** Workers that must not do it: they have simulated it already, or are shut out. */
  readonly avoid: readonly string[]
  /** Hosts that must not do it. A dispatcher without any other answers with a loss of cause 'handed-back'. */
  readonly avoidHosts?: readonly string[]
  /** Only on this class of processor. */
  readonly onProcessor?: string
  /** An earlier try is still under way and takes too long: for another worker than the one that has that. */
  readonly hedge?: true
}

/** Who simulated: for the record, blame and confirmation. */
export interface Executor {
  readonly kind: 'thread' | 'process'
  /** Unique within the record, e.g. 'host-a/4711/t2'. */
  readonly worker: string
  readonly host: string
  /** Class of its processor: within one, honest machines agree to the bit. */
  readonly processor?: string
  /** Version of the program that simulated, where it is known. */
  readonly skerry?: string
}

/** A machine that can simulate now. */
export interface FleetHost {
  readonly host: string
  readonly processor: string
  readonly cores: number
}

/** How an evaluation was lost, and whether that can be the evaluation's own doing. */
export type LossCause = 'died' | 'time-limit' | 'memory' | 'agent-lost' | 'handed-back'

export type DispatchFact =
  | {
      readonly kind: 'result'
      readonly item: Pick<WorkItem, 'island' | 'evaluation' | 'attempt' | 'purpose'>
      readonly result: EvaluationResult
      /** SHA-256 over canonical bytes of the result (digests.ts). */
      readonly digest: Uint8Array
      readonly executor: Executor
      readonly cpuSeconds: number
      readonly wallSeconds: number
    }
  | {
      readonly kind: 'lost'
      readonly item: Pick<WorkItem, 'island' | 'evaluation' | 'attempt' | 'purpose' | 'isolation'>
      readonly cause: LossCause
      /** Last words of the process, for the post-mortem. */
      readonly detail: string
      readonly executor: Executor
    }
  /** Which machines there are now; said at the start and whenever it changes. Never by a dispatcher of one machine. */
  | { readonly kind: 'fleet'; readonly hosts: readonly FleetHost[] }
