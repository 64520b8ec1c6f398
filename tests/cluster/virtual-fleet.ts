// A fleet in virtual time, to measure how busy it is: the real engine and islands, and a dispatcher in memory with the
// rules of the one over a queue server. Work waits in one queue, first in, first out, or first where the real one says
// so; what must be done by certain agents is addressed to one of them. Agents are killed without a word. A silent one
// is noticed by its heartbeats, a job that it had not mentioned yet by the sweep.
//
// Nothing is simulated: a simulation is a span of time and a result made on the spot. Spans are noted by what became
// of them, and the accounts say how much of the time in the window was of use.

import { isUrgent } from '../../coordinator/dispatch/redis/parcels.js'
import type { Engine } from '../../coordinator/engine/engine.js'
import { openEngine } from '../../coordinator/engine/recover.js'
import type { SearchTools } from '../../coordinator/evolution/search.js'
import { clusterTimes } from '../../shared/cluster/times.js'
import { resultDigest } from '../../shared/digests.js'
import type { DispatchFact, EvaluationResult, WorkItem } from '../../shared/result.js'
import { type Stream, stream } from '../../shared/streams.js'
import { Disk } from './disk.js'
import { Timetable } from './timetable.js'

export interface FleetWorld {
  readonly tools: SearchTools
  readonly seed: number
  readonly workers: number
  /** Mean of exponential lives; Infinity: nobody is killed. */
  readonly meanLifeMs: number
  /** From a death to the next agent in its place. */
  readonly replacedAfterMs: number
  /** From the end of a simulation to the coordinator's having the answer. */
  readonly answerMs: number
  /** The coordinator is told of machines, each agent on one of its own: confirmation elsewhere, and hedges. */
  readonly machines: boolean
  /** A pure function of the evaluation: simulating again takes as long. */
  readonly wallMs: (item: WorkItem) => number
  readonly resultOf: (item: WorkItem) => EvaluationResult
}

export type Use = 'evaluated' | 'confirmed' | 'double' | 'destroyed'

/** Milliseconds of all agents together within the window. */
export interface Accounts {
  readonly aliveMs: number
  readonly usesMs: Readonly<Record<Use, number>>
  readonly kills: number
  readonly hedges: number
}

/** Simulating, whatever for, over time alive. */
export function busyShare({ aliveMs, usesMs }: Accounts): number {
  return Object.values(usesMs).reduce((sum, ms) => sum + ms, 0) / aliveMs
}

/** Time on results that counted over the ideal: the time alive less the work that the kills themselves destroyed. */
export function efficiency({ aliveMs, usesMs }: Accounts): number {
  return (usesMs.evaluated + usesMs.confirmed) / (aliveMs - usesMs.destroyed)
}

interface Agent {
  readonly name: string
  readonly bornMs: number
  readonly addressed: WorkItem[]
  alive: boolean
  running: { readonly item: WorkItem; readonly startMs: number } | undefined
}

const times = clusterTimes()
const lookMs = times.heartbeatMs / 3
/** How often the coordinator's loop turns when nothing comes in. */
const turnMs = 250
/** Items a thread has ahead, as the dispatcher over a queue server asks for them. */
const aheadItems = 8

export class VirtualFleet {
  readonly engine: Engine
  readonly #world: FleetWorld
  readonly #disk: Disk
  readonly #lives: Stream
  readonly #timetable = new Timetable()
  /** Agents that are not known to be dead. */
  readonly #agents = new Set<Agent>()
  readonly #idle = new Set<Agent>()
  readonly #open: WorkItem[] = []
  readonly #sent = new Set<string>()
  readonly #answered = new Set<string>()
  #facts: DispatchFact[] = []
  #fleetIsNews = true
  #births = 0
  #kills = 0
  #fromMs = 0
  #aliveMs = 0
  #usesMs: Record<Use, number> = { evaluated: 0, confirmed: 0, double: 0, destroyed: 0 }

