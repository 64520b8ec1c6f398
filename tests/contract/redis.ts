// The dispatcher over Redis as the contract suite asks for it: a real redis-server, the real agent beside the
// coordinator in this process, its threads and processes the usual ones.

import { mkdtempSync, readFileSync, rmSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import type { RedisDispatcher } from '../../coordinator/dispatch/redis/dispatcher.js'
import type { Dispatcher, DispatchStatus } from '../../coordinator/engine/ports.js'
import { clusterTimes } from '../../shared/cluster/times.js'
import type { DispatchFact, WorkItem } from '../../shared/result.js'
import { Agent, fixedLocation, PluginCache } from '../../worker/cluster/index.js'
import { createPool, type Pool } from '../../worker/pool.js'
import { parseAddress, RedisAgentQueue } from '../../worker/redis/index.js'
import { dispatcherOver } from '../tools/dispatcher-over.js'
import { pause, RedisServer } from '../tools/redis-server.js'
import type { DispatcherSetting, MakeDispatcher } from './dispatcher.js'

const times = clusterTimes(0.2)
const search = 'troublemaker'

/** `agents`: over how many agents, of hosts of their own, the slots are spread at most. */
export const overRedis =
  (agents = 1): MakeDispatcher =>
  (setting) =>
    new ClusterOfOne(setting, agents)

class ClusterOfOne implements Dispatcher {
  readonly #setting: DispatcherSetting
  readonly #agents: number
  readonly #folder = mkdtempSync(join(tmpdir(), 'skerry-cluster-'))
  readonly #leaving = new AbortController()
  #server: RedisServer | undefined
  #dispatcher: RedisDispatcher | undefined
  #running: Promise<unknown>[] = []
  readonly #pools: Pool[] = []

  constructor(setting: DispatcherSetting, agents: number) {
    this.#setting = setting
    this.#agents = Math.min(agents, setting.slots)
  }

  async start(): Promise<void> {
    const server = await RedisServer.start()
    this.#server = server
    const dispatcher = coordinatorOn(server, this.#setting)
    this.#dispatcher = dispatcher
    await dispatcher.start()
    for (let i = 0; i < this.#agents; i++) {
      const cores = Math.ceil((this.#setting.slots - i) / this.#agents)
      const name = `agent-${i + 1}`
      const options = { cores, name, folder: this.#folder, signal: this.#leaving.signal, pools: this.#pools }
      this.#running.push(agentOn(server, this.#setting, options).run())
    }
    while (dispatcher.status().slots < this.#setting.slots) await pause(20)
    await dispatcher.facts(0)
  }

  submit(items: readonly WorkItem[]): void {
    this.#dispatcher!.submit(items)
  }
  facts(waitMs: number): Promise<DispatchFact[]> {
    return this.#dispatcher!.facts(waitMs)
  }
  status(): DispatchStatus {
    return this.#dispatcher!.status()
  }

  async close(): Promise<void> {
    this.#leaving.abort()
    await Promise.all([this.#dispatcher?.close(), ...this.#running.splice(0)])
    // An agent's process would end now, and its simulations with it; this one goes on.
    await Promise.all(this.#pools.map((pool) => pool.close()))
    await this.#server?.close()
    rmSync(this.#folder, { recursive: true, force: true })
  }
}

function coordinatorOn({ url }: RedisServer, setting: DispatcherSetting): RedisDispatcher {
  const { seed, sharedConditions, megabytes: memoryMB } = setting
  const plugin = readFileSync(setting.pluginFile)
  const shape = { columns: 3, cases: 2 }
  return dispatcherOver(url, times, {
    search,
    record: 'contract',
    plugin,
    shape,
    seed,
    sharedConditions,
    memoryMB,
  })
}

interface AgentSetting {
  readonly cores: number
  readonly name: string
  readonly folder: string
  readonly signal: AbortSignal
  /** Told what it starts. */
  readonly pools: Pool[]
}

function agentOn(
  { url }: RedisServer,
  { leastSeconds, unmeasuredSeconds }: DispatcherSetting,
  { cores, name, folder, signal, pools }: AgentSetting,
): Agent {
  return new Agent({
    location: fixedLocation(url),
    createQueue: (address) =>
      new RedisAgentQueue({ address: parseAddress(address), prefix: 'skerry', agent: name, times }),
    createPool: (options, events) => {
      const pool = createPool({ ...options, timeLimit: { leastSeconds, unmeasuredSeconds } }, events)
      pools.push(pool)
      return pool
    },
    cache: new PluginCache({ folder: join(folder, name) }),
    agent: name,
    host: `host-of-${name}`,
    processor: 'test',
    cores,
    memoryMB: 64_000,
    times,
    skerry: '0',
    patienceMs: 5_000,
    nowMs: () => performance.now(),
    say: () => undefined,
    signal,
  })
}
