// The dispatcher over a real Redis for a search that a test or a benchmark makes up.

import { randomBytes } from 'node:crypto'
import { RedisDispatcher } from '../../coordinator/dispatch/redis/dispatcher.js'
import type { ClusterTimes } from '../../shared/cluster/times.js'
import { hex, sha256 } from '../../shared/digests.js'
import { parseAddress, RedisCoordinatorQueue } from '../../worker/redis/index.js'

export interface MadeUpSearch {
  readonly search: string
  readonly record: string
  readonly plugin: Uint8Array
  readonly shape: { readonly columns: number; readonly cases: number }
  readonly seed: number
  readonly sharedConditions: boolean
  readonly memoryMB: number
}

export function dispatcherOver(url: string, times: ClusterTimes, made: MadeUpSearch): RedisDispatcher {
  const { search, record, plugin, shape, seed, sharedConditions, memoryMB } = made
  return new RedisDispatcher({
    queue: new RedisCoordinatorQueue({
      address: parseAddress(url),
      prefix: 'skerry',
      search,
      times,
      unprotected: false,
    }),
    plugin,
    shape,
    times,
    clock: {
      nowMs: () => performance.now(),
      after: (ms, call) => {
        const timer = setTimeout(call, ms)
        return () => clearTimeout(timer)
      },
    },
    nonce: randomBytes(8).toString('hex'),
    search: {
      search,
      record,
      holder: 1,
      pluginDigest: hex(sha256(plugin)),
      pluginBytes: plugin.length,
      seed,
      sharedConditions,
      exactness: 'bits',
      needs: { cores: 1, memoryMB, tokens: {} },
      tokens: {},
      share: 1,
      skerry: '0.0.0',
    },
  })
}
