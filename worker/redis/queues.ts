// The queues of BullMQ over one connection of ours: as many as there are searches and agents, none with a connection
// or a timer of its own. BullMQ keeps the order, the locks and the markers that wake who waits; leases, retries and
// the search for lost work are the coordinator's (coordinator/dispatch/redis).
//
// A job is named d<dispatch>; ids of BullMQ may not be plain numbers. Its data are the bytes of the job in base64,
// because the queue's scripts hand texts on.

import { QueueKeys, RedisConnection, RedisQueueBackend } from 'bullmq'
import { check } from '../../shared/check.js'
import { decodeJob, encodeJob, type Job, Malformed } from '../../shared/cluster/codec.js'
import type { Link } from './link.js'

/** What the scripts write about every move; nobody here reads it, so little is kept. */
const eventsKept = 10

/** A job as it lies in a queue. */
export interface QueuedJob {
  readonly id: string
  /** Undefined where the bytes are not those of a job. */
  readonly job: Job | undefined
  readonly complaint?: string
}

/** Codes of BullMQ's scripts: the job, its lock, its place among the active ones, or its holder is not what was said. */
const lostLock = /Missing (lock|key) for job|is not in the active state|Lock mismatch/

export class Queues {
  readonly #link: Link
  readonly #leaseMs: number
  #connection: RedisConnection | undefined
  readonly #backends = new Map<string, RedisQueueBackend>()

  constructor(link: Link, leaseMs: number) {
    this.#link = link
    this.#leaseMs = leaseMs
  }

  /** Once, on an open link. */
  async open(): Promise<void> {
    const connection = new RedisConnection(this.#link.client, {
      shared: true,
      blocking: false,
      skipVersionCheck: true,
    })
    // Errors of the connection are the link's.
    connection.on('error', () => {})
    await this.#link.run(() => connection.client)
    this.#connection = connection
  }

  /** Adds jobs in this order; `first`: before all that wait. A job that is there already is left as it is. */
  async add(prefix: string, queue: string, jobs: readonly Job[], first: boolean): Promise<void> {
    const backend = this.#backend(prefix, queue)
    // Where each goes before the one added last, the last one added goes first.
    const entries = (first ? jobs.toReversed() : jobs).map((job) => ({
      jobId: idOf(job.header.dispatch),
      job: {
        id: idOf(job.header.dispatch),
        name: 'j',
        data: Buffer.from(encodeJob(job)).toString('base64'),
        opts: { attempts: 1, removeOnComplete: true, removeOnFail: true, ...(first ? { lifo: true } : {}) },
        progress: 0,
        attemptsMade: 0,
        attemptsStarted: 0,
        timestamp: 0,
        failedReason: '',
        returnvalue: '',
        stalledCounter: 0,
      },
    }))
    const bytes = entries.reduce((sum, { job }) => sum + job.data.length, 0)
    await this.#link.run(() => backend.addJobs(entries), bytes)
  }

  /** Takes the next job under a lock of that token; undefined when none waits. */
  async take(prefix: string, queue: string, token: string): Promise<QueuedJob | undefined> {
    const backend = this.#backend(prefix, queue)
    const [data, id] = await this.#link.run(() => backend.moveToActive(token))
    if (!data) return undefined
    return { id: String(id), ...decoded(String(data.data)) }
  }

  async finish(prefix: string, queue: string, id: string, token: string): Promise<void> {
    const backend = this.#backend(prefix, queue)
    await this.#link.run(() =>
      forgiving(backend.moveToCompleted({ id, opts: {} } as never, '0', true, token, false)),
    )
  }

  async handBack(prefix: string, queue: string, id: string, token: string): Promise<void> {
    const backend = this.#backend(prefix, queue)
    await this.#link.run(() => forgiving(backend.moveJobFromActiveToWait(id, token)))
  }

  /** Renews the locks; answers the ids of those that are lost. */
  async renew(
    prefix: string,
    queue: string,
    held: readonly { id: string; token: string }[],
  ): Promise<string[]> {
    const backend = this.#backend(prefix, queue)
    const ids = held.map(({ id }) => id)
    const tokens = held.map(({ token }) => token)
    return this.#link.run(() => backend.extendLocks(ids, tokens, this.#leaseMs))
  }

  /** Takes jobs out that nobody has a lock on, wherever they stand. */
  async remove(prefix: string, queue: string, dispatches: readonly number[]): Promise<void> {
    const backend = this.#backend(prefix, queue)
    await this.#link.run(() =>
      Promise.all(dispatches.map((dispatch) => backend.remove(idOf(dispatch), false))),
    )
  }

  /** Dispatch numbers of all that waits and of all that was taken and not finished. */
  async contents(prefix: string, queue: string): Promise<{ waiting: number[]; active: number[] }> {
    const { wait, active } = keysOf(prefix, queue)
    const [waiting, taken] = await this.#link.run((client) =>
      Promise.all([client.lrange(wait!, 0, -1), client.lrange(active!, 0, -1)]),
    )
    return { waiting: dispatchesOf(waiting), active: dispatchesOf(taken) }
  }

  #backend(prefix: string, queue: string): RedisQueueBackend {
    const name = `${prefix}:${queue}`
    const known = this.#backends.get(name)
    if (known) return known
    check(this.#connection !== undefined, 'queues are used after they were opened')
    const keys = new QueueKeys(prefix)
    const backend = new RedisQueueBackend(
      this.#connection,
      queue,
      keys.getKeys(queue),
      (type) => keys.toKey(queue, type),
      { prefix, connection: this.#link.client, lockDuration: this.#leaseMs } as never,
      undefined,
      false,
    )
    backend.on('error', () => {})
    this.#backends.set(name, backend)
    return backend
  }

  /** Says how few events are kept of this queue; after a restart of Redis it must be said again. */
  async keepFewEvents(prefix: string, queue: string): Promise<void> {
    const { meta } = keysOf(prefix, queue)
    await this.#link.run((client) => client.hset(meta!, 'opts.maxLenEvents', eventsKept))
  }

  /** The queue is used no more; nothing is removed from Redis. */
  forget(prefix: string, queue: string): void {
    this.#backends.delete(`${prefix}:${queue}`)
  }
}

/** All keys of a queue that are not jobs. */
export function keysOf(prefix: string, queue: string): { readonly [type: string]: string } {
  return new QueueKeys(prefix).getKeys(queue)
}

/** Somebody waits on this key: the queue writes it when there is work. */
export function markerOf(prefix: string, queue: string): string {
  return keysOf(prefix, queue).marker!
}

export function idOf(dispatch: number): string {
  return `d${dispatch}`
}

function dispatchesOf(ids: readonly string[]): number[] {
  return ids.filter((id) => /^d\d{1,16}$/.test(id)).map((id) => Number(id.slice(1)))
}

function decoded(data: string): Pick<QueuedJob, 'job' | 'complaint'> {
  try {
    return { job: decodeJob(Buffer.from(data, 'base64')) }
  } catch (fault) {
    if (!(fault instanceof Malformed)) throw fault
    return { job: undefined, complaint: fault.message }
  }
}

/** A lost lock is no fault here: somebody else has the job, or nobody needs it any more. */
async function forgiving(move: Promise<unknown>): Promise<void> {
  try {
    await move
  } catch (fault) {
    if (!(fault instanceof Error) || !lostLock.test(fault.message)) throw fault
  }
}
