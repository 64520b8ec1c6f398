// Packs waiting items into jobs: only items that ask for the same travel together, work that must go to certain
// agents is addressed, confirmations and what was lost go first.

import type { Heartbeat } from '../../../shared/cluster/messages.js'
import type { WorkItem } from '../../../shared/result.js'
import { mayRun, takesWork } from './fleet.js'
import type { JobPace } from './pace.js'

export interface Parcel {
  readonly items: readonly WorkItem[]
  readonly agent: string | undefined
  readonly urgent: boolean
}

export interface Parcels {
  readonly parcels: readonly Parcel[]
  /** Nobody here may do these. */
  readonly unfit: readonly WorkItem[]
}

export interface Circumstances {
  /** Items in one job, so that every thread gets something. */
  readonly most: number
  /** Items addressed to an agent; told what is added. */
  readonly load: Map<string, number>
  /** Agents that have an earlier try of an item already. */
  readonly holders: ReadonlyMap<WorkItem, ReadonlySet<string>>
}

export function pack(
  items: readonly WorkItem[],
  alive: readonly Heartbeat[],
  pace: JobPace,
  { most, load, holders }: Circumstances,
): Parcels {
  const unfit: WorkItem[] = []
  const groups = new Map<string, { agent: string | undefined; items: WorkItem[] }>()
  for (const item of items) {
    const agent = addresseeOf(item, alive, load, holders.get(item))
    if (agent === nobody) {
      unfit.push(item)
      continue
    }
    const name = groupName(item, agent)
    const group = groups.get(name)
    if (group) group.items.push(item)
    else groups.set(name, { agent, items: [item] })
  }
  return { parcels: [...groups.values()].flatMap((group) => split(group, pace, most)), unfit }
}

function split(
  { agent, items }: { readonly agent: string | undefined; readonly items: readonly WorkItem[] },
  pace: JobPace,
  most: number,
): Parcel[] {
  const parcels: Parcel[] = []
  // An item that runs alone may be about to die.
  const mostHere = items[0]?.isolation === 'alone' ? 1 : most
  for (let from = 0; from < items.length; ) {
    const end = pace.jobEnd(items, from, mostHere)
    const part = items.slice(from, end)
    parcels.push({ items: part, agent, urgent: part.some(isUrgent) })
    from = end
  }
  return parcels
}

/** No agent has an empty name. */
const nobody = ''
const nobodyYet: ReadonlySet<string> = new Set()

/** Undefined: anybody may. Agents whose rules are the same for all items need no address. */
function addresseeOf(
  item: WorkItem,
  alive: readonly Heartbeat[],
  load: Map<string, number>,
  holders: ReadonlySet<string> = nobodyYet,
): string | undefined {
  const constrained =
    item.onProcessor !== undefined || (item.avoidHosts?.length ?? 0) > 0 || item.avoid.length > 0
  if (!constrained && holders.size === 0) return undefined
  const able = alive.filter((heartbeat) => !holders.has(heartbeat.agent) && mayRun(item, heartbeat))
  const working = alive.filter(takesWork)
  if (able.length === working.length && able.length > 0) return undefined
  if (able.length === 0) return mustHaveSomebody(item) || alive.length > 0 ? nobody : undefined
  const chosen = able.reduce((least, other) => (loadOf(other, load) < loadOf(least, load) ? other : least))
  load.set(chosen.agent, (load.get(chosen.agent) ?? 0) + 1)
  return chosen.agent
}

/** Without any agent at all, what only avoids certain threads can wait for the first one. */
function mustHaveSomebody(item: WorkItem): boolean {
  return item.onProcessor !== undefined || (item.avoidHosts?.length ?? 0) > 0
}

function loadOf({ agent, cores }: Heartbeat, load: ReadonlyMap<string, number>): number {
  return (load.get(agent) ?? 0) / cores
}

function groupName(item: WorkItem, agent: string | undefined): string {
  const { purpose, isolation, avoid, avoidHosts } = item
  const avoided = avoid.length === 0 && !avoidHosts ? '' : JSON.stringify([avoid, avoidHosts ?? []])
  return `${agent ?? ''} ${purpose} ${isolation} ${isUrgent(item)} ${avoided}`
}

/**
 * Somebody waits for it: an island for a confirmation, or for the one evaluation that holds it up. What was lost is
 * older than all that waits: behind that, its island would use up its lookahead before it came to its turn.
 */
export function isUrgent({ purpose, hedge, attempt }: WorkItem): boolean {
  return purpose === 'confirm' || hedge === true || attempt > 1
}
