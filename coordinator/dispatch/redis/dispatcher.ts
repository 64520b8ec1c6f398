// The dispatcher of a cluster: work goes out through the queue server, answers come back through its results stream.
//
// The server is a pipe. Everything that is out is known here (book.ts), so that nothing depends on what the server
// remembers: when it was emptied, all of it is sent again under new numbers; when an agent falls silent, what it held
// is lost and told so; what vanished otherwise is found by a sweep. An answer is acknowledged when the caller has made
// it durable: at the call of facts() after the one that gave it.
//
// Three loops share the work: sending (at once), receiving (waits at the server), keeping (three looks a heartbeat).

import type { Announcement, Heartbeat } from '../../../shared/cluster/messages.js'
import { protocolVersion } from '../../../shared/cluster/messages.js'
import type { ClusterTimes } from '../../../shared/cluster/times.js'
import { Refusal, refuse } from '../../../shared/refusals.js'
import type { DispatchFact, WorkItem } from '../../../shared/result.js'
import type { Dispatcher, DispatchStatus } from '../../engine/ports.js'
import { Book, type SentJob } from './book.js'
import { type Clock, pause } from './clock.js'
import { type Counters, newCounters } from './counters.js'
import { Fleet, lookMs } from './fleet.js'
import { Inbox } from './inbox.js'
import { Intake, type Shape } from './intake.js'
import { JobPace } from './pace.js'
import type { CoordinatorQueue } from './port.js'
import { Sender } from './sender.js'

/** What the record's coordinator may change about its announcement while it runs. */
export type Orders = Partial<Pick<Announcement, 'shutOut' | 'draining' | 'share' | 'tokens'>>

/** What the announcement says of the search and does not change. */
export type SearchFacts = Omit<
  Announcement,
  'protocol' | 'instance' | 'beat' | 'waiting' | 'secondsPerCost' | 'shutOut' | 'draining'
>

export interface RedisDispatcherOptions {
  readonly queue: CoordinatorQueue
  readonly search: SearchFacts
  readonly plugin: Uint8Array
  readonly shape: Shape
  readonly times: ClusterTimes
  readonly clock: Clock
  /** A word nobody else has, for instances and numbers of dispatches. */
  readonly nonce: string
  /** How a worker is started, for people. */
  readonly workerCommand?: string
  readonly orders?: () => Orders
  /** Something a person should read once. */
  readonly tell?: (sentence: string) => void
}

/** Items a slot has ahead at least, so that answers can be taken in by the handful. */
const aheadLeast = 8
/** Refusals after which trying again cannot help. */
const fatal = new Set(['queue-access', 'queue-tls', 'queue-unfit', 'search-name-taken', 'protocol-mismatch'])

export class RedisDispatcher implements Dispatcher {
  readonly counters: Counters = newCounters()
  readonly #options: RedisDispatcherOptions
  readonly #book = new Book()
  readonly #fleet: Fleet
  readonly #pace: JobPace
  readonly #intake: Intake
  readonly #inbox: Inbox
  readonly #sender: Sender
  #closed = false
  /** Which filling of the server our jobs belong to; undefined while it must be begun anew. */
  #instance: string | undefined
  #fillings = 0
  #beat = 0
  #lastKeepMs = 0
  #lastAnnounceMs = 0
  #lastSweepMs = 0
  #startMs = 0
  #stalledMs: number | undefined
  #saidFleet: boolean | undefined
  #stopTimer: () => void = () => {}

