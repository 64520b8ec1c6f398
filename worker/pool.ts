// The simulating threads and processes of this machine: takes items, answers each with a result or a loss.
//
//   shared items   threads of an agent process, in batches; the item that kills or hangs a thread is lost
//   doubtful       items whose agent died, or held too much memory among others: one process, one at a time, so that
//                  the one that did it is known; the pool's own affair, nobody outside notices
//   confirm        an agent of one thread: never whoever computed the first result. Another process takes over after 500
//                  items and a minute of simulation
//   alone          a process, fresh for each item
//
// The coordinator's own process never runs a simulation, so nothing a plug-in does can end it.

import { hostname } from 'node:os'
import { BrokenPromise, check } from '../shared/check.js'
import { limits } from '../shared/limits.js'
import { refuse } from '../shared/refusals.js'
import type { DispatchFact, Executor, WorkItem } from '../shared/result.js'
import { AgentLane } from './lane-agent.js'
import { ConfirmLane } from './lane-confirm.js'
import { ProcessLane } from './lane-process.js'
import type { Loss } from './lane-thread.js'
import { defaultTimeLimit, Pace, type TimeLimit } from './pace.js'
import { everyTick } from './threads.js'
import type { Simulated, SimulatorSettings } from './wire.js'

export interface PoolOptions extends SimulatorSettings {
  readonly threads: number
  /** What one simulation may hold; 1024 unless said. */
  readonly megabytes?: number
  /** Wall-time backstop. */
  readonly timeLimit?: Partial<TimeLimit>
  /** Wall seconds of one replicate at expected cost 1, where known. */
  readonly secondsPerCost?: number
  /** Items a confirming process may simulate before a fresh one takes over; 500, and a minute, unless said. */
  readonly confirmationsPerProcess?: number
  /** This machine's name unless said. */
  readonly host?: string
}

export interface PoolStatus {
  readonly slots: number
  readonly outstanding: number
  readonly wanted: number
  /** Items that the shared threads have and have not answered, as far as is known here. */
  readonly queued: number
  /** What an item takes of late, 0 until one has returned. */
  readonly secondsEach: number
}

export interface PoolEvents {
  /** Something was answered; called often, must be quick. */
  fact(fact: DispatchFact): void
  /** The pool can do nothing more: a Refusal ('no-workers') or a broken promise. */
  failed(error: Error): void
}

export interface Pool {
  /** Refuses with 'no-workers' when no thread can load the bundle. */
  start(): Promise<void>
  /** Answers of the shared threads may be gathered until no more than `reportAt` are missing, for half a second at most. */
  submit(items: readonly WorkItem[], reportAt?: number): void
  status(): PoolStatus
  /** Ends all threads and processes, hung ones as well, within about three seconds. */
  close(): Promise<void>
}

const closeSeconds = 3
const itemsPerProcess = 500
/** Items a slot has ahead, however long they last: so that results can be taken in by the handful. */
const aheadLeast = 8
/** Starting a process and compiling the plug-in in it costs a second of CPU, which is to be nothing against its work. */
const confirmingSecondsLeast = 60

export function createPool(options: PoolOptions, events: PoolEvents): Pool {
  return new MachinePool(options, events)
}

class MachinePool implements Pool {
  private readonly options: PoolOptions
  private readonly events: PoolEvents
  private readonly pace: Pace
  private readonly agent: AgentLane
  private readonly doubtful: ProcessLane
  private readonly confirming: ConfirmLane
  private readonly alone: ProcessLane
  private sharedOutstanding = 0
  private timer: NodeJS.Timeout | undefined
  private closed = false
  private hasFailed = false
  private started: { resolve(): void; reject(error: Error): void } | undefined

  constructor(options: PoolOptions, events: PoolEvents) {
    this.options = options
    this.events = events
    const timeLimit = { ...defaultTimeLimit, ...options.timeLimit }
    this.pace = new Pace(timeLimit, options.secondsPerCost)
    this.agent = this.agentLane()
    this.doubtful = this.processLane(itemsPerProcess)
    this.confirming = this.confirmLane()
    this.alone = this.processLane(1)
  }

  start(): Promise<void> {
    check(this.timer === undefined && !this.closed, 'a pool is started once')
    this.timer = everyTick((seconds) => this.tick(seconds))
    return new Promise((resolve, reject) => {
      this.started = { resolve, reject }
      this.agent.start()
    })
  }

  submit(items: readonly WorkItem[], reportAt = Number.POSITIVE_INFINITY): void {
    check(!this.closed, 'a closed pool takes no work')
    const shared: WorkItem[] = []
    for (const item of items) {
      if (item.isolation === 'alone') this.alone.add(item)
      else if (item.purpose === 'confirm') this.confirming.add(item)
      else shared.push(item)
    }
    this.sharedOutstanding += shared.length
    if (shared.length > 0) this.agent.submit(shared, reportAt)
  }

