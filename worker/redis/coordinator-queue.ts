// The coordinator's side of the queue server: two connections, one for commands and one that waits for results.
// Every call refuses with 'queue-unreachable' (or why it never will work) when nobody answers in time.
//
// It fits the port of coordinator/dispatch/redis/port.ts; the two are joined in coordinator/main.ts.

import { type Answers, decodeAnswers, type Job, Malformed } from '../../shared/cluster/codec.js'
import {
  agentsKey,
  openQueue,
  queueOf,
  resultsGroup,
  searchesKey,
  searchKeys,
} from '../../shared/cluster/keys.js'
import {
  type Announcement,
  announcementSchema,
  type Heartbeat,
  heartbeatSchema,
} from '../../shared/cluster/messages.js'
import type { ClusterTimes } from '../../shared/cluster/times.js'
import type { RedisAddress } from './address.js'
import { Link } from './link.js'
import { idOf, keysOf, Queues } from './queues.js'
import { Reader, readOne } from './reading.js'
import { checkServer } from './server.js'

export interface CoordinatorQueueOptions {
  readonly address: RedisAddress
  readonly prefix: string
  /** Key name of the search. */
  readonly search: string
  readonly times: ClusterTimes
  /** Take a Redis that other machines reach without a password. */
  readonly unprotected: boolean
}

interface Place {
  readonly dispatch: number
  readonly agent?: string
}

/** The one consumer of the results: a later coordinator of the search reads on where an earlier one stopped. */
const consumer = 'holder'
const deliveriesMost = 256
const scanCount = 1000
/** Results that an interrupted search leaves in Redis are forgotten after so long. */
const leftoverMs = 7 * 86_400_000

export class RedisCoordinatorQueue {
  readonly #options: CoordinatorQueueOptions
  readonly #keys: ReturnType<typeof searchKeys>
  readonly #link: Link
  readonly #waiting: Link
  readonly #queues: Queues
  readonly #heartbeats = new Reader(heartbeatSchema)
  /** Queues that were told how few events to keep, since the last beginning. */
  #told = new Set<string>()
  /** Deliveries of an earlier reader, or of an earlier connection, are read before new ones. */
  #pendingFrom: string | undefined = '0'
  #connections = 0

  constructor(options: CoordinatorQueueOptions) {
    this.#options = options
    const { address, prefix, search, times } = options
    this.#keys = searchKeys(prefix, search)
    const name = `${prefix}:coordinator`
    this.#link = new Link({ address, times, name })
    this.#waiting = new Link({ address, times, name: `${name}:waits` })
    this.#queues = new Queues(this.#link, times.leaseMs)
  }

  async open(): Promise<void> {
    await this.#link.open()
    try {
      await checkServer(this.#link, this.#options)
      await this.#queues.open()
      await this.#waiting.open()
    } catch (fault) {
      await this.close()
      throw fault
    }
  }

  async announce(announcement: Announcement): Promise<void> {
    const { prefix, search } = this.#options
    await this.#link.run((client) => client.hset(searchesKey(prefix), search, JSON.stringify(announcement)))
  }

  async withdraw(): Promise<void> {
    const { prefix, search } = this.#options
    const { instance, plugin, results } = this.#keys
    await this.#link.run((client) => client.hdel(searchesKey(prefix), search))
    await this.#removeQueues()
    const left = await this.#link.run((client) => client.xlen(results))
    await this.#link.run((client) =>
      left === 0 ? client.unlink(instance, plugin, results) : client.pexpire(results, leftoverMs),
    )
  }

  async announced(search: string): Promise<Announcement | undefined> {
    const text = await this.#link.run((client) => client.hget(searchesKey(this.#options.prefix), search))
    return readOne(announcementSchema, text)
  }

  async putPlugin(bytes: Uint8Array): Promise<void> {
    await this.#link.run((client) => client.set(this.#keys.plugin, Buffer.from(bytes)), bytes.length)
  }

