// What the dispatcher needs of the queue server; worker/redis implements it over Redis, tests over memory. Types only.
// Every call is bounded in time and rejects with Unreachable-like refusals ('queue-unreachable') when the server does
// not answer; the dispatcher carries on and tries again.

import type { Answers, Job } from '../../../shared/cluster/codec.js'
import type { Announcement, Heartbeat } from '../../../shared/cluster/messages.js'

/** Answers of one agent as they lie in the results stream. */
export interface Delivery {
  /** To be acknowledged when what it says is durable. */
  readonly receipt: string
  /** Undefined where the bytes were malformed: `complaint` says how. */
  readonly answers: Answers | undefined
  readonly complaint?: string
}

/** Where a job stands: 'gone' when the server knows it no more. */
export type JobState = 'waiting' | 'active' | 'done' | 'gone'

export interface OutgoingJob {
  readonly job: Job
  /** Only this agent may take it; undefined: any. */
  readonly agent?: string
  /** Before everything else that waits. */
  readonly urgent: boolean
}

export interface CoordinatorQueue {
  /** Checks the server (version, eviction policy, protection) and connects. Refuses with what is wrong. */
  open(): Promise<void>
  /** Says that the search is here; written by the dispatcher every heartbeat. */
  announce(announcement: Announcement): Promise<void>
  /** The search of this name as somebody announced it. */
  announced(search: string): Promise<Announcement | undefined>
  /** Writes the pinned bundle where agents fetch it. */
  putPlugin(bytes: Uint8Array): Promise<void>
  /** Which filling of the server this is; undefined: it was emptied. */
  instance(): Promise<string | undefined>
  /** Empties what an earlier filling left of this search, and makes the queues anew under this instance. */
  begin(instance: string): Promise<void>
  add(jobs: readonly OutgoingJob[]): Promise<void>
  /** Removes jobs that nobody should begin any more; those that run are left. */
  remove(jobs: readonly { readonly dispatch: number; readonly agent?: string }[]): Promise<void>
  states(jobs: readonly { readonly dispatch: number; readonly agent?: string }[]): Promise<JobState[]>
  /** Waits at most so long for answers. */
  deliveries(waitMs: number): Promise<Delivery[]>
  acknowledge(receipts: readonly string[]): Promise<void>
  agents(): Promise<Heartbeat[]>
  /** Takes the agent out of the list: it is gone for good. */
  forgetAgent(agent: string): Promise<void>
  /** The search stands still: agents are told, results that are on their way are kept for whoever continues it. */
  withdraw(): Promise<void>
  close(): Promise<void>
}
