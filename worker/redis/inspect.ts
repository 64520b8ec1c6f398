// What a Redis is like, for `skerry preflight`: everything that makes a search on it slow, unsafe or impossible.

import { clusterTimes } from '../../shared/cluster/times.js'
import { isLoopback, type RedisAddress } from './address.js'
import { Link } from './link.js'
import { readServer, type ServerFacts } from './server.js'

export interface RedisReport extends ServerFacts {
  /** The address without its password. */
  readonly shown: string
  readonly loopback: boolean
  readonly tls: boolean
  readonly password: boolean
  readonly usedBytes: number
  /** 0: no limit. */
  readonly mostBytes: number
  readonly clients: number
  /** Undefined where access rules hide it. */
  readonly clientsMost: number | undefined
  /** 'none', 'snapshots', 'append-only file'. */
  readonly persistence: string
  /** Milliseconds, of `pings` round trips. */
  readonly pingMedianMs: number
  readonly pingMostMs: number
  readonly pings: number
  /** Its clock minus ours, as far as a round trip can tell. */
  readonly clockAheadMs: number
  /** What it answered when a key of ours was written and removed; undefined when that worked. */
  readonly writeTrouble: string | undefined
}

const pings = 100

/** @throws Refusal when it cannot be reached or does not let us in */
export async function inspectRedis(
  address: RedisAddress,
  prefix: string,
  nowMs: () => number,
): Promise<RedisReport> {
  const link = new Link({ address, times: clusterTimes(), name: 'skerry-preflight' })
  await link.open()
  try {
    const facts = await readServer(link)
    const info = await link.run((client) => client.info())
    return {
      ...facts,
      shown: link.shown,
      loopback: isLoopback(address),
      tls: address.tls,
      password: address.password !== undefined,
      usedBytes: numberIn(info, 'used_memory') ?? 0,
      mostBytes: numberIn(info, 'maxmemory') ?? 0,
      clients: numberIn(info, 'connected_clients') ?? 0,
      clientsMost: numberIn(info, 'maxclients'),
      persistence: persistenceOf(info),
      ...(await latency(link)),
      clockAheadMs: await clockAhead(link, nowMs),
      writeTrouble: await tryWriting(link, prefix),
    }
  } finally {
    link.close()
  }
}

async function latency(link: Link): Promise<Pick<RedisReport, 'pingMedianMs' | 'pingMostMs' | 'pings'>> {
  const times: number[] = []
  for (let n = 0; n < pings; n++) {
    const startMs = performance.now()
    await link.run((client) => client.ping())
    times.push(performance.now() - startMs)
  }
  times.sort((a, b) => a - b)
  return { pingMedianMs: times[pings >> 1]!, pingMostMs: times[pings - 1]!, pings }
}

async function clockAhead(link: Link, nowMs: () => number): Promise<number> {
  const beforeMs = nowMs()
  const [seconds, microseconds] = await link.run((client) => client.time())
  return Number(seconds) * 1000 + Number(microseconds) / 1000 - (beforeMs + nowMs()) / 2
}

/** A key that both coordinators and workers may write, under the access rules that come with Skerry. */
async function tryWriting(link: Link, prefix: string): Promise<string | undefined> {
  const key = `${prefix}:tokens:preflight`
  try {
    await link.run((client) => client.hset(key, 'tried', '1'))
    await link.run((client) => client.del(key))
    return undefined
  } catch (fault) {
    return fault instanceof Error ? fault.message : String(fault)
  }
}

function persistenceOf(info: string): string {
  if (numberIn(info, 'aof_enabled') === 1) return 'append-only file'
  return numberIn(info, 'rdb_last_save_time') !== undefined && numberIn(info, 'rdb_saves') !== 0
    ? 'snapshots'
    : 'none'
}

function numberIn(info: string, name: string): number | undefined {
  const match = new RegExp(`^${name}:(\\d+)\\r?$`, 'm').exec(info)
  return match ? Number(match[1]) : undefined
}