  async instance(): Promise<string | undefined> {
    return (await this.#link.run((client) => client.get(this.#keys.instance))) ?? undefined
  }

  /** Everything of this search but its results is removed; the results are of use whenever they were sent. */
  async begin(instance: string): Promise<void> {
    await this.#removeQueues()
    this.#told = new Set()
    this.#pendingFrom = '0'
    await this.#makeGroup()
    await this.#link.run((client) => client.persist(this.#keys.results))
    // Last: with the new instance in place, everything else is.
    await this.#link.run((client) => client.set(this.#keys.instance, instance))
  }

  async #makeGroup(): Promise<void> {
    await this.#link.run((client) =>
      client.xgroup('CREATE', this.#keys.results, resultsGroup, '0', 'MKSTREAM').catch((fault: Error) => {
        if (!fault.message.startsWith('BUSYGROUP')) throw fault
      }),
    )
  }

  async add(
    jobs: readonly { readonly job: Job; readonly agent?: string; readonly urgent: boolean }[],
  ): Promise<void> {
    const groups = new Map<string, { queue: string; urgent: boolean; jobs: Job[] }>()
    for (const { job, agent, urgent } of jobs) {
      const queue = agent === undefined ? openQueue : queueOf(agent)
      const name = `${queue} ${urgent}`
      const group = groups.get(name) ?? { queue, urgent, jobs: [] }
      groups.set(name, group)
      group.jobs.push(job)
    }
    const { queues } = this.#keys
    await Promise.all(
      [...groups.values()].map(async (group) => {
        await this.#tell(group.queue)
        await this.#queues.add(queues, group.queue, group.jobs, group.urgent)
      }),
    )
  }

  async #tell(queue: string): Promise<void> {
    if (this.#told.has(queue)) return
    await this.#queues.keepFewEvents(this.#keys.queues, queue)
    this.#told.add(queue)
  }

  async remove(jobs: readonly Place[]): Promise<void> {
    for (const [queue, group] of byQueue(jobs))
      await this.#queues.remove(
        this.#keys.queues,
        queue,
        group.map(({ dispatch }) => dispatch),
      )
  }

  async states(jobs: readonly Place[]): Promise<('waiting' | 'active' | 'done' | 'gone')[]> {
    const contents = new Map<string, { waiting: Set<number>; active: Set<number> }>()
    for (const queue of byQueue(jobs).keys()) {
      const { waiting, active } = await this.#queues.contents(this.#keys.queues, queue)
      contents.set(queue, { waiting: new Set(waiting), active: new Set(active) })
    }
    return jobs.map(({ dispatch, agent }) => {
      const { waiting, active } = contents.get(agent === undefined ? openQueue : queueOf(agent))!
      if (waiting.has(dispatch)) return 'waiting'
      return active.has(dispatch) ? 'active' : 'gone'
    })
  }

  async deliveries(
    waitMs: number,
  ): Promise<{ receipt: string; answers: Answers | undefined; complaint?: string }[]> {
    // After a lost connection, what it had been given may never have arrived here.
    if (this.#waiting.connections !== this.#connections) {
      this.#connections = this.#waiting.connections
      this.#pendingFrom = '0'
    }
    if (this.#pendingFrom !== undefined) {
      const left = await this.#read(this.#pendingFrom, 0)
      this.#pendingFrom = left.at(-1)?.receipt
      if (left.length > 0) return left
    }
    const blockMs = Math.max(1, Math.min(waitMs, this.#options.times.commandMs / 2))
    return this.#read('>', Math.round(blockMs))
  }

  async #read(from: string, blockMs: number): Promise<{ receipt: string; answers: Answers | undefined }[]> {
    const block = blockMs > 0 ? ['BLOCK', blockMs] : []
    const words = ['GROUP', resultsGroup, consumer, 'COUNT', deliveriesMost, ...block, 'STREAMS']
    const read = (): Promise<unknown> =>
      this.#waiting.run((client) => client.callBuffer('XREADGROUP', ...words, this.#keys.results, from))
    return entriesOf(await read()).map(({ id, bytes }) => ({ receipt: id, ...decoded(bytes) }))
  }

  async acknowledge(receipts: readonly string[]): Promise<void> {
    if (receipts.length === 0) return
    const { results } = this.#keys
    await this.#link.run((client) =>
      Promise.all([client.xack(results, resultsGroup, ...receipts), client.xdel(results, ...receipts)]),
    )
  }

  async agents(): Promise<Heartbeat[]> {
    const texts = await this.#link.run((client) => client.hgetall(agentsKey(this.#options.prefix)))
    return this.#heartbeats.read(texts)
  }

  async forgetAgent(agent: string): Promise<void> {
    await this.#link.run((client) => client.hdel(agentsKey(this.#options.prefix), agent))
    await this.#removeQueue(queueOf(agent))
  }

  /** Takes everything of one queue out of Redis, jobs and all. */
  async #removeQueue(queue: string): Promise<void> {
    const { queues } = this.#keys
    const { waiting, active } = await this.#queues.contents(queues, queue)
    const { '': base = '', ...fixed } = keysOf(queues, queue)
    const jobs = [...waiting, ...active].flatMap((dispatch) => [
      base + idOf(dispatch),
      `${base}${idOf(dispatch)}:lock`,
    ])
    await this.#link.run((client) => client.unlink(...Object.values(fixed), ...jobs))
    this.#told.delete(queue)
    this.#queues.forget(queues, queue)
  }

  /** All queues of the search, those of agents that are long gone as well. */
  async #removeQueues(): Promise<void> {
    const { queues } = this.#keys
    const names = ['work', 'to-*'].map((queue) => `${escaped(queues)}:${queue}:*`)
    for (const pattern of names) {
      let cursor = '0'
      do {
        const [next, found] = await this.#link.run((client) =>
          client.scan(cursor, 'MATCH', pattern, 'COUNT', scanCount),
        )
        if (found.length > 0) await this.#link.run((client) => client.unlink(...found))
        cursor = next
      } while (cursor !== '0')
    }
  }

  async close(): Promise<void> {
    this.#link.close()
    this.#waiting.close()
  }
}

