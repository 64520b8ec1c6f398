// Takes jobs and begins simulations, as long as there is room. One loop, one step at a time:
//
//   whose turn is it (shares.ts)?  ─▶ it has items here: begin some, if they fit
//                                  ─▶ it has none: take a job
//   nobody's turn, or no room      ─▶ searches of short simulations get some jobs ahead
//
// When the one whose turn it is needs more room than is free, nobody else is let in before: otherwise a search of
// large simulations would never find room among small ones.

import type { SearchLane } from './lane.js'
import type { Licences } from './licences.js'
import type { TakenJob } from './port.js'
import type { Demand, Room } from './room.js'
import type { Server } from './server.js'
import type { Shares } from './shares.js'

export interface FeederOptions {
  readonly server: Server
  readonly shares: Shares
  readonly room: Room
  readonly licences: Licences
  readonly nowMs: () => number
  /** Lanes that may get something to do. */
  readonly lanes: () => readonly SearchLane[]
  /** False for a lane that is to take no more: draining, too late, answers that nobody takes. */
  readonly mayTake: (lane: SearchLane) => boolean
  /** False when what it has would not end in time. */
  readonly mayBegin: (lane: SearchLane) => boolean
  readonly received: (lane: SearchLane, taken: TakenJob, epoch: number) => Promise<void>
  /** Longest wait for a sign of work, and longest time without asking for it. */
  readonly waitMs: number
  readonly pollMs: number
}

/** Seconds of work that a search of short simulations has ahead, on every core. */
const aheadSeconds = 0.5
const fruitlessPauseMs = 20
const fruitlessPauseMostMs = 1000

export class Feeder {
  private readonly options: FeederOptions
  /** Searches whose queues were found empty. */
  private readonly empty = new Set<string>()
  private loop: Promise<void> | undefined
  private again = false
  private waiting = false
  private polledMs = 0
  private fruitless = 0
  private stopped = false

  constructor(options: FeederOptions) {
    this.options = options
  }

  /** Something has changed: room, work, connection. */
  poke(): Promise<void> {
    if (this.stopped) return Promise.resolve()
    this.again = true
    this.loop ??= this.run().finally(() => {
      this.loop = undefined
    })
    return this.loop
  }

  /** There may be work again in this search. */
  hint(search: string): void {
    if (this.empty.delete(search)) void this.poke()
  }

  /** Takes and begins nothing more; resolves when a call that is under way has ended. */
  async stop(): Promise<void> {
    this.stopped = true
    await this.loop
  }

  private async run(): Promise<void> {
    while (this.again && !this.stopped) {
      this.again = false
      while (!this.stopped && (await this.step())) {
        // One step after the other, until nothing more can be done.
      }
    }
    this.wait()
  }

  /** True when something was done and there may be more to do. */
  private async step(): Promise<boolean> {
    const lanes = this.options.lanes()
    const wanting = lanes.filter((lane) => this.canBegin(lane) || this.canTake(lane))
    const turn = this.options.shares.pick(wanting.map(({ search }) => search))
    const lane = wanting.find(({ search }) => search === turn)
    if (lane === undefined) return this.takeAhead(lanes)
    if (!this.options.room.fits(demandOf(lane))) return this.takeAhead(lanes)
    if (!hasLicences(lane)) return this.canBegin(lane) ? this.begin(lane, undefined) : this.take(lane)
    const receipt = await this.options.licences.acquire({
      ...lane.options.announcement,
      tokens: lane.tokens,
    })
    if (receipt === undefined) return true
    if (this.canBegin(lane)) return this.begin(lane, receipt)
    // Kept for the job that comes now; what nobody uses goes back by itself.
    this.options.licences.release(receipt)
    return this.take(lane)
  }

  private canBegin(lane: SearchLane): boolean {
    return (
      lane.state === 'ready' &&
      lane.next() !== undefined &&
      !this.isBlocked(lane) &&
      this.options.mayBegin(lane)
    )
  }

