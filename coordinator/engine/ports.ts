// What the engine needs of the world: a record that keeps, a dispatcher that simulates. Adapters live in
// coordinator/record and coordinator/dispatch; tests have their own. Types only.

import type { DispatchFact, EvaluationResult, WorkItem } from '../../shared/result.js'
import type { Individual } from '../evolution/types.js'

// ------------------------------------------------------------------------------------------- record

/** A result as it arrived; durable before anything else happens with it. */
export interface ArrivalRow {
  readonly island: number
  readonly evaluation: number
  readonly worker: string
  readonly host: string
  /** Class of the processor, where it is known. */
  readonly processor?: string
  readonly attempt: number
  readonly cpuSeconds: number
  readonly result: EvaluationResult
  readonly digest: Uint8Array
}
/** The commit of one evaluation on an island; the last one of an island in an append carries its digest (32 bytes). */
export interface CommitRow {
  readonly island: number
  /** 1, 2, ... */
  readonly commit: number
  readonly evaluation: number
  /** The island's running digest right after this commit. */
  readonly digest?: Uint8Array
}
/** Individuals an island sent at the end of an epoch, or the word that it has ended. */
export interface MailRow {
  readonly island: number
  readonly epoch: number
  /** Commits of the sender when it sent. */
  readonly atCommit: number
  readonly ended: boolean
  readonly emigrants: readonly Individual[]
}
export interface BirthRow {
  readonly id: number
  readonly parents: readonly number[]
  readonly origin: string
  readonly atCommit: number
  readonly genome: Uint8Array
}
/** A second simulation of an evaluation: how it was confirmed, or that it was not. */
export interface ConfirmationRow {
  readonly island: number
  readonly evaluation: number
  readonly worker: string
  readonly host: string
  readonly processor?: string
  readonly by: 'process' | 'host'
  readonly digest: Uint8Array
  readonly agrees: boolean
}
/**
 * A fact of the world, in a plain sentence. Those with `changesSearch` count against the search's purity and
 * are replayed at `atCommit` of their island (or at `epoch` of every island when island is 0).
 */
export interface EventRow {
  readonly kind: string
  readonly island: number
  readonly atCommit: number
  readonly epoch: number
  readonly changesSearch: boolean
  readonly sentence: string
  /** JSON value with what a replay needs. */
  readonly data: unknown
}
/** Everything one transaction makes durable, in order of the fields. */
export interface Append {
  readonly arrivals: readonly ArrivalRow[]
  readonly confirmations: readonly ConfirmationRow[]
  readonly births: readonly BirthRow[]
  readonly commits: readonly CommitRow[]
  readonly mail: readonly MailRow[]
  readonly events: readonly EventRow[]
  readonly snapshots: readonly SnapshotRow[]
}
/** An island's whole state after a commit: a cache, so that a restart need not replay from the start. */
export interface SnapshotRow {
  readonly island: number
  readonly commit: number
  readonly digest: Uint8Array
  /** Structured-cloneable. */
  readonly state: unknown
}

/** The write side: one writer, fenced. Throws a Refusal when the disk is full, broken, or another has taken over. */
export interface Journal {
  /**
   * All or nothing, durable on return. A second arrival of one evaluation replaces the first (a result that a
   * confirmation overruled); that is the engine's decision and comes with an event.
   */
  append(rows: Append): void
}
/** The read side, for recovery, rederive and reports. */
export interface RecordReader {
  /** Newest snapshot of the island at or before `atMost` whose checksum holds. */
  snapshot(island: number, atMost?: number): SnapshotRow | undefined
  /** Commits after `after`, ascending. Only the last of each stored segment carries the digest. */
  commits(
    island: number,
    after: number,
  ): Iterable<{ readonly commit: number; readonly evaluation: number; readonly digest?: Uint8Array }>
  lastCommit(island: number): { readonly commit: number; readonly digest: Uint8Array } | undefined
  arrival(island: number, evaluation: number): ArrivalRow | undefined
  mail(island: number, epoch: number): MailRow | undefined
  lastMail(island: number): MailRow | undefined
  events(): Iterable<EventRow & { readonly sequence: number }>
  isConfirmed(island: number, evaluation: number): boolean
  /** Every second simulation of an evaluation, in order of arrival. */
  confirmations(island: number, evaluation: number): readonly ConfirmationRow[]
  arrivalsOf(worker: string): Iterable<{ readonly island: number; readonly evaluation: number }>
  birth(id: number): BirthRow | undefined
  /** Sums over everything that arrived. */
  totals(): { readonly arrivals: number; readonly cpuSeconds: number }
}

// ----------------------------------------------------------------------------------------- dispatch

export interface DispatchStatus {
  /** Simulations that can run at once. */
  readonly slots: number
  /** Items handed over and not yet answered. */
  readonly outstanding: number
  /** How many more items should be submitted to keep everybody busy. */
  readonly wanted: number
}
/** Hands work to CPUs. Answers every submitted item at least once, with a result or a loss, in any order. */
export interface Dispatcher {
  start(): Promise<void>
  submit(items: readonly WorkItem[]): void
  /** Facts since the last call; waits for the first one at most `waitMs` and may then be empty. */
  facts(waitMs: number): Promise<DispatchFact[]>
  status(): DispatchStatus
  /** Stops taking work and ends everything it started, within a bounded time. */
  close(): Promise<void>
}