  constructor(options: RedisDispatcherOptions) {
    this.#options = options
    this.#fleet = new Fleet(options.times)
    this.#pace = new JobPace(options.times.jobMs)
    this.#sender = this.#makeSender()
    this.#inbox = new Inbox(options.clock, async (receipts) => {
      await options.queue.acknowledge(receipts)
      this.#intake.acknowledged(receipts)
    })
    this.#intake = new Intake({
      search: options.search,
      shape: options.shape,
      book: this.#book,
      pace: this.#pace,
      counters: this.counters,
      isOurs: (dispatch) => this.#sender.isOurs(dispatch),
    })
  }

  #makeSender(): Sender {
    const { queue, search, nonce, clock, orders } = this.#options
    return new Sender({
      queue,
      search,
      nonce,
      clock,
      book: this.#book,
      fleet: this.#fleet,
      pace: this.#pace,
      counters: this.counters,
      instance: () => this.#instance,
      shutOut: () => orders?.().shutOut ?? [],
      unfit: (items) => this.#handBack(items),
      fault: (fault) => this.#hear(fault),
    })
  }

  /** @throws Refusal when the server cannot be reached or used, or the name of the search is taken. */
  async start(): Promise<void> {
    const { queue } = this.#options
    await queue.open()
    await this.#refuseTakenName()
    await this.#beginAnew()
    const news = this.#fleet.look(await queue.agents(), this.#nowMs())
    if (news.changed) this.#tellFleet()
    this.#startMs = this.#nowMs()
    this.#lastKeepMs = this.#nowMs()
    this.#lastSweepMs = this.#lastKeepMs
    void this.#receive()
    this.#keepLater()
  }

  submit(items: readonly WorkItem[]): void {
    if (items.length === 0) return
    this.#book.add(items)
    const { facts, receipts } = this.#intake.inherit(items)
    this.#inbox.give(facts, receipts)
    void this.#sender.send()
  }

  facts(waitMs: number): Promise<DispatchFact[]> {
    return this.#inbox.take(waitMs, () => this.#book.outstanding)
  }

  status(): DispatchStatus {
    const slots = this.#fleet.hosts().reduce((sum, { cores }) => sum + cores, 0)
    const { outstanding } = this.#book
    const depth = Math.max(1, slots) * Math.max(2 * this.#pace.usualLength(), aheadLeast)
    return { slots, outstanding, wanted: Math.max(0, depth - outstanding) }
  }

  /** Agents as they last said they were. */
  agents(): { readonly heartbeat: Heartbeat; readonly silent: boolean }[] {
    return this.#fleet.all()
  }

  async close(): Promise<void> {
    if (this.#closed) return
    this.#closed = true
    this.#stopTimer()
    this.#sender.close()
    this.#inbox.close()
    const { queue, times } = this.#options
    // A server that does not answer keeps nobody from leaving.
    await Promise.race([queue.withdraw().catch(() => {}), pause(this.#options.clock, times.handBackMs)])
    await queue.close()
  }

  // ------------------------------------------------------------------------------------ receiving

  async #receive(): Promise<void> {
    const { queue, times } = this.#options
    while (!this.#closed && !this.#inbox.failed) {
      try {
        const deliveries = await queue.deliveries(times.sweepMs)
        const { facts, receipts } = this.#intake.take(deliveries)
        if (facts.length > 0) this.#inbox.give(facts, receipts)
        else this.#inbox.drop(receipts)
      } catch (fault) {
        this.#hear(fault)
        await pause(this.#options.clock, Math.ceil(times.heartbeatMs / 4))
      }
    }
  }

  // -------------------------------------------------------------------------------------- keeping

  #keepLater(): void {
    if (this.#closed || this.#inbox.failed) return
    this.#stopTimer = this.#options.clock.after(lookMs(this.#options.times), () => {
      void this.#keep().then(() => this.#keepLater())
    })
  }

  /** At every look: is the server still the one we filled, who is there, what has vanished. */
  async #keep(): Promise<void> {
    const { queue, times } = this.#options
    this.#notePause()
    try {
      const instance = await queue.instance()
      const reset = this.#instance === undefined || instance !== this.#instance
      if (reset) await this.#refill()
      else if (this.#nowMs() - this.#lastAnnounceMs >= times.heartbeatMs) await this.#announce()
      this.#noteRecovery()
      await this.#lookAtFleet(reset)
      if (this.#nowMs() - this.#lastSweepMs >= times.sweepMs) await this.#sweep()
      // By now everything that a restart left outstanding has been handed over.
      if (this.#nowMs() - this.#startMs > times.leaseMs) this.#inbox.drop(this.#intake.letGo())
      await this.#sender.send()
    } catch (fault) {
      this.#hear(fault)
    }
  }

  #notePause(): void {
    const nowMs = this.#nowMs()
    const { times } = this.#options
    const pausedMs = nowMs - this.#lastKeepMs - lookMs(times)
    this.#lastKeepMs = nowMs
    if (pausedMs < times.silentMs || this.#stalledMs !== undefined) return
    this.counters.pauses++
    const seconds = Math.round(pausedMs / 1000)
    this.#tell(
      `The coordinator was stopped for ${seconds} s; agents get that time again before they count as silent.`,
    )
  }

  /** The server was emptied, or is another one: everything goes out again. */
  async #refill(): Promise<void> {
    this.#instance = undefined
    let items = 0
    for (const job of [...this.#book.jobs()]) items += this.#book.recall(job)
    await this.#beginAnew()
    this.counters.resets++
    this.counters.resent += items
    this.#tell(`Redis was emptied or replaced; ${items} evaluations were sent again.`)
  }

  async #beginAnew(): Promise<void> {
    const { queue, plugin, nonce } = this.#options
    const instance = `${nonce}-${++this.#fillings}`
    await queue.begin(instance)
    await queue.putPlugin(plugin)
    this.#instance = instance
    await this.#announce()
  }

  async #announce(): Promise<void> {
    const { queue, search, orders } = this.#options
    this.#lastAnnounceMs = this.#nowMs()
    const secondsPerCost = this.#pace.secondsPerCost
    await queue.announce({
      ...search,
      protocol: protocolVersion,
      instance: this.#instance!,
      beat: ++this.#beat,
      waiting: this.#hasUnheld(),
      shutOut: [],
      draining: [],
      ...orders?.(),
      ...(secondsPerCost === undefined || secondsPerCost <= 0 ? {} : { secondsPerCost }),
    })
  }

  /** True when some job has been out for a while and no agent says that it holds it. */
  #hasUnheld(): boolean {
    const held = this.#held()
    const sinceMs = this.#nowMs() - 2 * this.#options.times.heartbeatMs
    for (const { dispatch, agent, sentMs } of this.#book.jobs())
      if (agent === undefined && sentMs < sinceMs && !held.has(dispatch)) return true
    return false
  }

  #held(): Set<number> {
    const { search } = this.#options.search
    return new Set(this.#fleet.alive().flatMap(({ held }) => held[search] ?? []))
  }

  async #lookAtFleet(excused: boolean): Promise<void> {
    const { queue } = this.#options
    const news = this.#fleet.look(await queue.agents(), this.#nowMs(), excused)
    for (const heartbeat of news.silent) this.#loseAgent(heartbeat, 'agent-lost')
    for (const heartbeat of news.left) this.#loseAgent(heartbeat, 'handed-back')
    if (news.changed) this.#tellFleet()
    for (const agent of news.forgotten) await queue.forgetAgent(agent)
  }

  /** What a silent agent held is lost; what an agent left behind that said good-bye lies in the queue again. */
  #loseAgent(heartbeat: Heartbeat, cause: 'agent-lost' | 'handed-back'): void {
    const { agent, host } = heartbeat
    const held = new Set(cause === 'agent-lost' ? heartbeat.held[this.#options.search.search] : [])
    const jobs = [...this.#book.jobs()].filter((job) => job.agent === agent || held.has(job.dispatch))
    const items = jobs.flatMap((job) => this.#book.lose(job))
    this.counters[cause === 'agent-lost' ? 'agentsLost' : 'agentsLeft']++
    if (items.length === 0) return
    const detail = cause === 'agent-lost' ? `agent ${agent} fell silent` : `agent ${agent} has left`
    this.#tellLost(items, cause, detail, { kind: 'process', worker: agent, host })
    this.#removeLater(jobs)
  }

  #removeLater(jobs: readonly SentJob[]): void {
    const places = jobs.map(placeOf)
    this.#options.queue.remove(places).catch(() => {})
  }

  /** Jobs that no living agent says it holds, and that wait nowhere, are sent again. */
  async #sweep(): Promise<void> {
    const { queue, times } = this.#options
    const nowMs = this.#nowMs()
    this.#lastSweepMs = nowMs
    const held = this.#held()
    const doubtful = [...this.#book.jobs()].filter(
      (job) => nowMs - job.sentMs >= 2 * times.heartbeatMs && !held.has(job.dispatch),
    )
    for (const job of this.#book.jobs()) if (held.has(job.dispatch)) job.strayedMs = undefined
    const states = await queue.states(doubtful.map(placeOf))
    for (const [i, job] of doubtful.entries()) {
      if (this.#book.job(job.dispatch) !== job) continue
      if (states[i] === 'waiting') job.strayedMs = undefined
      else job.strayedMs ??= nowMs
      // What is gone may have been answered a moment ago; what was taken may be in the next heartbeat of who took it.
      const patienceMs = states[i] === 'active' ? times.silentMs : times.sweepMs
      if (job.strayedMs === undefined || nowMs - job.strayedMs < patienceMs) continue
      this.counters.resent += this.#book.recall(job)
      this.counters.vanished++
      this.#removeLater([job])
    }
  }

  // ------------------------------------------------------------------------------------- the rest

  /** Two searches of one name would take each other's work. */
  async #refuseTakenName(): Promise<void> {
    const { queue, search, times } = this.#options
    const other = await queue.announced(search.search)
    if (!other || other.record === search.record) return
    await pause(this.#options.clock, 2 * times.heartbeatMs)
    const later = await queue.announced(search.search)
    if (!later || later.record === search.record || later.beat === other.beat) return
    throw refuse('search-name-taken', {
      detail: `"${search.search}" is announced by the coordinator of another record, which is alive`,
    })
  }

  #hear(fault: unknown): void {
    if (this.#closed) return
    if (!(fault instanceof Refusal) || fatal.has(fault.code)) {
      this.#inbox.fail(fault instanceof Error ? fault : new Error(String(fault)))
      return
    }
    if (this.#stalledMs !== undefined) return
    this.#stalledMs = this.#nowMs()
    this.counters.stalls++
    this.#tell(`${fault.message}. The search waits for it; nothing is lost.`)
  }

  #noteRecovery(): void {
    if (this.#stalledMs === undefined) return
    const seconds = ((this.#nowMs() - this.#stalledMs) / 1000).toFixed(1)
    this.#stalledMs = undefined
    this.#tell(`Redis answers again after ${seconds} s.`)
  }

  #tellFleet(): void {
    const hosts = this.#fleet.hosts()
    this.#inbox.give([{ kind: 'fleet', hosts }])
    const isThere = hosts.length > 0
    if (isThere === this.#saidFleet) return
    this.#saidFleet = isThere
    const cores = hosts.reduce((sum, host) => sum + host.cores, 0)
    const { workerCommand = 'skerry work --redis URL' } = this.#options
    this.#tell(
      isThere
        ? `Workers are here: ${this.#fleet.alive().length} on ${hosts.length === 1 ? 'one machine' : `${hosts.length} machines`}, ${cores} cores.`
        : `No worker is here. The search goes on when one comes: ${workerCommand}`,
    )
  }

  /** Nobody who is there may do these. */
  #handBack(items: readonly WorkItem[]): void {
    this.#book.forget(items)
    this.counters.handedBack += items.length
    this.#tellLost(items, 'handed-back', 'no agent that may do it is there', nobody)
  }

  #tellLost(
    items: readonly WorkItem[],
    cause: 'agent-lost' | 'handed-back',
    detail: string,
    executor: Extract<DispatchFact, { kind: 'lost' }>['executor'],
  ): void {
    for (const { island, evaluation, attempt, purpose, isolation } of items) {
      const item = { island, evaluation, attempt, purpose, isolation }
      this.#inbox.give([{ kind: 'lost', item, cause, detail, executor }])
    }
  }

  #tell(sentence: string): void {
    this.#options.tell?.(sentence)
  }

  #nowMs(): number {
    return this.#options.clock.nowMs()
  }
}

const nobody = { kind: 'process', worker: 'nobody', host: 'nobody' } as const

function placeOf({ dispatch, agent }: SentJob): { readonly dispatch: number; readonly agent?: string } {
  return agent === undefined ? { dispatch } : { dispatch, agent }
}
