// The agent of one machine: takes work of any number of searches while it has cores free, has it simulated in threads
// and processes of its own (never here), answers, and leaves when told, too late or not needed. It holds no state
// that anybody would miss: whatever becomes of it, the coordinator sends the work again.
//
//   services.ts  which searches are served       feeder.ts  takes jobs and begins simulations
//   lane.ts      one search: jobs, pool          hands.ts   everything in hand, answers, leases
//   reasons.ts   when to end by itself           leaving.ts how

import { BrokenPromise } from '../../shared/check.js'
import { type AgentState, type Announcement, protocolVersion } from '../../shared/cluster/messages.js'
import type { ClusterTimes } from '../../shared/cluster/times.js'
import { exitCodes, Refusal } from '../../shared/refusals.js'
import type { Pool, PoolEvents, PoolOptions } from '../pool.js'
import { Counters } from './counters.js'
import { Feeder } from './feeder.js'
import { Hands } from './hands.js'
import { type Grain, SearchLane } from './lane.js'
import { leave } from './leaving.js'
import { Licences } from './licences.js'
import type { PluginCache } from './plugins.js'
import type { AgentQueue } from './port.js'
import { Reasons } from './reasons.js'
import { Room } from './room.js'
import { pause, type QueueLocation, Server } from './server.js'
import { type Dismissal, type Service, Services } from './services.js'
import { Shares } from './shares.js'
import { AgentCondition } from './states.js'

export interface AgentOptions {
  readonly location: QueueLocation
  readonly createQueue: (url: string) => AgentQueue
  readonly createPool: (options: PoolOptions, events: PoolEvents) => Pool
  readonly cache: PluginCache
  /** Name of this agent, unlike any other's. */
  readonly agent: string
  readonly host: string
  readonly processor: string
  readonly cores: number
  readonly memoryMB: number
  readonly times: ClusterTimes
  /** Version of this program. */
  readonly skerry: string
  /** When this machine is taken away, by `nowMs`. */
  readonly untilMs?: number
  /** Leaves after so long without work. */
  readonly idleExitMs?: number
  /** How long the first connection is tried for. */
  readonly patienceMs: number
  readonly nowMs: () => number
  readonly say: (sentence: string) => void
  readonly stateChanged?: (state: AgentState) => void
  /** Hand back and leave. */
  readonly signal: AbortSignal
}

/** Why an agent ends, with the exit code when it is not a matter of what was handed back. */
export interface Ending {
  readonly sentence: string
  readonly exitCode?: number
}

export interface AgentEnd {
  readonly sentence: string
  readonly exitCode: number
}

export class Agent {
  readonly options: AgentOptions
  readonly room: Room
  readonly server: Server
  readonly services: Services
  readonly hands: Hands
  readonly licences: Licences
  readonly feeder: Feeder
  readonly condition: AgentCondition
  readonly counters: Counters
  lastWord = ''
  private readonly shares = new Shares()
  private readonly reasons: Reasons
  private readonly timers: NodeJS.Timeout[] = []
  private end: (ending: Ending) => void = () => undefined
  private beat = 0
  private beating = false

  constructor(options: AgentOptions) {
    this.options = options
    const { nowMs, cores, memoryMB } = options
    this.room = new Room(cores, memoryMB)
    this.condition = new AgentCondition(nowMs, (state) => options.stateChanged?.(state))
    this.counters = new Counters(nowMs)
    this.reasons = new Reasons(this)
    this.server = this.makeServer()
    this.services = this.makeServices()
    this.hands = this.makeHands()
    this.licences = this.makeLicences()
    this.feeder = this.makeFeeder()
  }

  /** Serves until it is told to end, or has a reason of its own. @throws Refusal when it never got to work */
  async run(): Promise<AgentEnd> {
    const { signal } = this.options
    const ended = new Promise<Ending>((resolve) => {
      this.end = resolve
      const told = () => resolve({ sentence: 'Told to end.' })
      if (signal.aborted) told()
      else signal.addEventListener('abort', told, { once: true })
    })
    const early = await Promise.race([this.connect(), ended])
    if (early === undefined) this.start()
    const ending = early ?? (await ended)
    for (const timer of this.timers) clearInterval(timer)
    return leave(this, ending)
  }

  say(sentence: string): void {
    this.lastWord = sentence
    this.options.say(sentence)
  }

