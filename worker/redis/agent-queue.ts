// The agent's side of the queue server: two connections, one for commands and one that waits, whatever the number of
// searches. Every call refuses with 'queue-unreachable' (or why it never will work) when nobody answers in time;
// only waitForWork() then waits its time out instead, so that a loop around it does not spin.

import { randomBytes } from 'node:crypto'
import { type Answers, encodeAnswers } from '../../shared/cluster/codec.js'
import { agentsKey, openQueue, queueOf, searchesKey, searchKeys } from '../../shared/cluster/keys.js'
import { type Announcement, type Heartbeat, heardAnnouncementSchema } from '../../shared/cluster/messages.js'
import type { ClusterTimes } from '../../shared/cluster/times.js'
import type { AgentQueue, TakenJob } from '../cluster/port.js'
import type { RedisAddress } from './address.js'
import { Link } from './link.js'
import { markerOf, Queues } from './queues.js'
import { Reader } from './reading.js'
import { Tokens } from './tokens.js'

export interface AgentQueueOptions {
  readonly address: RedisAddress
  readonly prefix: string
  /** Name of the agent, part of its keys. */
  readonly agent: string
  readonly times: ClusterTimes
}

/** How long an empty queue of the agent's own may go unasked while there is other work. */
const ownEmptyMs = 50

/** Agents that come back a second: so many connections a server takes without a storm. */
const returnsPerMs = 0.16

/** An agent's queue over Redis. */
export class RedisAgentQueue implements AgentQueue {
  readonly #options: AgentQueueOptions
  readonly #link: Link
  readonly #waiting: Link
  readonly #queues: Queues
  readonly #tokens: Tokens
  readonly #announcements = new Reader(heardAnnouncementSchema)
  #fleet = 1
  readonly #ownEmptyUntilMs = new Map<string, number>()
  #closed = false

