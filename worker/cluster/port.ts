// What an agent needs of the queue server; worker/redis implements it over Redis, tests over memory. Types only.

import type { Answers, Job } from '../../shared/cluster/codec.js'
import type { Announcement, Heartbeat } from '../../shared/cluster/messages.js'

/** A job an agent has taken: it must be finished or handed back, and its lease renewed meanwhile. */
export interface TakenJob {
  readonly job: Job
  /** The server's own number and the proof that we hold it. */
  readonly id: string
  readonly token: string
  readonly queue: string
}

export interface AgentQueue {
  /** Connects with at most three connections, whatever the number of searches. */
  open(): Promise<void>
  searches(): Promise<Announcement[]>
  plugin(search: string): Promise<Uint8Array | undefined>
  /** The next job of this search: first of the agent's own queue, then of the open one. Does not wait. */
  take(search: string): Promise<TakenJob | undefined>
  /** Resolves when one of these searches may have work (true), or after that time (false). */
  waitForWork(searches: readonly string[], waitMs: number): Promise<boolean>
  /** Renews leases; answers which of them are lost. */
  renew(jobs: readonly TakenJob[]): Promise<readonly TakenJob[]>
  /** Writes answers into the search's results; resolves when the server has them. */
  answer(search: string, answers: Answers): Promise<void>
  /** The job is over; the server forgets it. Harmless when the lease was lost. */
  finish(job: TakenJob): Promise<void>
  /** Puts the job back for others at once. */
  handBack(job: TakenJob): Promise<void>
  beat(heartbeat: Heartbeat): Promise<void>
  /** Takes so many of each token, all or nothing; undefined when there are not enough. Expires unless renewed. */
  takeTokens(
    tokens: Readonly<Record<string, number>>,
    limits: Readonly<Record<string, number>>,
  ): Promise<string | undefined>
  renewTokens(receipt: string): Promise<boolean>
  returnTokens(receipt: string): Promise<void>
  /** The agent is gone. */
  leave(agent: string): Promise<void>
  /** False while the server cannot be reached. */
  readonly connected: boolean
  close(): Promise<void>
}
