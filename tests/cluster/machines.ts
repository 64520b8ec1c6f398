// The machines of a simulated cluster: hosts with threads, of two classes of processors, some slow, some bad; they
// come and go. Which of them takes an item, and what it makes of it.

import type { EvaluationResult, Executor, FleetHost, WorkItem } from '../../shared/result.js'
import type { Stream } from '../../shared/streams.js'

export interface FleetWeather {
  /** The most hosts there are at once, and the most threads of one. */
  readonly hosts: number
  readonly threads: number
  /** Of 100 hosts so many are of the other class of processors. */
  readonly minority: number
  /** The other class gives other last bits. */
  readonly otherBits: boolean
  /** So many hosts are bad, and give a wrong result so often in 1000; 'alike': the same wrong one
   * whoever is asked there; 'together': all bad ones the same; 'slight': never too good. */
  readonly bad: number
  readonly wrong: number
  readonly lie: 'random' | 'alike' | 'slight' | 'together'
  /** Chances in 1000 per look that other hosts are there, none and a single one among the possibilities. */
  readonly changes: number
  /** Of 100 hosts so many are 8 times slower. */
  readonly slow: number
  /** How many hosts there are when the storm is over. */
  readonly inTheEnd: number
  /** While the storm lasts there is only one host; when it is over only hosts of the other class. */
  readonly oneFirst?: boolean
  readonly onlyOther?: boolean
}

export const steady: FleetWeather = {
  hosts: 6,
  threads: 2,
  minority: 0,
  otherBits: false,
  bad: 0,
  wrong: 0,
  lie: 'random',
  changes: 0,
  slow: 0,
  inTheEnd: 6,
}

export function fleetOf(draw: Stream): FleetWeather {
  const hosts = 1 + draw.below(12)
  return {
    ...steady,
    hosts,
    threads: 1 + draw.below(3),
    minority: draw.chance(1, 2) ? 0 : 10 + draw.below(40),
    changes: draw.chance(1, 2) ? 0 : 1 + draw.below(100),
    slow: draw.chance(1, 2) ? 0 : draw.below(30),
    inTheEnd: 1 + draw.below(hosts),
  }
}

export interface Machine extends FleetHost {
  readonly isOther: boolean
  readonly isBad: boolean
  readonly isSlow: boolean
}

export interface Chosen {
  readonly machine: Machine
  readonly executor: Executor
}

export class Machines {
  readonly all: readonly Machine[]
  readonly #draw: Stream
  readonly #weather: FleetWeather
  #present: readonly Machine[]
  #processes = 100
  /** Who simulated an evaluation last: a hedge goes elsewhere. */
  readonly #holders = new Map<string, string>()
  readonly #busyUntilMs = new Map<string, number>()

  constructor(weather: FleetWeather, draw: Stream) {
    this.#weather = weather
    this.#draw = draw
    const others = Math.round((weather.hosts * weather.minority) / 100)
    const order = draw.permutation(weather.hosts)
    this.all = Array.from({ length: weather.hosts }, (_, at) => ({
      host: `h${at}`,
      processor: at < weather.hosts - others ? 'x64 A' : 'x64 B',
      cores: 1 + draw.below(weather.threads),
      isOther: at >= weather.hosts - others,
      isBad: order.indexOf(at) < weather.bad,
      isSlow: draw.chance(weather.slow, 100),
    }))
    this.#present = weather.oneFirst ? this.all.slice(0, 1) : this.all
  }

  get present(): readonly FleetHost[] {
    return this.#present.map(({ host, processor, cores }) => ({ host, processor, cores }))
  }

  isPresent(host: string): boolean {
    return this.#present.some((machine) => machine.host === host)
  }

  /** Others are there now: none, a single one, or a drawn part. */
  change(): void {
    const size = [0, 1, 1 + this.#draw.below(this.all.length), this.all.length][this.#draw.below(4)]!
    this.#present = [...this.#draw.permutation(this.all.length)].slice(0, size).map((at) => this.all[at]!)
  }

  /** The storm is over: so many that are not bad stay, at least one. */
  settle(): void {
    const { onlyOther } = this.#weather
    const honest = this.all.filter(({ isBad, isOther }) => !isBad && (isOther || !onlyOther))
    this.#present = [
      ...honest.slice(0, Math.max(1, this.#weather.inTheEnd)),
      ...this.all.filter(({ isBad }) => isBad),
    ]
  }

  /** Who takes it; undefined when nobody who may is there. Second simulations have a process of their own. */
  choose(item: WorkItem, nowMs: number): Chosen | undefined {
    const { avoidHosts = [], onProcessor } = item
    const fitting = this.#present.filter(
      ({ host, processor }) =>
        !avoidHosts.includes(host) && (onProcessor === undefined || processor === onProcessor),
    )
    const key = `${item.island} ${item.evaluation}`
    const holder = item.hedge ? this.#holders.get(key) : undefined
    const others = fitting.filter(({ host }) => host !== holder)
    const from = others.length > 0 ? others : fitting
    if (from.length === 0) return undefined
    // By threads, as a queue that any of them may empty.
    const threads = from.flatMap((machine) =>
      Array.from({ length: machine.cores }, (_, thread) => ({
        machine,
        worker: `${machine.host}/1/t${thread}`,
      })),
    )
    // The one of two drawn that is free sooner, so that no queue grows without bound before a slow machine.
    const [one, two] = [0, 1].map(() => threads[this.#draw.below(threads.length)]!)
    const { machine, worker: thread } =
      this.#backlogMs(one!.worker, nowMs) <= this.#backlogMs(two!.worker, nowMs) ? one! : two!
    const isOwn = item.purpose === 'confirm' || item.avoid.includes(thread)
    const worker = isOwn ? `${machine.host}/${this.#processes++}` : thread
    this.#holders.set(key, machine.host)
    const kind = isOwn ? 'process' : 'thread'
    return { machine, executor: { kind, worker, host: machine.host, processor: machine.processor } }
  }

  #backlogMs(worker: string, nowMs: number): number {
    return Math.max(0, (this.#busyUntilMs.get(worker) ?? 0) - nowMs)
  }

  /** How many items it makes sense to hand out: two for every thread that is not busy for long. */
  room(nowMs: number): number {
    let free = 0
    for (const { host, cores } of this.#present) {
      for (let thread = 0; thread < cores; thread++) {
        if (this.#backlogMs(`${host}/1/t${thread}`, nowMs) < 15_000) free++
      }
    }
    return 2 * free
  }

  /** From when on the worker is free; it is busy for so long then. */
  startOf(worker: string, nowMs: number, durationMs: number): number {
    const startMs = Math.max(nowMs, this.#busyUntilMs.get(worker) ?? 0)
    this.#busyUntilMs.set(worker, startMs + durationMs)
    return startMs
  }
}

/** As another class of processors gives it: one step up in the last place. */
export function otherBits({ values, failures }: EvaluationResult): EvaluationResult {
  return { values: values.map((value) => value * (1 + 2 ** -52)), failures }
}
