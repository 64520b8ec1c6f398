// The Redis that shall carry the work: what was found, judged line by line.

import type { RedisReport } from '../../../worker/redis/inspect.js'
import { isNewEnough } from '../../../worker/redis/server.js'
import { bad, doubtful, good, type Line } from './line.js'

const pingMedianDoubtMs = 20
const clockDoubtMs = 5_000
const freeBytesLeast = 64 * 2 ** 20
/** Three connections a machine, and some for the coordinators. */
const clientsLeast = 64
const megabytes = (bytes: number): string => `${(bytes / 2 ** 20).toFixed(0)} MB`

export function judgeRedis(report: RedisReport): Line[] {
  return [
    good('reached', report.shown),
    version(report),
    policy(report),
    role(report),
    protection(report),
    memory(report),
    connections(report),
    persistence(report),
    latency(report),
    clock(report),
    rights(report),
  ]
}

function version({ version: found }: RedisReport): Line {
  return isNewEnough(found) ? good('version', found) : bad('version', found, 'install Redis 6.2 or newer')
}

function policy({ policy: found }: RedisReport): Line {
  const what = 'eviction policy'
  if (found === undefined)
    return doubtful(what, 'the access rules hide it', 'make sure that maxmemory-policy is noeviction')
  return found === 'noeviction'
    ? good(what, found)
    : bad(what, `${found}: it may forget work`, 'redis-cli CONFIG SET maxmemory-policy noeviction')
}

function role({ role: found }: RedisReport): Line {
  return found === 'master'
    ? good('role', 'takes writes')
    : bad('role', `a ${found}, which takes no writes`, 'name the primary in the address')
}

function protection({ loopback, tls, password }: RedisReport): Line {
  const what = 'protection'
  if (loopback) return good(what, 'only this machine reaches it by that address')
  if (!password)
    return bad(what, 'other machines reach it without a password', 'see worker/deploy/redis/users.acl')
  return tls
    ? good(what, 'password and TLS')
    : doubtful(what, 'password, but no TLS', 'use rediss:// unless you trust the network between the nodes')
}

function memory({ usedBytes, mostBytes }: RedisReport): Line {
  const what = 'memory'
  if (mostBytes === 0)
    return doubtful(
      what,
      `${megabytes(usedBytes)} used, no limit`,
      'set maxmemory, so that it cannot fill the machine',
    )
  const free = mostBytes - usedBytes
  const found = `${megabytes(usedBytes)} of ${megabytes(mostBytes)} used`
  return free >= freeBytesLeast ? good(what, found) : bad(what, found, 'raise maxmemory or empty it')
}

function connections({ clients, clientsMost }: RedisReport): Line {
  const what = 'connections'
  if (clientsMost === undefined) return good(what, `${clients} now`)
  const found = `${clients} of at most ${clientsMost}`
  return clientsMost - clients >= clientsLeast
    ? good(what, `${found}; a machine takes three`)
    : bad(what, found, 'raise maxclients: a machine takes three')
}

function persistence({ persistence: found }: RedisReport): Line {
  return good('persistence', `${found}; nothing depends on it, lost work is sent again`)
}

function latency({ pingMedianMs, pingMostMs, pings }: RedisReport): Line {
  const found = `${pingMedianMs.toFixed(2)} ms (median of ${pings}), the slowest ${pingMostMs.toFixed(2)} ms`
  return pingMedianMs <= pingMedianDoubtMs
    ? good('round trip', found)
    : doubtful('round trip', found, 'put Redis nearer to the workers, or make jobs longer')
}

function clock({ clockAheadMs }: RedisReport): Line {
  const seconds = (clockAheadMs / 1000).toFixed(1)
  const found = `its clock is ${seconds} s ahead of ours; nothing is decided by clocks`
  return Math.abs(clockAheadMs) <= clockDoubtMs
    ? good('clock', found)
    : doubtful('clock', found, 'set the clocks: logs of two machines cannot be laid side by side')
}

function rights({ writeTrouble }: RedisReport): Line {
  return writeTrouble === undefined
    ? good('rights', 'keys of ours can be written and removed')
    : bad('rights', writeTrouble, 'see worker/deploy/redis/users.acl for the rights that are needed')
}
