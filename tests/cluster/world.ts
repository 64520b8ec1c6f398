// A whole cluster under one seed: a virtual clock, a coordinator that crashes, a disk that loses what it was
// writing, workers that die, stall, duplicate, reorder, answer late and lie. The engine is the real one; only the
// world is made up (machines.ts has the machines of a fleet, where there is one). One run of a search takes milliseconds, and a failure is repeated by its seed.
//
// First comes a phase with faults, then one without that must finish.

import type { Engine } from '../../coordinator/engine/engine.js'
import type { Journal } from '../../coordinator/engine/ports.js'
import { openEngine } from '../../coordinator/engine/recover.js'
import { columnsOf } from '../../coordinator/evolution/estimate.js'
import type { SearchPlan } from '../../coordinator/evolution/plan.js'
import { hex, resultDigest } from '../../shared/digests.js'
import { genomeFromBytes } from '../../shared/encodings.js'
import type { DispatchFact, EvaluationResult, WorkItem } from '../../shared/result.js'
import { type Stream, stream } from '../../shared/streams.js'
import { fixtureCost, fixtureTools, simulated } from '../fixture.js'
import { Disk, Fenced, PowerCut } from './disk.js'
import { type Chosen, Machines, otherBits } from './machines.js'
import type { Weather } from './weather.js'

export { calm, stormOf, type Weather } from './weather.js'

export interface Ending {
  readonly digest: string
  readonly engine: Engine
  readonly disk: Disk
  readonly crashes: number
  /** Appends of a coordinator that had been replaced, all of them refused. */
  readonly fenced: number
  readonly simulations: number
  readonly liars: readonly string[]
  readonly machines: Machines | undefined
  /** Wrong results that were sent by machines, and those of them that the record used. */
  readonly lies: number
  readonly liesUsed: number
  readonly status: string
}

/** Something an operator orders once: after so many looks of the coordinator, or when it is started again after the end. */
export interface Order {
  /** A kind of event that changes the search. */
  readonly kind: string
  readonly at: number | 'the end'
  readonly give: (engine: Engine) => void
}

interface Arrival {
  readonly atMs: number
  readonly order: number
  readonly fact: DispatchFact
}

const leaseMs = 60_000

export class World {
  readonly #plan: SearchPlan
  readonly #weather: Weather
  readonly #draw: Stream
  readonly #disk: Disk
  readonly #inFlight: Arrival[] = []
  readonly #busyUntilMs: number[]
  #engine: Engine
  #journal: Journal
  /** A coordinator that has been replaced and does not know it yet. */
  #replaced: { readonly engine: Engine; readonly journal: Journal } | undefined
  #rests: readonly number[]
  #fenced = 0
  #nowMs = 0
  #order = 0
  #crashes = 0
  #simulations = 0
  #faulty = true
  readonly #snapshotCommits: number
  readonly #orders: readonly Order[]
  /** Given and durable; a crash in between is told by the record, where the kind is given once. */
  readonly #obeyed = new Set<Order>()
  #looks = 0
  readonly #machines: Machines | undefined
  /** The coordinator has not been told yet which machines there are. */
  #fleetIsNews = true
  readonly #lies: { readonly island: number; readonly evaluation: number; readonly digest: string }[] = []
  /** Some of what was handed out, to be done once more. */
  readonly #old: WorkItem[] = []

  constructor(plan: SearchPlan, seed: number, weather: Weather, ...orders: readonly Order[]) {
    this.#plan = plan
    this.#orders = orders
    this.#weather = weather
    this.#draw = stream(seed, 'weather', 2)
    this.#disk = new Disk(stream(seed, 'weather', 3))
    this.#busyUntilMs = new Array<number>(weather.workers).fill(0)
    this.#snapshotCommits = 10 + this.#draw.below(190)
    this.#rests = weather.rests
    this.#machines = weather.fleet && new Machines(weather.fleet, stream(seed, 'weather', 10))
    this.#journal = this.#disk.takeOver()
    this.#engine = this.#open()
  }

  get disk(): Disk {
    return this.#disk
  }

