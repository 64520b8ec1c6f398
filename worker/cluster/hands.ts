// What the agent has in hand: every lane, served or only finishing, with its jobs and the answers on their way. Takes
// jobs in, renews their leases, writes what became of them, finishes them or hands them back.

import { type AnswersHeader, protocolVersion } from '../../shared/cluster/messages.js'
import type { ClusterTimes } from '../../shared/cluster/times.js'
import type { Counters } from './counters.js'
import { HeldJob } from './held.js'
import type { SearchLane } from './lane.js'
import { type Letter, Outbox } from './outbox.js'
import type { TakenJob } from './port.js'
import type { Server } from './server.js'
import type { Services } from './services.js'

export interface HandsOptions {
  readonly server: Server
  readonly services: Services
  readonly counters: Counters
  readonly times: ClusterTimes
  readonly agent: string
  readonly host: string
  readonly processor: string
  readonly skerry: string
  /** True once nothing may be taken any more. */
  readonly isLeaving: () => boolean
  /** The server did not take answers, though it can be reached. */
  readonly complaint: (sentence: string) => void
}

/** Why a lane gives up what it has: what is left goes to others, or nobody needs it any more. */
export type GivenUp = 'for-others' | 'for-nobody'

const answersBytesMost = 2 ** 26

export class Hands {
  readonly lanes = new Map<SearchLane, Outbox>()
  private readonly options: HandsOptions
  /** All answered, and the server could not be told yet. */
  private readonly unfinished = new Set<HeldJob>()
  private readonly finishing = new Set<Promise<void>>()
  private readonly leaseLost = new WeakSet<HeldJob>()

  constructor(options: HandsOptions) {
    this.options = options
  }

  add(lane: SearchLane): void {
    const { search, record, pluginDigest } = lane.options.announcement
    const { agent, host, processor, skerry } = this.options
    const protocol = protocolVersion
    this.lanes.set(
      lane,
      this.outbox({ protocol, search, record, agent, host, processor, pluginDigest, skerry }),
    )
  }

  jobs(): HeldJob[] {
    return [...this.lanes.keys()].flatMap((lane) => [...lane.jobs])
  }

  get isBusy(): boolean {
    return [...this.lanes.keys()].some((lane) => lane.isBusy || lane.state === 'opening')
  }

  /** Dispatch numbers by search. */
  held(): { [search: string]: number[] } {
    const held: { [search: string]: number[] } = {}
    for (const lane of this.lanes.keys()) {
      const numbers = [...lane.jobs].map(({ dispatch }) => dispatch)
      if (numbers.length > 0) held[lane.search] = [...(held[lane.search] ?? []), ...numbers]
    }
    return held
  }

  /** Puts an answer or a loss on its way; false when there is no room for it. */
  post(lane: SearchLane, letter: Letter, isUrgent: boolean): boolean {
    const { job } = letter
    job.unwritten++
    if (this.lanes.get(lane)?.put(letter, isUrgent) === true) return true
    job.unwritten--
    return false
  }

  /** A job that came: ours to do, or somebody else's. */
  async receive(lane: SearchLane, taken: TakenJob, epoch: number): Promise<void> {
    const { server, services, host, isLeaving } = this.options
    const job = new HeldJob(taken, epoch)
    const { header } = taken.job
    const isForeign = () => {
      const now = services.of(lane)?.announcement
      return now === undefined || header.record !== now.record || header.instance !== now.instance
    }
    if (isForeign()) {
      // The coordinator may have begun anew since it was last heard of.
      const asked = await server.ask((queue) => queue.searches())
      if (asked.done) services.update(asked.value)
      if (isForeign() && asked.done && services.of(lane) !== undefined) {
        await server.ask((queue) => queue.finish(taken))
        return
      }
    }
    if (isLeaving() || services.of(lane) === undefined) {
      await this.handBack(job)
      return
    }
    lane.accept(job)
    // Work that must not be done on this machine came here all the same.
    if (header.avoidHosts.includes(host)) this.returnAll(lane, job)
  }

  /** Gives a job that nobody has touched back to the others. */
  async handBack(job: HeldJob): Promise<void> {
    const { server, counters } = this.options
    counters.handedBack += job.taken.job.items.length
    if (job.epoch === server.epoch) await server.ask((queue) => queue.handBack(job.taken))
  }