  constructor(world: FleetWorld) {
    this.#world = world
    this.#disk = new Disk(stream(world.seed, 'weather', 3))
    this.#lives = stream(world.seed, 'weather', 21)
    const options = { leaseMs: Number.POSITIVE_INFINITY, snapshotCommits: Number.POSITIVE_INFINITY }
    this.engine = openEngine(world.tools, this.#disk, options).engine
    for (let place = 0; place < world.workers; place++) this.#begin()
    if (world.machines) this.#turnLater()
    this.#look()
  }

  get nowMs(): number {
    return this.#timetable.nowMs
  }

  /** Goes on until that time, or until `stop` says so after a look of the coordinator; false when nothing is left. */
  run(untilMs: number, stop: () => boolean = () => false): boolean {
    while (this.#timetable.nextMs <= untilMs && this.#timetable.nextMs < Number.POSITIVE_INFINITY) {
      this.#timetable.step()
      if (this.#facts.length > 0) this.#look()
      if (stop()) return true
    }
    return this.#timetable.nextMs < Number.POSITIVE_INFINITY
  }

  /** Forgets what was before: accounts begin now. */
  beginAccounts(): void {
    this.#fromMs = this.nowMs
    this.#aliveMs = 0
    this.#usesMs = { evaluated: 0, confirmed: 0, double: 0, destroyed: 0 }
    this.#kills = 0
  }

  accounts(): Accounts {
    const usesMs = { ...this.#usesMs }
    let aliveMs = this.#aliveMs
    for (const { alive, bornMs, running } of this.#agents) {
      if (!alive) continue
      aliveMs += this.#sinceMs(bornMs)
      if (running) usesMs[this.#useOf(running.item)] += this.#sinceMs(running.startMs)
    }
    return { aliveMs, usesMs, kills: this.#kills, hedges: this.engine.counts.hedges }
  }

  /** How much of the time from then to now is in the accounts. */
  #sinceMs(startMs: number): number {
    return this.nowMs - Math.max(startMs, this.#fromMs)
  }

  // ------------------------------------------------------------------------------- the coordinator

  #turnLater(): void {
    this.#timetable.at(this.nowMs + turnMs, () => {
      this.#look()
      this.#turnLater()
    })
  }

  #look(): void {
    const facts = this.#facts
    this.#facts = []
    if (this.#fleetIsNews && this.#world.machines) {
      const hosts = [...this.#agents].map(({ name }) => ({ host: name, processor: 'x64', cores: 1 }))
      facts.unshift({ kind: 'fleet', hosts })
    }
    this.#fleetIsNews = false
    this.engine.take(facts, this.nowMs)
    for (let rows = this.engine.rows(); rows; rows = this.engine.rows()) {
      this.#disk.append(rows)
      this.engine.appended()
    }
    if (this.engine.status() !== 'running') return
    const wanted = Math.max(0, aheadItems * this.#world.workers - this.#sent.size)
    const items = this.engine.work(wanted, this.nowMs)
    for (const item of items) this.#sent.add(tryOf(item))
    this.#send(items)
  }

  // -------------------------------------------------------------------------------- the dispatcher

  #send(items: readonly WorkItem[]): void {
    const first: WorkItem[] = []
    for (const item of items) {
      if (item.avoid.length > 0 || item.avoidHosts || item.hedge) this.#address(item)
      else if (isUrgent(item)) first.push(item)
      else this.#open.push(item)
    }
    this.#open.unshift(...first)
    for (const agent of [...this.#idle]) this.#feed(agent)
  }

  /** To the agent with the fewest of such; dead ones that are not missed yet included. */
  #address(item: WorkItem): void {
    let chosen: Agent | undefined
    for (const agent of this.#agents) {
      const { name, running, addressed } = agent
      if (item.avoid.includes(name) || item.avoidHosts?.includes(name)) continue
      if (item.hedge && running && running.item.evaluation === item.evaluation) continue
      if (!chosen || addressed.length < chosen.addressed.length) chosen = agent
    }
    if (chosen) chosen.addressed.push(item)
    else this.#lose([item], 'handed-back')
  }

  #lose(items: readonly WorkItem[], cause: 'agent-lost' | 'handed-back'): void {
    const executor = { kind: 'process', worker: 'nobody', host: 'nobody' } as const
    for (const item of items) {
      if (!this.#sent.delete(tryOf(item))) continue
      this.#facts.push({ kind: 'lost', item, cause, detail: 'gone', executor })
    }
  }

  // ------------------------------------------------------------------------------------ the agents

  #begin(): void {
    const name = `agent-${++this.#births}`
    const agent: Agent = { name, bornMs: this.nowMs, addressed: [], alive: true, running: undefined }
    this.#agents.add(agent)
    this.#fleetIsNews = true
    const { meanLifeMs } = this.#world
    if (meanLifeMs < Number.POSITIVE_INFINITY) {
      const lifeMs = -meanLifeMs * Math.log(1 - this.#lives.uniform())
      this.#timetable.at(this.nowMs + lifeMs, () => this.#kill(agent))
    }
    this.#feed(agent)
  }

  #feed(agent: Agent): void {
    this.#idle.delete(agent)
    if (!agent.alive) return
    const item = agent.addressed.shift() ?? this.#open.shift()
    if (!item) {
      this.#idle.add(agent)
      return
    }
    const running = { item, startMs: this.nowMs }
    agent.running = running
    this.#timetable.at(this.nowMs + this.#world.wallMs(item), () => {
      if (agent.running === running && agent.alive) this.#finish(agent, running)
    })
  }