  constructor(options: AgentQueueOptions) {
    this.#options = options
    const { address, prefix, agent, times } = options
    const spreadMs = () => Math.min(times.reconnectSpreadMs * 1.2, this.#fleet / returnsPerMs)
    const name = `${prefix}:agent:${agent}`.replace(/\s/g, '-')
    this.#link = new Link({ address, times, name, spreadMs })
    this.#waiting = new Link({ address, times, name: `${name}:waits`, spreadMs })
    this.#queues = new Queues(this.#link, times.leaseMs)
    this.#tokens = new Tokens(this.#link, prefix, times.leaseMs)
  }

  get connected(): boolean {
    return this.#link.connected
  }

  async open(): Promise<void> {
    await this.#link.open()
    try {
      await this.#queues.open()
      await this.#waiting.open()
    } catch (fault) {
      this.#link.close()
      throw fault
    }
  }

  async searches(): Promise<Announcement[]> {
    const texts = await this.#link.run((client) => client.hgetall(searchesKey(this.#options.prefix)))
    return this.#announcements.read(texts)
  }

  async plugin(search: string): Promise<Uint8Array | undefined> {
    const { plugin } = this.#keys(search)
    const length = await this.#link.run((client) => client.strlen(plugin))
    const bytes = await this.#link.run((client) => client.getBuffer(plugin), length)
    return bytes ?? undefined
  }

  async take(search: string): Promise<TakenJob | undefined> {
    const own = queueOf(this.#options.agent)
    // The agent's own queue comes first; where much is taken in a row it is not asked before each job.
    const isKnownEmpty = (this.#ownEmptyUntilMs.get(search) ?? 0) > performance.now()
    const order = isKnownEmpty ? [openQueue, own] : [own, openQueue]
    for (const queue of order) {
      const taken = await this.#takeFrom(search, queue)
      if (taken !== undefined) return taken
      if (queue === own) this.#ownEmptyUntilMs.set(search, performance.now() + ownEmptyMs)
    }
    return undefined
  }

  async #takeFrom(search: string, queue: string): Promise<TakenJob | undefined> {
    const { queues } = this.#keys(search)
    for (;;) {
      const token = randomBytes(12).toString('hex')
      const taken = await this.#queues.take(queues, queue, token)
      if (!taken) return undefined
      if (taken.job?.header.search === search) return { job: taken.job, id: taken.id, token, queue }
      // Nobody can read it, or it belongs elsewhere: out with it. Its coordinator will find that it is gone.
      await this.#queues.finish(queues, queue, taken.id, token)
    }
  }

  async waitForWork(searches: readonly string[], waitMs: number): Promise<boolean> {
    const untilMs = performance.now() + waitMs
    const own = queueOf(this.#options.agent)
    const markers = searches.flatMap((search) => {
      const { queues } = this.#keys(search)
      return [markerOf(queues, own), markerOf(queues, openQueue)]
    })
    while (!this.#closed) {
      const leftMs = untilMs - performance.now()
      if (leftMs <= 0) return false
      if (markers.length === 0 || !this.#waiting.connected) {
        await pause(Math.min(leftMs, this.#options.times.commandMs / 10))
        continue
      }
      // Shorter than a command may take, so that a frozen server is noticed here as well.
      const blockSeconds = Math.min(leftMs, this.#options.times.commandMs / 2) / 1000
      try {
        const popped = await this.#waiting.run((client) =>
          client.bzpopmin(...markers, Math.max(0.01, blockSeconds)),
        )
        if (popped) return true
      } catch {
        // The link makes another connection; until then the time passes above.
      }
    }
    return false
  }

  async renew(jobs: readonly TakenJob[]): Promise<readonly TakenJob[]> {
    const groups = grouped(jobs)
    const lost: TakenJob[] = []
    for (const held of groups.values()) {
      const { queue, job } = held[0]!
      const ids = new Set(await this.#queues.renew(this.#keys(job.header.search).queues, queue, held))
      lost.push(...held.filter(({ id }) => ids.has(id)))
    }
    return lost
  }

  async answer(search: string, answers: Answers): Promise<void> {
    const { results } = this.#keys(search)
    const bytes = Buffer.from(encodeAnswers(answers))
    await this.#link.run((client) => client.xadd(results, '*', 'b', bytes), bytes.length)
  }

  async finish({ job, queue, id, token }: TakenJob): Promise<void> {
    await this.#queues.finish(this.#keys(job.header.search).queues, queue, id, token)
  }

  async handBack({ job, queue, id, token }: TakenJob): Promise<void> {
    await this.#queues.handBack(this.#keys(job.header.search).queues, queue, id, token)
  }

  async beat(heartbeat: Heartbeat): Promise<void> {
    const key = agentsKey(this.#options.prefix)
    const [, fleet] = await this.#link.run((client) =>
      Promise.all([client.hset(key, heartbeat.agent, JSON.stringify(heartbeat)), client.hlen(key)]),
    )
    this.#fleet = Math.max(1, fleet)
  }

  takeTokens(
    tokens: Readonly<Record<string, number>>,
    limits: Readonly<Record<string, number>>,
  ): Promise<string | undefined> {
    return this.#tokens.take(tokens, limits)
  }

  renewTokens(receipt: string): Promise<boolean> {
    return this.#tokens.renew(receipt)
  }

  returnTokens(receipt: string): Promise<void> {
    return this.#tokens.giveBack(receipt)
  }

  async leave(agent: string): Promise<void> {
    await this.#link.run((client) => client.hdel(agentsKey(this.#options.prefix), agent))
  }

  async close(): Promise<void> {
    this.#closed = true
    this.#link.close()
    this.#waiting.close()
  }

  #keys(search: string) {
    return searchKeys(this.#options.prefix, search)
  }
}

const placeOf = ({ job, queue }: TakenJob): string => `${job.header.search} ${queue}`

function grouped(jobs: readonly TakenJob[]): Map<string, TakenJob[]> {
  const groups = new Map<string, TakenJob[]>()
  for (const job of jobs) {
    const group = groups.get(placeOf(job))
    if (group) group.push(job)
    else groups.set(placeOf(job), [job])
  }
  return groups
}

function pause(ms: number): Promise<void> {
  return new Promise((resolve) => {
    setTimeout(resolve, Math.max(1, ms))
  })
}
