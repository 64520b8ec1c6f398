// Who is there: agents by their heartbeats. Clocks are never compared: an agent lives as long as its beat moves, by
// the coordinator's own monotonic clock. When the coordinator itself was stopped, or could not read, nobody is blamed
// for beats that it missed: everybody gets that time again.

import type { Heartbeat } from '../../../shared/cluster/messages.js'
import { protocolVersion } from '../../../shared/cluster/messages.js'
import type { ClusterTimes } from '../../../shared/cluster/times.js'
import type { FleetHost, WorkItem } from '../../../shared/result.js'

export interface Member {
  heartbeat: Heartbeat
  lastBeatMs: number
  /** Its beat has moved while we looked: what was found at the start may be long dead. */
  proven: boolean
  silent: boolean
}

export interface FleetNews {
  /** Fell silent: what they held is lost. */
  readonly silent: readonly Heartbeat[]
  /** Said good-bye, or were taken out. */
  readonly left: readonly Heartbeat[]
  /** Silent for so long that nothing of them need be kept. */
  readonly forgotten: readonly string[]
  readonly changed: boolean
}

/** How often the coordinator looks, as a part of a heartbeat: often, so that a silence is noticed in time. */
export const lookMs = ({ heartbeatMs }: ClusterTimes): number => Math.ceil(heartbeatMs / 3)

export class Fleet {
  readonly #times: ClusterTimes
  /** A beat is seen up to one look late, and so is its absence. */
  readonly #quietMs: number
  readonly #members = new Map<string, Member>()
  #looked = false
  #lastLookMs = 0
  #hosts = ''

  constructor(times: ClusterTimes) {
    this.#times = times
    this.#quietMs = times.silentMs - 2 * lookMs(times)
  }

  get(agent: string): Member | undefined {
    return this.#members.get(agent)
  }
  /** Everybody who lives, in order of name: the same choice for the same fleet. */
  alive(): Heartbeat[] {
    return [...this.#members.values()]
      .filter(({ silent, proven }) => proven && !silent)
      .map(({ heartbeat }) => heartbeat)
      .sort((a, b) => (a.agent < b.agent ? -1 : 1))
  }
  /** Everybody who is known, the silent as well. */
  all(): { readonly heartbeat: Heartbeat; readonly silent: boolean }[] {
    return [...this.#members.values()]
  }

  /** Takes in what lies in the server now. `excused`: the list may be short because the server was emptied. */
  look(heartbeats: readonly Heartbeat[], nowMs: number, excused = false): FleetNews {
    this.#forgive(nowMs)
    const seen = new Set<string>()
    for (const heartbeat of heartbeats) {
      if (heartbeat.protocol !== protocolVersion) continue
      seen.add(heartbeat.agent)
      this.#meet(heartbeat, nowMs)
    }
    this.#looked = true
    const left = excused ? [] : this.#absent(seen)
    const { silent, forgotten } = this.#listen(nowMs)
    const hosts = JSON.stringify(this.hosts())
    const changed = hosts !== this.#hosts
    this.#hosts = hosts
    return { silent, left, forgotten, changed }
  }

  /** Time in which nobody looked does not count against anybody. */
  #forgive(nowMs: number): void {
    const gapMs = nowMs - this.#lastLookMs - 2 * this.#times.heartbeatMs
    this.#lastLookMs = nowMs
    if (!this.#looked || gapMs <= 0) return
    for (const member of this.#members.values()) member.lastBeatMs += gapMs
  }

  #meet(heartbeat: Heartbeat, nowMs: number): void {
    const member = this.#members.get(heartbeat.agent)
    if (!member) {
      this.#members.set(heartbeat.agent, {
        heartbeat,
        lastBeatMs: nowMs,
        proven: this.#looked,
        silent: false,
      })
      return
    }
    if (member.heartbeat.beat === heartbeat.beat) return
    member.heartbeat = heartbeat
    member.lastBeatMs = nowMs
    member.proven = true
    member.silent = false
  }

  #absent(seen: ReadonlySet<string>): Heartbeat[] {
    const left: Heartbeat[] = []
    for (const [agent, { heartbeat, silent }] of this.#members) {
      if (seen.has(agent)) continue
      this.#members.delete(agent)
      if (!silent) left.push(heartbeat)
    }
    return left
  }

  #listen(nowMs: number): { silent: Heartbeat[]; forgotten: string[] } {
    const silent: Heartbeat[] = []
    const forgotten: string[] = []
    for (const [agent, member] of this.#members) {
      const quietMs = nowMs - member.lastBeatMs
      if (quietMs >= this.#quietMs && !member.silent) {
        member.silent = true
        silent.push(member.heartbeat)
      }
      if (quietMs > 4 * this.#times.leaseMs) {
        this.#members.delete(agent)
        forgotten.push(agent)
      }
    }
    return { silent, forgotten }
  }

  /** Machines that can simulate, each once, in order of name. */
  hosts(): FleetHost[] {
    const hosts = new Map<string, FleetHost>()
    for (const { host, processor, cores } of this.alive().filter(takesWork)) {
      const known = hosts.get(host)
      hosts.set(host, { host, processor: known?.processor ?? processor, cores: cores + (known?.cores ?? 0) })
    }
    return [...hosts.values()].sort((a, b) => (a.host < b.host ? -1 : 1))
  }
}

/** Whether this agent may simulate the item. */
export function mayRun(item: WorkItem, heartbeat: Heartbeat): boolean {
  if (!takesWork(heartbeat)) return false
  const { agent, host, processor } = heartbeat
  if (item.onProcessor !== undefined && item.onProcessor !== processor) return false
  if (item.avoidHosts?.includes(host)) return false
  return !(item.avoid.length > 0 && (item.avoid.includes(agent) || item.avoid.includes(host)))
}

export function takesWork({ state }: Heartbeat): boolean {
  return state !== 'draining' && state !== 'leaving'
}