  status(): PoolStatus {
    const slots = this.options.threads
    const apart = this.doubtful.load + this.confirming.load + this.alone.load
    const depth = slots * Math.max(2 * this.pace.usualBatchLength(), aheadLeast)
    return {
      slots,
      outstanding: this.sharedOutstanding + apart,
      wanted: Math.max(0, depth - this.sharedOutstanding),
      queued: this.sharedOutstanding,
      secondsEach: this.pace.lastSeconds,
    }
  }

  async close(): Promise<void> {
    this.closed = true
    clearInterval(this.timer)
    this.started?.reject(refuse('no-workers', { detail: 'closed while starting' }))
    const lanes = [this.agent, this.doubtful, this.confirming, this.alone]
    let bound: NodeJS.Timeout | undefined
    const waited = new Promise<void>((resolve) => {
      bound = setTimeout(resolve, closeSeconds * 1000)
    })
    await Promise.race([Promise.all(lanes.map((lane) => lane.stop())), waited])
    clearTimeout(bound)
  }

  private agentLane(): AgentLane {
    return new AgentLane(threadsOptions(this.options), {
      ready: () => {
        this.started?.resolve()
        this.started = undefined
      },
      answered: (item, simulated, executor) => {
        this.sharedOutstanding--
        this.answered(item, simulated, executor)
      },
      lost: (loss, executor) => {
        this.sharedOutstanding--
        this.events.fact(lostFact(loss, executor))
      },
      doubtful: (item) => {
        this.sharedOutstanding--
        this.doubtful.add(item)
      },
      unusable: (reason) => this.unusable(reason),
      broken: (promise) => this.fail(new BrokenPromise(promise)),
    })
  }

  private confirmLane(): ConfirmLane {
    const { confirmationsPerProcess } = this.options
    return new ConfirmLane(
      {
        agent: { ...threadsOptions(this.options), threads: 1 },
        itemsMost: confirmationsPerProcess ?? itemsPerProcess,
        secondsLeast: confirmationsPerProcess === undefined ? confirmingSecondsLeast : 0,
      },
      {
        answered: (item, simulated, executor) => this.answered(item, simulated, executor),
        lost: (loss, executor) => this.events.fact(lostFact(loss, executor)),
        doubtful: (item) => this.doubtful.add(item),
        unusable: (reason) => this.unusable(reason),
        broken: (promise) => this.fail(new BrokenPromise(promise)),
      },
    )
  }

  private processLane(itemsMost: number): ProcessLane {
    const { settings, host, megabytes } = threadsOptions(this.options)
    return new ProcessLane(
      { settings, host, megabytes, itemsMost },
      {
        answered: (item, simulated, executor) => this.answered(item, simulated, executor),
        lost: (loss, executor) => this.events.fact(lostFact(loss, executor)),
        unusable: (reason) => this.unusable(reason),
        broken: (promise) => this.fail(new BrokenPromise(promise)),
      },
    )
  }

  private answered(item: WorkItem, simulated: Simulated, executor: Executor): void {
    this.pace.note(item, simulated.wallSeconds)
    this.events.fact(resultFact(item, simulated, executor))
  }

  private tick(seconds: number): void {
    const limit = (item: WorkItem) => this.pace.limitSeconds(item)
    for (const lane of [this.doubtful, this.alone]) lane.tick(seconds, limit)
  }

  private unusable(reason: string): void {
    this.fail(refuse('no-workers', { detail: `the pinned problem cannot be loaded: ${reason}` }))
  }

  private fail(error: Error): void {
    if (this.hasFailed) return
    this.hasFailed = true
    if (this.started !== undefined) this.started.reject(error)
    else this.events.failed(error)
    this.started = undefined
  }
}

function threadsOptions(options: PoolOptions) {
  const { pluginFile, seed, sharedConditions, threads, secondsPerCost } = options
  return {
    settings: { pluginFile, seed, sharedConditions },
    threads,
    megabytes: options.megabytes ?? limits.megabytesUsual,
    timeLimit: options.timeLimit ?? {},
    host: options.host ?? hostname(),
    ...(secondsPerCost === undefined ? {} : { secondsPerCost }),
  }
}

function resultFact(item: WorkItem, simulated: Simulated, executor: Executor): DispatchFact {
  const { island, evaluation, attempt, purpose } = item
  const { result, digest, cpuSeconds, wallSeconds } = simulated
  return {
    kind: 'result',
    item: { island, evaluation, attempt, purpose },
    result,
    digest,
    executor,
    cpuSeconds,
    wallSeconds,
  }
}

function lostFact({ item, cause, detail }: Loss, executor: Executor): DispatchFact {
  const { island, evaluation, attempt, purpose, isolation } = item
  return { kind: 'lost', item: { island, evaluation, attempt, purpose, isolation }, cause, detail, executor }
}
