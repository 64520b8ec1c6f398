// The figures of a cluster: rows of the table in ../figures.ts, all named `cluster`.

import { cpus } from 'node:os'
import type { Figure } from '../figures.js'
import { runTask } from '../tasks.js'
import { measureEfficiency } from './efficiency.js'

const cores = Math.min(2, cpus().length)
const evaluationsEach = 32

export const clusterFigures: readonly Figure[] = [
  {
    name: 'cluster',
    what: 'the whole path over Redis beside the bare queue, with a trivial problem',
    rounds: { full: 3, quick: 1 },
    takes: 'best',
    dependsOnTime: true,
    async run({ quick, folder, number }) {
      const evaluations = quick ? 60_000 : 400_000
      const options = { jobs: quick ? 500 : 4000, evaluationsEach }
      // In turn, so that both meet the same company.
      const before = number % 2 === 1 ? await runTask('bare', options) : undefined
      const { result: path } = await runTask('clusterPath', { folder, evaluations, cores })
      const { result: bare } = before ?? (await runTask('bare', options))
      return [
        {
          name: 'whole path over Redis / bare queue',
          unit: '1',
          goal: { atLeast: 0.5 },
          value: path.evaluationsPerSecond / bare.evaluationsPerSecond,
          remark: `bare ${bare.evaluationsPerSecond.toFixed(0)} evaluations/s, ${evaluationsEach} a job of ${bare.bytesOut} bytes`,
        },
        {
          name: 'whole path over Redis',
          unit: 'evaluations/s',
          goal: { atLeast: 20_000 },
          value: path.evaluationsPerSecond,
          remark: `${path.redisCpuMicroseconds.toFixed(1)} us CPU of Redis each, ${path.redisMegabytes.toFixed(1)} MB there, ${path.connections} connections`,
        },
        {
          name: 'coordinator over Redis',
          unit: 'us CPU/evaluation',
          goal: { atMost: 40 },
          value: path.coordinatorCpuMicroseconds,
          remark: 'its process alone',
        },
      ]
    },
  },
  {
    name: 'cluster-memory',
    what: 'memory of Redis with 10,000 evaluations out, genomes of 4 kB',
    rounds: { full: 1, quick: 1 },
    takes: 'best',
    dependsOnTime: false,
    async run() {
      const { result } = await runTask('redisMemory', { evaluations: 10_000, genomeBytes: 4096 })
      return [
        {
          name: 'Redis, 10,000 evaluations of 4 kB out',
          unit: 'MB',
          goal: { atMost: 64 },
          value: result.megabytes,
          remark: `${result.jobs} jobs`,
        },
      ]
    },
  },
  {
    name: 'cluster-crowd',
    what: '2,000 agents on one Redis, which is restarted',
    rounds: { full: 1, quick: 1 },
    takes: 'best',
    dependsOnTime: false,
    async run({ quick }) {
      const agents = quick ? 200 : 2000
      const { result } = await runTask('crowd', { agents, processes: 4 })
      const remark = `${result.connected} of ${agents} connected, ${result.refusals} refused, ${result.returned} came back`
      return [
        {
          name: 'connections an agent',
          unit: '1',
          goal: { atMost: 3 },
          value: result.connectionsEach,
          remark,
        },
        { name: 'agents refused', unit: '1', goal: { atMost: 0 }, value: result.refusals, remark },
        {
          name: 'agents that did not come back',
          unit: '1',
          goal: { atMost: 0 },
          value: agents - result.returned,
          remark,
        },
        {
          name: 'span of their return',
          unit: 's',
          goal: { atLeast: 10 },
          value: result.returnSeconds,
          remark,
        },
      ]
    },
  },
  {
    name: 'cluster-efficiency',
    what: 'useful share of a fleet in virtual time: killed workers, orders of commits, migration, barriers',
    rounds: { full: 1, quick: 1 },
    takes: 'best',
    dependsOnTime: false,
    run: async ({ quick }) => measureEfficiency(quick),
  },
]
