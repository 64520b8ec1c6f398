// Thousands of agents on one Redis: they connect, work, lose it and come back, and leave. Agents are the real client
// code without simulators; a few processes hold them all.

import { type ChildProcess, fork } from 'node:child_process'
import { fileURLToPath } from 'node:url'
import { clusterTimes } from '../../../shared/cluster/times.js'
import { parseAddress, RedisAgentQueue } from '../../../worker/redis/index.js'
import { pause, RedisServer } from '../../tools/redis-server.js'

export interface CrowdOptions {
  readonly agents: number
  readonly processes: number
}
export interface Crowd {
  readonly connected: number
  readonly refusals: number
  readonly connectionsEach: number
  /** Between the first and the last that came back after Redis had been restarted. */
  readonly returnSeconds: number
  readonly returned: number
}

type Word =
  | { readonly kind: 'connected'; readonly refusals: number; readonly connected: number }
  | { readonly kind: 'returned'; readonly atMs: readonly number[] }

const returnMs = 40_000
const settleMs = 5_000

export async function runCrowd({ agents, processes }: CrowdOptions): Promise<Crowd> {
  const server = await RedisServer.start(['--maxclients', '10000'])
  const each = Math.ceil(agents / processes)
  const children = Array.from({ length: processes }, (_, n) =>
    startAgents({ port: server.port, agents: each, first: n * each }),
  )
  try {
    const told = await Promise.all(children.map((child) => word(child, 'connected')))
    const clients = Number(/connected_clients:(\d+)/.exec(server.ask('INFO', 'clients'))?.[1]) - 1
    const back = Promise.all(children.map((child) => word(child, 'returned')))
    await server.kill()
    await server.start()
    const atMs = (await back).flatMap((one) => one.atMs).sort((a, b) => a - b)
    return {
      connected: told.reduce((sum, one) => sum + one.connected, 0),
      refusals: told.reduce((sum, one) => sum + one.refusals, 0),
      connectionsEach: clients / (each * processes),
      returnSeconds: ((atMs.at(-1) ?? 0) - (atMs[0] ?? 0)) / 1000,
      returned: atMs.length,
    }
  } finally {
    for (const child of children) child.kill('SIGKILL')
    await server.close()
  }
}

interface AgentsOptions {
  readonly port: number
  readonly agents: number
  readonly first: number
}

function startAgents(options: AgentsOptions): ChildProcess {
  const child = fork(fileURLToPath(new URL('../main.js', import.meta.url)), ['--task', 'crowdAgents'])
  child.send(options)
  return child
}

function word<Kind extends Word['kind']>(
  child: ChildProcess,
  kind: Kind,
): Promise<Extract<Word, { kind: Kind }>> {
  return new Promise((resolve, reject) => {
    child.on('message', (message: Word) => {
      if (message.kind === kind) resolve(message as Extract<Word, { kind: Kind }>)
    })
    child.once('exit', (code) => reject(new Error(`a process of agents ended with ${code}`)))
  })
}

/** Holds its agents until it is killed. */
export async function holdAgents({ port, agents, first }: AgentsOptions): Promise<never> {
  const times = clusterTimes()
  const queues = Array.from(
    { length: agents },
    (_, n) =>
      new RedisAgentQueue({
        address: parseAddress(`redis://127.0.0.1:${port}`),
        prefix: 'skerry',
        agent: `crowd-${first + n}`,
        times,
      }),
  )
  let refusals = 0
  for (const [n, queue] of queues.entries()) {
    try {
      await queue.open()
      await queue.beat(beatOf(first + n))
    } catch {
      refusals++
    }
  }
  // Every process is here by now: the next heartbeat tells each how large the fleet is.
  await pause(settleMs)
  for (const [n, queue] of queues.entries()) await queue.beat(beatOf(first + n))
  const connected = queues.filter((queue) => queue.connected).length
  process.send?.({ kind: 'connected', refusals, connected } satisfies Word)
  while (queues.some((queue) => queue.connected)) await pause(5)
  const atMs: number[] = []
  const away = new Set(queues)
  for (const startMs = Date.now(); away.size > 0 && Date.now() - startMs < returnMs; await pause(20)) {
    for (const queue of away) {
      if (!queue.connected) continue
      away.delete(queue)
      // Of this machine's one clock: several processes are compared.
      atMs.push(Date.now())
    }
  }
  process.send?.({ kind: 'returned', atMs } satisfies Word)
  return new Promise(() => {})
}

function beatOf(first: number) {
  return {
    protocol: 1,
    agent: `crowd-${first}`,
    host: `host-${first}`,
    processor: 'x64',
    node: process.version,
    skerry: '0',
    pid: process.pid,
    cores: 1,
    beat: 1,
    state: 'idle',
    stateSeconds: 0,
    held: {},
    simulations: 0,
    failures: 0,
    lost: 0,
    handedBack: 0,
    rate: 0,
    memoryMB: 0,
    lastWord: '',
  } as const
}