  #open(): Engine {
    this.#journal = this.#disk.takeOver()
    const [stopAfter] = this.#rests
    this.#fleetIsNews = true
    const { engine } = openEngine(fixtureTools(this.#plan), this.#disk, {
      leaseMs,
      hedgeLeastMs: 100,
      snapshotCommits: this.#snapshotCommits,
      ...(stopAfter === undefined ? {} : { stopAfter }),
    })
    return engine
  }

  /** Runs to the end: `stormSteps` looks of the coordinator with faults, then without. */
  run(stormSteps: number, stepsMost = 200_000): Ending {
    for (let step = 0; step < stepsMost; step++) {
      if (this.#faulty && step >= stormSteps) this.#calmDown()
      this.#disk.cutsPerThousand = this.#faulty ? this.#weather.crashes : 0
      try {
        if (this.#look()) break
      } catch (fault) {
        if (!(fault instanceof PowerCut)) throw fault
        this.#crashes++
        this.#engine = this.#open()
      }
    }
    return {
      digest: hex(this.#engine.search.digest()),
      engine: this.#engine,
      disk: this.#disk,
      crashes: this.#crashes,
      fenced: this.#fenced,
      simulations: this.#simulations,
      machines: this.#machines,
      lies: this.#lies.length,
      liesUsed: this.#lies.filter(({ island, evaluation, digest }) => {
        const used = this.#disk.arrival(island, evaluation)
        return used !== undefined && hex(used.digest) === digest
      }).length,
      liars: Array.from({ length: this.#weather.liars }, (_, worker) => nameOf(worker)),
      status: this.#engine.status(),
    }
  }

  #calmDown(): void {
    this.#faulty = false
    this.#machines?.settle()
    this.#loseWhoLeft()
    this.#fleetIsNews = true
  }

  /** What happens to the fleet, the queue and the coordinator between two looks. */
  #mishaps(): void {
    const { emptied, frozen, redelivered, fleet, mailTwice } = this.#weather
    if (this.#machines && fleet && this.#happens(fleet.changes)) {
      this.#machines.change()
      this.#loseWhoLeft()
      this.#fleetIsNews = true
    }
    if (this.#happens(emptied)) this.#inFlight.splice(0)
    if (this.#happens(frozen)) this.#nowMs += 2 * leaseMs
    const old = this.#happens(redelivered) ? this.#old[this.#draw.below(50)] : undefined
    if (old) this.#simulate(old)
    if (this.#happens(mailTwice)) {
      for (const { number } of this.#engine.search.islands) {
        const mail = this.#disk.lastMail(number)
        if (mail && !mail.ended) this.#engine.search.post.put(mail)
      }
    }
  }

  /** What was under way on machines that are gone comes back as lost, or not at all. */
  #loseWhoLeft(): void {
    const gone = ({ fact }: Arrival) =>
      fact.kind !== 'fleet' && !this.#machines!.isPresent(fact.executor.host)
    const lost = this.#inFlight.filter(gone)
    const left = this.#inFlight.filter((arrival) => !gone(arrival))
    this.#inFlight.splice(0, this.#inFlight.length, ...left)
    for (const { fact } of lost) {
      if (fact.kind !== 'result' || this.#draw.chance(1, 4)) continue
      const { item, executor } = fact
      const isolation = 'shared'
      const detail = 'its machine left'
      this.#arrive(this.#nowMs + 6_000, {
        kind: 'lost',
        item: { ...item, isolation },
        cause: 'agent-lost',
        detail,
        executor,
      })
    }
  }

  /** One look of the coordinator; true when there is nothing left to do. */
  #look(): boolean {
    this.#mishaps()
    const facts = this.#arrived()
    if (this.#machines && this.#fleetIsNews) {
      this.#fleetIsNews = false
      facts.unshift({ kind: 'fleet', hosts: this.#machines.present })
    }
    this.#letReplacedTry(facts)
    this.#engine.take(facts, this.#nowMs)
    this.#makeDurable()
    if (this.#obeys()) return false
    if (this.#engine.status() === 'rested' && this.#rests.length > 0) {
      this.#rests = this.#rests.slice(1)
      this.#stopAndStart()
      return false
    }
    if (this.#engine.status() !== 'running') return true
    if (this.#happens(this.#weather.stopped)) this.#stopAndStart()
    if (this.#happens(this.#weather.replaced)) {
      this.#replaced = { engine: this.#engine, journal: this.#journal }
      this.#engine = this.#open()
    }
    // A coordinator that has just been started has nothing to hand out before it has looked.
    this.#makeDurable()
    const room = this.#machines ? this.#machines.room(this.#nowMs) : 2 * this.#weather.workers
    const items = this.#engine.work(room, this.#nowMs)
    for (const item of items) {
      if (this.#weather.redelivered > 0) this.#old[this.#order % 50] = item
      this.#simulate(item)
      if (this.#happens(this.#weather.twice)) this.#simulate(item)
    }
    return false
  }

  /** As a signal stops it: snapshots of everything, then a new life. */
  #stopAndStart(): void {
    this.#engine.snapshotAll()
    this.#makeDurable()
    this.#engine = this.#open()
  }

  /** Frozen and thawed again: it sees the same results and may write nothing of what it makes of them. */
  #letReplacedTry(facts: readonly DispatchFact[]): void {
    if (!this.#replaced) return
    const { engine, journal } = this.#replaced
    engine.take(facts, this.#nowMs)
    const rows = engine.rows()
    if (!rows) return
    this.#replaced = undefined
    try {
      journal.append(rows)
    } catch (fault) {
      if (!(fault instanceof Fenced)) throw fault
      this.#fenced++
      return
    }
    throw new Error('a coordinator that was replaced has written')
  }

  /** Gives the operator's next order when it is time and the record does not hold it yet. */
  #obeys(): boolean {
    this.#looks++
    const order = this.#orders.find((one) => !this.#isObeyed(one))
    if (!order) return false
    if (order.at === 'the end') {
      if (this.#engine.status() === 'running') return false
      this.#engine = this.#open()
    } else if (this.#looks < order.at) return false
    order.give(this.#engine)
    this.#makeDurable()
    this.#obeyed.add(order)
    return true
  }

  #isObeyed(order: Order): boolean {
    if (this.#obeyed.has(order)) return true
    const isOnlyOne = this.#orders.filter(({ kind }) => kind === order.kind).length === 1
    return isOnlyOne && this.#engine.impurities().includes(order.kind)
  }

  #makeDurable(): void {
    for (let rows = this.#engine.rows(); rows; rows = this.#engine.rows()) {
      this.#journal.append(rows)
      this.#engine.appended()
    }
  }

  #arrived(): DispatchFact[] {
    if (this.#inFlight.length === 0) {
      // Nothing will arrive: only a lease that runs out can move the search.
      this.#nowMs += leaseMs
      return []
    }
    this.#inFlight.sort((a, b) => a.atMs - b.atMs || a.order - b.order)
    this.#nowMs = Math.max(this.#nowMs, this.#inFlight[0]!.atMs)
    const ready = this.#inFlight.filter((arrival) => arrival.atMs <= this.#nowMs)
    this.#inFlight.splice(0, ready.length)
    return ready.map((arrival) => arrival.fact)
  }

  #simulate(item: WorkItem): void {
    const chosen = this.#machines?.choose(item, this.#nowMs)
    if (this.#machines && !chosen) {
      const executor = { kind: 'thread', worker: 'nobody', host: 'nobody' } as const
      this.#arrive(this.#nowMs + 10, {
        kind: 'lost',
        item,
        cause: 'handed-back',
        detail: 'nobody fits',
        executor,
      })
      return
    }
    const worker = chosen ? 0 : this.#workerFor(item)
    const genome = genomeFromBytes(this.#plan.problem.spec, item.genome)
    const slow = chosen?.machine.isSlow ? 8 : 1
    const duration = fixtureCost(genome) * 100 * (1 + this.#draw.below(3)) * slow
    const delay = this.#happens(this.#weather.delayed) ? duration * this.#draw.below(1000) : 0
    const startMs = chosen
      ? this.#machines!.startOf(chosen.executor.worker, this.#nowMs, duration)
      : Math.max(this.#nowMs, this.#busyUntilMs[worker]!)
    const endMs = startMs + duration
    if (!chosen) this.#busyUntilMs[worker] = endMs
    const executor =
      chosen?.executor ?? ({ kind: 'thread', worker: nameOf(worker), host: `h${worker % 5}` } as const)
    const poison = this.#weather.poisonSize > 0 && genome.size![0] === this.#weather.poisonSize
    if (poison) {
      this.#arrive(endMs, { kind: 'lost', item, cause: 'died', detail: 'killed by the genome', executor })
      return
    }
    if (this.#happens(this.#weather.stalls)) return
    if (item.isolation === 'shared' && this.#happens(this.#weather.deadly)) {
      this.#arrive(endMs, {
        kind: 'lost',
        item,
        cause: 'died',
        detail: 'crashed with its neighbour',
        executor,
      })
      return
    }
    const handsBack = this.#happens(this.#weather.handsBack)
    if (handsBack || this.#happens(this.#weather.dies)) {
      const cause = handsBack ? 'handed-back' : 'agent-lost'
      this.#arrive(endMs, { kind: 'lost', item, cause, detail: 'preempted', executor })
      if (!this.#happens(this.#weather.late)) return
    }
    this.#simulations++
    const result = chosen ? this.#resultOn(item, genome, chosen) : this.#resultOf(item, genome, worker)
    const fact = {
      kind: 'result',
      item: this.#happens(this.#weather.misnumbered)
        ? { ...item, attempt: this.#draw.below(item.attempt + 2) }
        : item,
      result,
      digest: resultDigest(result),
      executor,
      cpuSeconds: duration / 1000,
      wallSeconds: duration / 1000,
    } as const
    this.#arrive(endMs + delay, fact)
    if (this.#happens(this.#weather.duplicates)) {
      for (let copies = 0; copies < 3; copies++) this.#arrive(endMs + delay + this.#draw.below(100_000), fact)
    }
    if (this.#happens(this.#weather.foreign)) {
      this.#arrive(endMs, { ...fact, item: { ...fact.item, evaluation: 1_000_000 + item.evaluation } })
    }
  }

  #resultOf(item: WorkItem, genome: Parameters<typeof fixtureCost>[0], worker: number): EvaluationResult {
    const result = simulated(this.#plan, genome, item.firstReplicate, item.replicates)
    const lies = this.#faulty && worker < this.#weather.liars && this.#draw.chance(this.#weather.lies, 1000)
    if (!lies) return result
    const values = result.values.slice()
    values[this.#draw.below(values.length)] = -5 + 3 * this.#draw.uniform()
    return { values, failures: [] }
  }

  /** What a machine makes of it: of the other class the last bits may be others, of a bad one anything. */
  #resultOn(
    item: WorkItem,
    genome: Parameters<typeof fixtureCost>[0],
    { machine }: Chosen,
  ): EvaluationResult {
    const fleet = this.#weather.fleet!
    const truth = simulated(this.#plan, genome, item.firstReplicate, item.replicates)
    const result = machine.isOther && fleet.otherBits ? otherBits(truth) : truth
    if (!machine.isBad || !this.#draw.chance(fleet.wrong, 1000)) return result
    const liar = fleet.lie === 'together' ? 0 : Number(machine.host.slice(1))
    const repeats = fleet.lie === 'alike' || fleet.lie === 'together'
    const draw = repeats ? stream(item.evaluation, 'weather', item.island, liar, 11) : this.#draw
    const values = result.values.slice()
    if (fleet.lie === 'slight') {
      // Worse on the first objective: no would-be best, so that only spot checks can find it.
      for (let at = 0; at < values.length; at += columnsOf(this.#plan.problem))
        values[at]! += 0.5 + draw.uniform()
    } else values[draw.below(values.length)] = -5 + 3 * draw.uniform()
    const lie = { values, failures: [] }
    this.#lies.push({ island: item.island, evaluation: item.evaluation, digest: hex(resultDigest(lie)) })
    return lie
  }

  /** A worker that may do it: the first free one of a random order, as a queue would have it. */
  #workerFor(item: WorkItem): number {
    const order = this.#draw.permutation(this.#weather.workers)
    for (const worker of order) if (!item.avoid.includes(nameOf(worker))) return worker
    // Everybody is to be avoided: a fresh process on some machine.
    this.#busyUntilMs.push(this.#nowMs)
    return this.#busyUntilMs.length - 1
  }

  #happens(inThousand: number): boolean {
    return this.#faulty && inThousand > 0 && this.#draw.chance(inThousand, 1000)
  }

  #arrive(atMs: number, fact: DispatchFact): void {
    this.#inFlight.push({ atMs, order: this.#order++, fact })
  }
}

function nameOf(worker: number): string {
  return `w${worker}`
}
