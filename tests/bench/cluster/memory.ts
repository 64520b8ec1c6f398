// What Redis holds while 10,000 evaluations with genomes of 4 kB are out and nobody takes them.

import { clusterTimes } from '../../../shared/cluster/times.js'
import { dispatcherOver } from '../../tools/dispatcher-over.js'
import { pause, RedisServer } from '../../tools/redis-server.js'
import { itemOf } from './payload.js'

export interface RedisMemory {
  readonly megabytes: number
  readonly jobs: number
}

export async function measureMemory(options: {
  readonly evaluations: number
  readonly genomeBytes: number
}): Promise<RedisMemory> {
  const server = await RedisServer.start()
  const search = 'memory'
  const plugin = new Uint8Array(400_000)
  const shape = { columns: 1, cases: 1 }
  const made = { search, record: 'bench', plugin, shape, seed: 1, sharedConditions: true, memoryMB: 1024 }
  const dispatcher = dispatcherOver(server.url, clusterTimes(), made)
  try {
    await dispatcher.start()
    const { evaluations, genomeBytes } = options
    dispatcher.submit(Array.from({ length: evaluations }, (_, i) => itemOf(i + 1, genomeBytes)))
    return await settled(server, search)
  } finally {
    await dispatcher.close()
    await server.close()
  }
}

/** Once no more jobs are added. */
async function settled(server: RedisServer, search: string): Promise<RedisMemory> {
  let before = -1
  for (;;) {
    await pause(1000)
    const jobs = Number(server.ask('LLEN', `skerry:s:${search}:work:wait`))
    if (jobs === before && jobs > 0) {
      const bytes = Number(/used_memory:(\d+)/.exec(server.ask('INFO', 'memory'))?.[1])
      return { megabytes: bytes / 2 ** 20, jobs }
    }
    before = jobs
  }
}
