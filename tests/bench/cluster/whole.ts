// The whole path over Redis with real processes: `skerry run` here, `skerry work` beside it, a problem that costs
// nothing. Rates are read from what the coordinator shows, between a fifth and nine tenths of the search.

import { type ChildProcess, spawn } from 'node:child_process'
import { existsSync, readFileSync } from 'node:fs'
import { join } from 'node:path'
import { emittedRoot } from '../../../worker/entry.js'
import { RedisServer } from '../../tools/redis-server.js'
import { cpuSecondsOf } from '../processes.js'
import { writeSearch } from '../search.js'
import { trivialSearch } from '../whole-path.js'

export interface ClusterPathOptions {
  readonly folder: string
  readonly evaluations: number
  readonly cores: number
}
export interface ClusterPath {
  readonly evaluationsPerSecond: number
  readonly coordinatorCpuMicroseconds: number
  /** Of Redis. */
  readonly redisCpuMicroseconds: number
  readonly redisMegabytes: number
  readonly connections: number
}

interface Look {
  readonly ms: number
  readonly committed: number
  readonly coordinatorSeconds: number
  readonly redisSeconds: number
}

const lookMs = 100
const patienceMs = 300_000
const program = join(emittedRoot, 'coordinator', 'cli', 'skerry.js')

export async function runClusterPath({
  folder,
  evaluations,
  cores,
}: ClusterPathOptions): Promise<ClusterPath> {
  const server = await RedisServer.start()
  const file = writeSearch(folder, trivialSearch(evaluations))
  const record = join(folder, 'record')
  const start = (...words: string[]) => spawn(process.execPath, [program, ...words], { stdio: 'ignore' })
  const coordinator = start('run', file, '--record', record, '--redis', server.url)
  const worker = start(
    'work',
    '--redis',
    server.url,
    '--cores',
    String(cores),
    '--cache',
    join(folder, 'cache'),
  )
  let megabytes = 0
  let connections = 0
  try {
    const looks = await watch(record, coordinator, server, evaluations, () => {
      megabytes = Math.max(
        megabytes,
        Number(/used_memory:(\d+)/.exec(server.ask('INFO', 'memory'))?.[1]) / 2 ** 20,
      )
      connections = Number(/connected_clients:(\d+)/.exec(server.ask('INFO', 'clients'))?.[1]) - 1
    })
    const first = looks.find(({ committed }) => committed >= evaluations / 5)
    const last = looks.findLast(({ committed }) => committed <= 0.95 * evaluations)
    if (!first || !last || last.committed <= first.committed)
      throw new Error('the search was too short to be measured')
    const done = last.committed - first.committed
    return {
      evaluationsPerSecond: done / ((last.ms - first.ms) / 1000),
      coordinatorCpuMicroseconds: ((last.coordinatorSeconds - first.coordinatorSeconds) * 1e6) / done,
      redisCpuMicroseconds: ((last.redisSeconds - first.redisSeconds) * 1e6) / done,
      redisMegabytes: megabytes,
      connections,
    }
  } finally {
    for (const child of [coordinator, worker]) await ended(child)
    await server.close()
  }
}

async function watch(
  record: string,
  coordinator: ChildProcess,
  server: RedisServer,
  evaluations: number,
  middle: () => void,
): Promise<Look[]> {
  const looks: Look[] = []
  const startMs = performance.now()
  let seen = -1
  while (coordinator.exitCode === null && performance.now() - startMs < patienceMs) {
    await new Promise((resolve) => setTimeout(resolve, lookMs))
    const committed = committedIn(record)
    if (committed === seen) continue
    seen = committed
    if (committed >= evaluations / 2 && looks.every((look) => look.committed < evaluations / 2)) middle()
    looks.push({
      ms: performance.now(),
      committed,
      coordinatorSeconds: cpuSecondsOf(coordinator.pid ?? 0),
      redisSeconds: cpuSecondsOf(server.pid),
    })
    if (committed >= evaluations) break
  }
  return looks
}

function committedIn(record: string): number {
  const path = join(record, 'progress.json')
  if (!existsSync(path)) return 0
  try {
    return (JSON.parse(readFileSync(path, 'utf8')) as { committed: number }).committed
  } catch {
    return 0
  }
}

function ended(child: ChildProcess): Promise<void> {
  if (child.exitCode !== null || child.signalCode !== null) return Promise.resolve()
  return new Promise((resolve) => {
    child.once('exit', () => resolve())
    child.kill('SIGKILL')
  })
}
