// What Redis holds while 10,000 evaluations with genomes of 4 kB are out and nobody takes them.

import { RedisDispatcher } from '../../../coordinator/dispatch/redis/dispatcher.js'
import { needsSchema } from '../../../shared/cluster/messages.js'
import { clusterTimes } from '../../../shared/cluster/times.js'
import { parseAddress, RedisCoordinatorQueue } from '../../../worker/redis/index.js'
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
  const times = clusterTimes()
  const search = 'memory'
  const dispatcher = new RedisDispatcher({
    queue: new RedisCoordinatorQueue({
      address: parseAddress(server.url),
      prefix: 'skerry',
      search,
      times,
      unprotected: false,
    }),
    plugin: new Uint8Array(400_000),
    shape: { columns: 1, cases: 1 },
    times,
    clock: {
      nowMs: () => performance.now(),
      after: (ms, call) => {
        const timer = setTimeout(call, ms)
        return () => clearTimeout(timer)
      },
    },
    nonce: '00',
    tell: () => {},
    search: {
      search,
      record: 'bench',
      holder: 1,
      pluginDigest: '0'.repeat(64),
      pluginBytes: 400_000,
      seed: 1,
      sharedConditions: true,
      exactness: 'bits',
      needs: needsSchema.parse({}),
      tokens: {},
      share: 1,
      skerry: '0',
    },
  })
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