  #finish(agent: Agent, { item, startMs }: NonNullable<Agent['running']>): void {
    const wallMs = this.nowMs - startMs
    this.#usesMs[this.#useOf(item)] += this.#sinceMs(startMs)
    this.#answered.add(nameOf(item))
    agent.running = undefined
    const result = this.#world.resultOf(item)
    const digest = resultDigest(result)
    const executor = { kind: 'process', worker: agent.name, host: agent.name } as const
    const seconds = { cpuSeconds: wallMs / 1000, wallSeconds: wallMs / 1000 }
    this.#timetable.at(this.nowMs + this.#world.answerMs, () => {
      this.#sent.delete(tryOf(item))
      this.#facts.push({ kind: 'result', item, result, digest, executor, ...seconds })
    })
    this.#feed(agent)
  }

  #useOf(item: WorkItem): Use {
    if (this.#answered.has(nameOf(item))) return 'double'
    return item.purpose === 'evaluate' ? 'evaluated' : 'confirmed'
  }

  #kill(agent: Agent): void {
    const { nowMs } = this
    agent.alive = false
    this.#idle.delete(agent)
    this.#kills++
    this.#aliveMs += this.#sinceMs(agent.bornMs)
    if (agent.running) this.#usesMs.destroyed += this.#sinceMs(agent.running.startMs)
    this.#timetable.at(nowMs + this.#world.replacedAfterMs, () => this.#begin())
    const beats = Math.floor((nowMs - agent.bornMs) / times.heartbeatMs)
    const beatMs = agent.bornMs + beats * times.heartbeatMs
    // As the fleet of the real dispatcher counts: from the look that saw the last beat.
    const missedMs = upTo(beatMs, lookMs) + times.silentMs - 2 * lookMs
    this.#timetable.at(Math.max(nowMs, missedMs), () => this.#miss(agent, beatMs))
    const { running } = agent
    if (!running || running.startMs <= beatMs) return
    // Taken after the last beat: no agent ever said that it has it.
    const sweptMs = upTo(running.startMs, times.sweepMs) + upTo(times.silentMs, times.sweepMs)
    this.#timetable.at(Math.max(nowMs, sweptMs), () => {
      if (this.#sent.has(tryOf(running.item))) this.#send([running.item])
    })
  }

  #miss(agent: Agent, beatMs: number): void {
    const { running, addressed } = agent
    this.#agents.delete(agent)
    this.#fleetIsNews = true
    const held = running && running.startMs <= beatMs ? [running.item] : []
    this.#lose([...held, ...addressed.splice(0)], 'agent-lost')
  }
}

function upTo(ms: number, stepMs: number): number {
  return Math.ceil(ms / stepMs) * stepMs
}

function nameOf({ island, evaluation, purpose }: WorkItem): string {
  return `${island} ${evaluation} ${purpose}`
}
function tryOf(item: WorkItem): string {
  return `${nameOf(item)} ${item.attempt}`
}