  /** Whether this lane should get more from the queue. */
  mayTake(lane: SearchLane): boolean {
    const service = this.services.of(lane)
    if (service === undefined || this.services.isDraining(service)) return false
    return (
      this.reasons.isInTime(() => lane.durations.p95Seconds()) &&
      this.hands.lanes.get(lane)?.isCrowded !== true
    )
  }

  /** Says that we are alive, and what we hold. */
  async sayAlive(): Promise<void> {
    const { agent, host, processor, skerry, cores, untilMs, nowMs } = this.options
    const heartbeat = {
      protocol: protocolVersion,
      agent,
      host,
      processor,
      node: process.version,
      skerry,
      pid: process.pid,
      cores,
      beat: ++this.beat,
      state: this.condition.state,
      stateSeconds: this.condition.seconds,
      held: this.hands.held(),
      ...this.counters.beat(),
      ...(untilMs === undefined ? {} : { leavesInSeconds: Math.max(0, (untilMs - nowMs()) / 1000) }),
      lastWord: this.lastWord.slice(0, 2000),
    }
    await this.server.ask((queue) => queue.beat(heartbeat))
  }

  // -------------------------------------------------------------------------------------- beginning

  /** Undefined when connected; the first fault is told, the last one ends the agent. */
  private async connect(): Promise<undefined> {
    const { nowMs, patienceMs, times, signal } = this.options
    const startMs = nowMs()
    for (let tries = 1; ; tries++) {
      try {
        await this.server.open()
        this.condition.note({ opened: true })
        return undefined
      } catch (fault) {
        if (!mayComeUp(fault) || signal.aborted || nowMs() - startMs > patienceMs) throw fault
        if (tries === 1) this.say(`${fault.message}. Trying again for ${Math.ceil(patienceMs / 1000)} s.`)
      }
      await pause(times.reconnectMostMs * (0.5 + Math.random()))
    }
  }

  private start(): void {
    const { times } = this.options
    const every = (ms: number, call: () => void) => this.timers.push(setInterval(call, ms))
    every(times.heartbeatMs, () => void this.heartbeat())
    every(times.leaseMs / 3, () => {
      void this.hands.renew()
      void this.licences.renew()
    })
    every(Math.max(5, times.heartbeatMs / 15), () => this.tick())
    void this.heartbeat()
  }

  // ------------------------------------------------------------------------------------ time passes

  private async heartbeat(): Promise<void> {
    this.counters.minute()
    if (this.beating) return
    this.beating = true
    await this.server.follow()
    await this.sayAlive()
    const asked = await this.server.ask((queue) => queue.searches())
    if (asked.done) this.services.update(asked.value)
    this.beating = false
    for (const { announcement } of this.services.bySearch.values())
      if (announcement.waiting) this.feeder.hint(announcement.search)
  }

  private tick(): void {
    void this.licences.returnUnused()
    this.hands.sweep(4 * this.options.times.leaseMs)
    for (const lane of this.services.lanes())
      if (lane.stashed > 0 && !this.reasons.isInTime(() => lane.nextSeconds())) this.hands.returnStash(lane)
    this.condition.note({ draining: this.isDraining(), busy: this.hands.isBusy })
    const ending = this.reasons.look()
    if (ending !== undefined) this.end(ending)
    void this.feeder.poke()
  }

  /** Takes no more from anybody: asked to, or too late. */
  private isDraining(): boolean {
    const served = [...this.services.bySearch.values()].filter(({ lane }) => lane !== undefined)
    const isAsked = served.length > 0 && served.every((service) => this.services.isDraining(service))
    return isAsked || (this.options.untilMs !== undefined && this.reasons.isTooLate)
  }

  // ------------------------------------------------------------------------------------ what happens

  private connectionChanged(connected: boolean, why: string): void {
    const { state } = this.condition
    this.condition.note({ connected })
    if (!connected) {
      this.say(`Redis cannot be reached (${why}); this worker goes on with what it has and tries again.`)
    } else if (state !== 'starting') {
      this.say('Redis answers again.')
      this.hands.retry()
      void this.feeder.poke()
    }
  }

  private serviceChanged({ announcement, lane }: Service): void {
    if (lane !== undefined) {
      this.shares.set(announcement.search, announcement.share)
      lane.tokens = announcement.tokens
    }
    void this.feeder.poke()
  }

