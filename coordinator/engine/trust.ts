// Whose results are used: the machines there are, who is shut out, and the class of processors that the search may be
// pinned to. Who counts as one voter follows from it: with two or more machines a machine, because two threads of one
// bad machine must not outvote an honest one; else a process.

import { z } from 'zod'
import type { Executor, FleetHost } from '../../shared/result.js'
import { setAsideWorker } from './confirmed.js'

/** Where an item may be simulated. */
export interface Where {
  readonly avoid: readonly string[]
  readonly avoidHosts?: readonly string[]
  readonly onProcessor?: string
}

export type Simulator = Pick<Executor, 'worker' | 'host' | 'processor'>

const workerOutSchema = z.object({ worker: z.string() })
const hostOutSchema = z.object({ host: z.string() })
const pinnedSchema = z.object({ processor: z.string() })

const nobody: readonly string[] = []
const anywhere: Where = { avoid: nobody }

/** Of 'host/4711/t2' the part 'host/4711'. */
export function processOf(worker: string): string {
  const second = worker.indexOf('/', worker.indexOf('/') + 1)
  return worker.includes('/') && second > 0 ? worker.slice(0, second) : worker
}

export class Trust {
  readonly #hosts = new Map<string, FleetHost>()
  readonly #seen = new Set<string>()
  readonly #workersOut = new Set<string>()
  readonly #hostsOut = new Set<string>()
  #usable: readonly FleetHost[] = []
  #known = false
  #pinned: string | undefined
  #anywhere: Where = anywhere
  /** Grows with every change of the fleet, of who is shut out, of the pinned class. */
  version = 0

  /** False where the dispatcher never says which machines there are: then there is one. */
  get known(): boolean {
    return this.#known
  }
  get pinned(): string | undefined {
    return this.#pinned
  }
  get shutOutHosts(): ReadonlySet<string> {
    return this.#hostsOut
  }
  get shutOutWorkers(): ReadonlySet<string> {
    return this.#workersOut
  }
  get hosts(): readonly FleetHost[] {
    return [...this.#hosts.values()]
  }
  /** Machines whose results count now. */
  get usable(): readonly FleetHost[] {
    return this.#usable
  }
  /** Machines there have ever been. */
  get seen(): number {
    return this.#seen.size
  }
  get byHost(): boolean {
    return this.#usable.length >= 2
  }

  /** What an event of the record says about it; true when it says something. */
  recall({ kind, data }: { readonly kind: string; readonly data: unknown }): boolean {
    if (kind === 'worker-shut-out') this.shutOutWorker(workerOutSchema.parse(data).worker)
    else if (kind === 'host-shut-out') this.shutOutHost(hostOutSchema.parse(data).host)
    else if (kind === 'pinned-to-processor') this.pinTo(pinnedSchema.parse(data).processor)
    else return false
    return true
  }

  takeFleet(hosts: readonly FleetHost[]): void {
    this.#known = true
    this.#hosts.clear()
    for (const host of hosts) {
      this.#hosts.set(host.host, host)
      this.#seen.add(host.host)
    }
    this.#changed()
  }
  shutOutWorker(worker: string): void {
    this.#workersOut.add(worker)
    this.#changed()
  }
  shutOutHost(host: string): void {
    this.#hostsOut.add(host)
    this.#changed()
  }
  pinTo(processor: string): void {
    this.#pinned = processor
    this.#changed()
  }

  #changed(): void {
    this.version++
    const onClass = ({ processor }: FleetHost) => this.#pinned === undefined || processor === this.#pinned
    this.#usable = this.hosts.filter((host) => !this.#hostsOut.has(host.host) && onClass(host))
    const nobodyOut = this.#workersOut.size + this.#hostsOut.size === 0
    this.#anywhere = nobodyOut && this.#pinned === undefined ? anywhere : this.#where([], [], this.#pinned)
  }

  /** The class of whoever simulated; '' where it was never said. */
  classOf({ host, processor }: Simulator): string {
    return processor ?? this.#hosts.get(host)?.processor ?? ''
  }

  /** False: shut out, or of another class than the search is pinned to. */
  accepts(by: Simulator): boolean {
    if (by.worker === setAsideWorker) return true
    if (this.#workersOut.has(by.worker) || this.#hostsOut.has(by.host)) return false
    return this.#pinned === undefined || this.classOf(by) === this.#pinned
  }

  voterOf(by: Simulator): string {
    return this.byHost ? by.host : processOf(by.worker)
  }

  /** Is there a machine beside these whose results count, of this class if one is named? */
  elsewhere(hosts: ReadonlySet<string>, processor?: string): boolean {
    return this.#usable.some(
      (one) => !hosts.has(one.host) && (processor === undefined || one.processor === processor),
    )
  }

  /** The class with the most cores, ties by name; undefined without machines. */
  largestClass(): string | undefined {
    const cores = new Map<string, number>()
    for (const host of this.hosts) {
      if (this.#hostsOut.has(host.host)) continue
      cores.set(host.processor, (cores.get(host.processor) ?? 0) + host.cores)
    }
    const classes = [...cores].sort((a, b) => b[1] - a[1] || (a[0] < b[0] ? -1 : 1))
    return classes[0]?.[0]
  }

  /** For what nobody has simulated yet. */
  anywhere(): Where {
    return this.#anywhere
  }

  /** Neither these workers nor these machines nor whoever is shut out; on this class if one is named. */
  elsewhereThan(workers: readonly string[], hosts: readonly string[], processor?: string): Where {
    return this.#where(workers, hosts, processor ?? this.#pinned)
  }

  #where(workers: readonly string[], hosts: readonly string[], processor: string | undefined): Where {
    const avoidHosts = [...new Set([...hosts, ...this.#hostsOut])]
    return {
      avoid: [...new Set([...workers, ...this.#workersOut])],
      ...(avoidHosts.length > 0 ? { avoidHosts } : {}),
      ...(processor === undefined ? {} : { onProcessor: processor }),
    }
  }
}