function byQueue(jobs: readonly Place[]): Map<string, Place[]> {
  const groups = new Map<string, Place[]>()
  for (const job of jobs) {
    const queue = job.agent === undefined ? openQueue : queueOf(job.agent)
    const group = groups.get(queue)
    if (group) group.push(job)
    else groups.set(queue, [job])
  }
  return groups
}

/** The characters that mean something in a pattern of SCAN cannot stand in our names; the prefix is anybody's. */
function escaped(text: string): string {
  return text.replace(/[\\*?[\]^-]/g, '\\$&')
}

/** [[stream, [[id, [field, value, ...]], ...]]] or null, as the server sends it. Entries that were deleted have no fields. */
function entriesOf(reply: unknown): { id: string; bytes: Uint8Array | undefined }[] {
  if (!Array.isArray(reply)) return []
  return reply.flatMap((stream) => {
    const entries: unknown = Array.isArray(stream) ? stream[1] : undefined
    if (!Array.isArray(entries)) return []
    return entries.map((entry: [Buffer, Buffer[] | null]) => {
      const at = entry[1]?.findIndex((field, i) => i % 2 === 0 && field.toString() === 'b') ?? -1
      return { id: entry[0].toString(), bytes: at < 0 ? undefined : entry[1]?.[at + 1] }
    })
  })
}

function decoded(bytes: Uint8Array | undefined): { answers: Answers | undefined; complaint?: string } {
  if (bytes === undefined) return { answers: undefined, complaint: 'an entry without bytes' }
  try {
    return { answers: decodeAnswers(bytes) }
  } catch (fault) {
    if (!(fault instanceof Malformed)) throw fault
    return { answers: undefined, complaint: fault.message }
  }
}
