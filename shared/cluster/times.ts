// Every span of time that coordinator and workers of a cluster must agree on, in one place. Tests run them scaled
// down; the relations between them are checked, so that no scale and no edit can break one silently.

import { check } from '../check.js'

export interface ClusterTimes {
  /** An agent says that it is alive, and what it holds. */
  readonly heartbeatMs: number
  /** Without a heartbeat for so long, its work is sent again. */
  readonly silentMs: number
  /** Lock of a job in the queue; also how long a job may be held by nobody known before it is sent again. */
  readonly leaseMs: number
  /** The coordinator looks for work that has vanished. */
  readonly sweepMs: number
  /** A command to Redis that takes longer counts as a stalled server. */
  readonly commandMs: number
  /** Longest wait between two attempts to reach Redis again. */
  readonly reconnectMostMs: number
  /** After a restart of Redis, agents come back spread over this span. */
  readonly reconnectSpreadMs: number
  /** A worker with work waiting that takes nothing for so long leaves. */
  readonly idleWithWorkMs: number
  /** Handing back after a signal; then the process ends whatever remains. */
  readonly handBackMs: number
  readonly leaveMs: number
  /** How long a job should last on the thread that simulates it. */
  readonly jobMs: number
  /** A search that is not announced again for so long is over for the agents. */
  readonly announcementMs: number
}

const unscaled: ClusterTimes = {
  heartbeatMs: 1_500,
  silentMs: 6_000,
  leaseMs: 15_000,
  sweepMs: 2_000,
  commandMs: 3_000,
  reconnectMostMs: 1_000,
  reconnectSpreadMs: 10_000,
  idleWithWorkMs: 60_000,
  handBackMs: 2_000,
  leaveMs: 5_000,
  jobMs: 2_000,
  announcementMs: 10_000,
}

/** The times, all multiplied by `scale` (1 outside tests). */
export function clusterTimes(scale = 1): ClusterTimes {
  check(scale > 0 && scale <= 10, 'times are scaled by a positive factor up to 10')
  const times = Object.fromEntries(
    Object.entries(unscaled).map(([name, ms]) => [name, Math.max(1, Math.round(ms * scale))]),
  ) as { readonly [name in keyof ClusterTimes]: number }
  check(times.heartbeatMs * 3 <= times.silentMs, 'two lost heartbeats are no silence')
  check(times.silentMs < times.leaseMs, 'a silent agent is noticed before its leases end')
  check(times.handBackMs < times.leaveMs, 'handing back ends before the process does')
  return times
}
