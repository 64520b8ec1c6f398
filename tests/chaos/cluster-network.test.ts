// Promise: a network that loses a fifth of all packets, is slow, or goes dead in one direction past every lease costs
// time and nothing else. Workers run in a network namespace of the test's own.

import { join } from 'node:path'
import { expect, it } from 'vitest'
import { clusterTimes } from '../../shared/cluster/times.js'
import { ensureBuilt } from '../tools/built.js'
import { pause, RedisServer } from '../tools/redis-server.js'
import { cannotMakeNetworks, Network } from './network.js'
import { Bench, program, reportOf, searchOf, waitingProblem } from './programs.js'

const scale = 0.25
const password = 'weir'
const record = 'records/lossy'

it('(26, 27) a one-way partition past the lease, then 20 % loss at 1 Mbit/s: the digest of a calm day', async (context) => {
  const reason = cannotMakeNetworks()
  if (reason !== undefined) return context.skip(reason)
  ensureBuilt()
  const network = new Network()
  const bench = new Bench(scale)
  const server = await RedisServer.start(['--bind', '127.0.0.1', network.address, '--requirepass', password])
  const urlAt = (address: string) => `redis://:${password}@${address}:${server.port}`
  try {
    bench.write('problem.js', waitingProblem(6))
    bench.write('search.yaml', searchOf(600))
    const calm = bench.run('records/calm', ['--cores', '1']).ended
    const coordinator = bench.run(record, ['--redis', urlAt('127.0.0.1')])
    const committed = async (least: number) => {
      while (bench.committed(record) < least && !coordinator.isOver) await pause(50)
      expect(coordinator.isOver, coordinator.said()).toBe(false)
    }
    for (const host of ['h1', 'h2', 'h3']) {
      const words = ['work', '--redis', urlAt(network.address), '--host', host, '--cores', '1']
      const work = [process.execPath, program, ...words, '--cache', join(bench.folder, `cache-${host}`)]
      const [command = '', ...prefix] = network.prefix
      bench.startCommand(command, [...prefix, ...work])
    }
    await committed(60)
    network.lose({ out: 100, in: 0 })
    await pause(1.2 * clusterTimes(scale).leaseMs)
    network.heal()
    await committed(bench.committed(record) + 40)
    network.throttle('1mbit')
    network.lose({ out: 20, in: 20 })
    const { code, out, err } = await coordinator.ended
    expect(code, err).toBe(0)
    const reference = await calm
    expect(reference.code, reference.err).toBe(0)
    expect(reportOf(out)).toEqual(reportOf(reference.out))
  } finally {
    await bench.close()
    await server.close()
    network.close()
  }
})