  private async prepare(announcement: Announcement): Promise<SearchLane | undefined> {
    const { cache, host, processor, createPool, nowMs, times } = this.options
    const pluginFile = await cache.file(announcement, async () => {
      const limitMs = times.announcementMs
      const asked = await this.server.ask((queue) => queue.plugin(announcement.search), undefined, limitMs)
      return asked.done ? asked.value : undefined
    })
    if (pluginFile === undefined) return undefined
    const width = this.room.width(announcement.needs)
    const lane = new SearchLane(
      { announcement, pluginFile, host, processor, width, createPool, nowMs },
      {
        letter: (letter, isUrgent) => this.hands.post(lane, letter, isUrgent),
        ended: (grain) => this.grainEnded(grain),
        failed: (error) => this.laneFailed(lane, error),
      },
    )
    this.hands.add(lane)
    this.say(`Serves search ${announcement.search}, ${width} at once.`)
    return lane
  }

  private dismiss(lane: SearchLane, why: Dismissal): void {
    this.shares.remove(lane.search)
    if (why === 'over') this.say(`Search ${lane.search} is over.`)
    if (why === 'silent') this.hands.returnStash(lane)
    else this.hands.giveUp(lane, why === 'shut-out' ? 'for-others' : 'for-nobody')
  }

  private grainEnded({ lane, demand, chargedSeconds, simulatedSeconds, receipt }: Grain): void {
    this.room.giveBack(demand)
    this.shares.charge(lane.search, simulatedSeconds - chargedSeconds)
    if (receipt !== undefined) this.licences.release(receipt)
    this.counters.add(lane.takeCounts())
    this.counters.simulatedSeconds += simulatedSeconds
    void this.feeder.poke()
  }

  private laneFailed(lane: SearchLane, error: Error): void {
    if (error instanceof BrokenPromise || !(error instanceof Refusal)) {
      this.end({ sentence: error.message, exitCode: exitCodes.brokenPromise })
      return
    }
    const service = this.services.of(lane)
    if (service !== undefined) this.services.refuse(service, error)
    this.hands.giveUp(lane, 'for-others')
  }

  // -------------------------------------------------------------------------------------- its parts

  private makeServer(): Server {
    const { location, createQueue, times } = this.options
    return new Server({
      location,
      createQueue,
      callMs: 2 * times.commandMs,
      changed: (connected, why) => this.connectionChanged(connected, why),
      fatal: (refusal) => this.end({ sentence: refusal.message, exitCode: refusal.exitCode }),
      moved: () => this.say('The coordinator has moved; this worker follows it.'),
    })
  }

  private makeServices(): Services {
    const { agent, host, nowMs, times } = this.options
    return new Services({
      agent,
      host,
      room: this.room,
      nowMs,
      silentMs: times.announcementMs,
      prepare: (announcement) => this.prepare(announcement),
      dismiss: (lane, why) => this.dismiss(lane, why),
      changed: (service) => this.serviceChanged(service),
      say: (sentence) => this.say(sentence),
    })
  }

  private makeHands(): Hands {
    const { server, services, counters } = this
    const { times, agent, host, processor, skerry } = this.options
    return new Hands({
      server,
      services,
      counters,
      times,
      agent,
      host,
      processor,
      skerry,
      isLeaving: () => this.condition.state === 'leaving',
      complaint: (sentence) => {
        this.lastWord = sentence
      },
    })
  }

  private makeLicences(): Licences {
    const { nowMs, times } = this.options
    return new Licences({
      server: this.server,
      nowMs,
      tenureMs: times.leaseMs,
      retryMs: times.reconnectMostMs,
      say: (sentence) => this.say(sentence),
    })
  }

  private makeFeeder(): Feeder {
    const { nowMs, times } = this.options
    const { server, shares, room, licences } = this
    return new Feeder({
      server,
      shares,
      room,
      licences,
      nowMs,
      lanes: () => this.services.lanes(),
      mayTake: (lane) => this.mayTake(lane),
      mayBegin: (lane) => this.reasons.isInTime(() => lane.nextSeconds()),
      received: (lane, taken, epoch) => {
        this.reasons.took()
        return this.hands.receive(lane, taken, epoch)
      },
      waitMs: times.heartbeatMs,
      pollMs: times.announcementMs / 2,
    })
  }
}

function mayComeUp(fault: unknown): fault is Refusal {
  return (
    fault instanceof Refusal && (fault.code === 'queue-unreachable' || fault.code === 'rendezvous-missing')
  )
}
