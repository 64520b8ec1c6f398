import { expect, test } from 'vitest'
import type { RedisReport } from '../../../worker/redis/inspect.js'
import type { Line } from './line.js'
import { judgeMachine, type MachineFacts } from './machine.js'
import { judgeRedis } from './redis.js'

const fitMachine: MachineFacts = {
  nodeVersion: '20.19.0',
  cores: 4,
  freeBytes: 8 * 2 ** 30,
  openFiles: 4096,
  processes: Number.POSITIVE_INFINITY,
  nowMs: Date.UTC(2026, 11, 1),
}
const fitRedis: RedisReport = {
  version: '7.0.15',
  policy: 'noeviction',
  role: 'master',
  shown: 'rediss://worker@queue.example.org:6380',
  loopback: false,
  tls: true,
  password: true,
  usedBytes: 2 ** 20,
  mostBytes: 2 ** 29,
  clients: 12,
  clientsMost: 10_000,
  persistence: 'none',
  pingMedianMs: 0.4,
  pingMostMs: 3,
  pings: 100,
  clockAheadMs: -20,
  writeTrouble: undefined,
}
const notGood = (lines: readonly Line[]) =>
  lines
    .filter(({ status }) => status !== 'good')
    .map(({ what, status, cure }) => [what, status, cure !== undefined])

test('a fit machine and a fit Redis raise no doubt', () => {
  expect(notGood(judgeMachine(fitMachine))).toEqual([])
  expect(notGood(judgeRedis(fitRedis))).toEqual([])
})

test.each<[Partial<MachineFacts>, string, string]>([
  [{ nodeVersion: '20.18.3' }, 'Node', 'bad'],
  [{ nodeVersion: '18.20.0' }, 'Node', 'bad'],
  [{ freeBytes: 2 ** 28 }, 'memory', 'doubtful'],
  [{ openFiles: 256 }, 'open files', 'bad'],
  [{ openFiles: undefined }, 'open files', 'doubtful'],
  [{ processes: 64 }, 'processes', 'bad'],
  [{ nowMs: 0 }, 'clock', 'bad'],
])('machine %o: %s is %s, with a cure', (facts, what, status) => {
  expect(notGood(judgeMachine({ ...fitMachine, ...facts }))).toEqual([[what, status, true]])
})

test.each<[Partial<RedisReport>, string, string]>([
  [{ version: '6.0.16' }, 'version', 'bad'],
  [{ policy: 'allkeys-lru' }, 'eviction policy', 'bad'],
  [{ policy: undefined }, 'eviction policy', 'doubtful'],
  [{ role: 'slave' }, 'role', 'bad'],
  [{ password: false }, 'protection', 'bad'],
  [{ tls: false }, 'protection', 'doubtful'],
  [{ mostBytes: 0 }, 'memory', 'doubtful'],
  [{ usedBytes: 2 ** 29 - 2 ** 20 }, 'memory', 'bad'],
  [{ clientsMost: 20 }, 'connections', 'bad'],
  [{ pingMedianMs: 80 }, 'round trip', 'doubtful'],
  [{ clockAheadMs: 3_600_000 }, 'clock', 'doubtful'],
  [{ writeTrouble: 'NOPERM' }, 'rights', 'bad'],
])('Redis %o: %s is %s, with a cure', (facts, what, status) => {
  expect(notGood(judgeRedis({ ...fitRedis, ...facts }))).toEqual([[what, status, true]])
})