  /** Gives back what has not begun. */
  returnStash(lane: SearchLane): void {
    const { untouched, losses } = lane.unstash()
    for (const letter of losses) this.post(lane, letter, true)
    for (const job of untouched) void this.handBack(job)
    this.options.counters.handedBack += losses.length
  }

  /** Ends everything a lane does. How many evaluations were unfinished, and when the server knows of the jobs. */
  giveUp(lane: SearchLane, whose: GivenUp): { readonly unfinished: number; readonly told: Promise<unknown> } {
    const { server, counters } = this.options
    const { untouched, losses } = lane.abandon()
    for (const letter of losses) this.post(lane, letter, true)
    counters.handedBack += losses.length
    const told = untouched.map((job) =>
      whose === 'for-others' ? this.handBack(job) : server.ask((queue) => queue.finish(job.taken)),
    )
    const items = untouched.reduce((sum, job) => sum + job.taken.job.items.length, 0)
    return { unfinished: losses.length + items, told: Promise.all(told) }
  }

  async renew(): Promise<void> {
    const { server, counters } = this.options
    const jobs = this.jobs().filter((job) => job.epoch === server.epoch && !this.leaseLost.has(job))
    if (jobs.length === 0) return
    const renewed = await server.ask((queue) => queue.renew(jobs.map(({ taken }) => taken)))
    if (!renewed.done) return
    const lost = new Set(renewed.value)
    for (const job of jobs) {
      if (!lost.has(job.taken)) continue
      // Somebody else may have it now. What is being simulated is as good as theirs: it is answered all the same.
      this.leaseLost.add(job)
      counters.leasesLost++
    }
  }

  /** Resolves when the server knows of every job that is complete, or did not answer. */
  async finished(): Promise<void> {
    await Promise.all(this.finishing)
  }

  /** The server can be reached again. */
  retry(): void {
    for (const box of this.lanes.values()) box.retry()
  }

  /** Closes pools that have long been idle, forgets lanes that have ended, tries again what could not be finished. */
  sweep(idleMostMs: number): void {
    for (const [lane, box] of this.lanes) {
      if (lane.state === 'ready' && lane.idleMs > idleMostMs) void lane.close()
      const isServed = this.options.services.of(lane) !== undefined
      if (!isServed && lane.jobs.size === 0 && box.length === 0) this.remove(lane, box)
    }
    if (this.options.server.connected) for (const job of this.unfinished) this.finish(job)
  }

  private remove(lane: SearchLane, box: Outbox): void {
    box.close()
    this.lanes.delete(lane)
    void lane.close()
  }

  private returnAll(lane: SearchLane, job: HeldJob): void {
    lane.forget(job)
    for (const index of job.unsettled()) {
      job.settle(index)
      this.post(lane, { job, loss: lane.handedBack(job, index) }, job.left === 0)
    }
  }

  private finish(job: HeldJob): void {
    this.unfinished.delete(job)
    const finishing = this.finishNow(job).finally(() => this.finishing.delete(finishing))
    this.finishing.add(finishing)
  }

  private async finishNow(job: HeldJob): Promise<void> {
    const { server } = this.options
    const isDone = job.epoch !== server.epoch || (await server.ask((queue) => queue.finish(job.taken))).done
    if (!isDone) this.unfinished.add(job)
    else for (const lane of this.lanes.keys()) if (lane.jobs.has(job)) lane.drop(job)
  }

  private outbox(header: AnswersHeader): Outbox {
    const { server, complaint, times } = this.options
    return new Outbox({
      lingerMs: times.heartbeatMs / 15,
      retryMs: times.reconnectMostMs,
      bytesMost: answersBytesMost,
      send: async (letters) => {
        const answers = letters.flatMap((letter) => ('answer' in letter ? [letter.answer] : []))
        const losses = letters.flatMap((letter) => ('loss' in letter ? [letter.loss] : []))
        const sent = await server.ask((queue) => queue.answer(header.search, { header, answers, losses }))
        if (!sent.done && server.connected) complaint(sent.fault.message)
        return sent.done
      },
      written: (letters) => {
        this.options.counters.lastAnswerSeconds = Date.now() / 1000
        for (const { job } of letters) {
          job.unwritten--
          if (job.isComplete) this.finish(job)
        }
      },
    })
  }
}