  private canTake(lane: SearchLane): boolean {
    return (
      (lane.state === 'ready' || lane.state === 'closed') &&
      lane.stashed === 0 &&
      !this.empty.has(lane.search) &&
      !this.isBlocked(lane) &&
      this.options.server.connected &&
      this.options.mayTake(lane)
    )
  }

  private isBlocked(lane: SearchLane): boolean {
    return hasLicences(lane) && this.options.licences.isBlocked(lane.search)
  }

  private begin(lane: SearchLane, receipt: string | undefined): boolean {
    if (this.stopped) return false
    const grain = lane.begin(receipt)
    this.options.room.take(grain.demand)
    this.options.shares.charge(lane.search, grain.chargedSeconds)
    return true
  }

  /** Short simulations: the next job is here before the last one ends. */
  private async takeAhead(lanes: readonly SearchLane[]): Promise<boolean> {
    for (const lane of lanes) {
      if (lane.state !== 'ready' || !lane.isFast || this.empty.has(lane.search)) continue
      if (!this.options.server.connected || !this.options.mayTake(lane)) continue
      const seconds = lane.stashSeconds()
      if (seconds !== undefined && seconds < aheadSeconds * lane.options.width) return this.take(lane)
    }
    return false
  }

  /** False when nobody answers. */
  private async take(lane: SearchLane): Promise<boolean> {
    const { server, received } = this.options
    const { epoch } = server
    const got = (taken: TakenJob | undefined) =>
      taken === undefined ? Promise.resolve() : received(lane, taken, epoch)
    const outcome = await server.ask(
      (queue) => queue.take(lane.search),
      (taken) => void got(taken),
    )
    if (!outcome.done) return false
    if (outcome.value === undefined) this.empty.add(lane.search)
    else {
      this.fruitless = 0
      await got(outcome.value)
      // A search that was idle: its threads are started for the job that is here now.
      if (lane.state === 'closed' && lane.stashed > 0) void lane.open().then(() => this.poke())
    }
    return true
  }

  /** Waits for work where none was found and there would be room; one wait at a time. */
  private wait(): void {
    if (this.waiting || this.stopped || !this.options.server.connected) return
    const hungry = this.hungry()
    if (hungry.length === 0) return
    this.waiting = true
    void this.waitOnce(hungry).finally(() => {
      this.waiting = false
      void this.poke()
    })
  }

  private async waitOnce(hungry: readonly string[]): Promise<void> {
    const { server, nowMs, waitMs, pollMs } = this.options
    if (!(await server.waitForWork(hungry, waitMs))) {
      // No sign of work; a sign can be lost, so it is asked for now and then.
      this.fruitless = 0
      if (nowMs() - this.polledMs < pollMs) return
    } else if (this.fruitless++ > 0) {
      // A sign, but others were quicker, again: not at full speed.
      const ms = Math.min(fruitlessPauseMs * 2 ** (this.fruitless - 2), fruitlessPauseMostMs)
      await new Promise((resolve) => setTimeout(resolve, ms))
    }
    this.polledMs = nowMs()
    for (const search of hungry) this.empty.delete(search)
  }

  private hungry(): string[] {
    const { room, lanes, mayTake } = this.options
    return lanes()
      .filter((lane) => this.empty.has(lane.search) && mayTake(lane) && room.fits(demandOf(lane)))
      .map(({ search }) => search)
  }
}

function demandOf(lane: SearchLane): Demand {
  const next = lane.next()
  if (next !== undefined) return next.demand
  const { cores, memoryMB } = lane.options.announcement.needs
  return lane.isFast ? { cores: cores / 2, memoryMB: memoryMB / 2 } : { cores, memoryMB }
}

function hasLicences(lane: SearchLane): boolean {
  return Object.keys(lane.options.announcement.needs.tokens).length > 0
}
