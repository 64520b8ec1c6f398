// The dispatcher of a search whose simulations run on a cluster, joined: Redis, the record's pinned problem, and what
// the engine decides about who may work.

import { randomBytes } from 'node:crypto'
import { defaultPrefix, keyName } from '../../../shared/cluster/keys.js'
import { signatureOf } from '../../../shared/cluster/signature.js'
import { clusterTimes } from '../../../shared/cluster/times.js'
import { type Needs, needsOf } from '../../../shared/needs.js'
import {
  certificateVariable,
  parseAddress,
  RedisCoordinatorQueue,
  showAddress,
} from '../../../worker/redis/index.js'
import { RedisDispatcher } from '../../dispatch/redis/dispatcher.js'
import type { Engine } from '../../engine/engine.js'
import type { OpenRecord } from '../../record/index.js'
import { version } from './version.js'

export interface ClusterOptions {
  /** Address of Redis, with its password. */
  readonly redis: string
  readonly redisUnprotected: boolean
  /** Key of the site; agents that have it run nothing without its signature. */
  readonly key: Uint8Array | undefined
  /** How workers are started, where the address of Redis is not all they need. */
  readonly workerCommand?: string
  /** Of each licence, how many the whole site has. */
  readonly tokens: Needs['tokens']
  readonly tell: (sentence: string) => void
}

export function clusterDispatcher(
  { redis, redisUnprotected, key, workerCommand, tokens, tell }: ClusterOptions,
  record: OpenRecord,
  engine: Engine,
): RedisDispatcher {
  const { plan } = record
  const search = keyName(plan.name)
  const times = clusterTimes(Number(process.env.SKERRY_TEST_TIME_SCALE ?? 1))
  const address = parseAddress(redis, process.env[certificateVariable])
  return new RedisDispatcher({
    queue: new RedisCoordinatorQueue({
      address,
      prefix: defaultPrefix,
      search,
      times,
      unprotected: redisUnprotected,
    }),
    plugin: record.pluginCode,
    shape: {
      columns: plan.problem.objectives.length + plan.problem.measures.length,
      cases: Math.max(1, plan.problem.cases.length),
    },
    times,
    clock: systemClock,
    nonce: randomBytes(8).toString('hex'),
    workerCommand: workerCommand ?? `skerry work --redis ${showAddress(address)}`,
    orders: () => ({ shutOut: [...engine.notUsed.hosts] }),
    tell,
    search: {
      search,
      record: record.identity,
      holder: record.epoch,
      pluginDigest: plan.problem.digest,
      pluginBytes: record.pluginCode.length,
      ...(key === undefined ? {} : { signature: signatureOf(key, plan.problem.digest) }),
      seed: plan.seed,
      sharedConditions: plan.replicates.shared,
      exactness: plan.problem.exactness ?? 'bits',
      needs: needsOf(plan.problem.needs),
      tokens,
      share: 1,
      skerry: version(),
    },
  })
}

const systemClock = {
  nowMs: () => performance.now(),
  after: (ms: number, call: () => void) => {
    const timer = setTimeout(call, ms)
    return () => clearTimeout(timer)
  },
}
