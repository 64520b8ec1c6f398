// `skerry work`: a worker agent on this machine. It serves whatever searches are announced on a Redis until it is told
// to end, or has a reason of its own.

import { addressVariable } from '../../worker/redis/address.js'
import type { Command } from './command.js'

export const workCommand: Command = {
  name: 'work',
  summary: 'Simulate for the searches of a cluster on this machine.',
  arguments: [],
  options: [
    {
      flag: '--redis',
      value: 'URL',
      kind: 'text',
      help: `Redis of the cluster, redis://HOST:PORT (default: the variable ${addressVariable}, which hides a password)`,
    },
    {
      flag: '--record',
      value: 'DIR',
      kind: 'text',
      help: 'folder of a record whose coordinator runs with --own-redis; the worker waits for it and follows it',
    },
    {
      flag: '--cores',
      value: 'N',
      kind: 'count',
      help: 'simulations at once (default: every core of this machine)',
    },
    { flag: '--host', value: 'NAME', kind: 'text', help: 'name of this machine (default: its host name)' },
    {
      flag: '--until',
      value: 'TIME',
      kind: 'text',
      help: 'when this machine is taken away (default: SLURM_JOB_END_TIME); nothing is begun that would not end before',
    },
    { flag: '--idle-exit', value: 'SECONDS', kind: 'count', help: 'end after so long without work' },
    {
      flag: '--metrics',
      value: 'PORT',
      kind: 'count',
      help: 'serve metrics on this port of 127.0.0.1, /metrics',
    },
    {
      flag: '--key',
      value: 'FILE',
      kind: 'text',
      help: 'key of this site: run only problems that its coordinators have signed',
    },
    { flag: '--cache', value: 'DIR', kind: 'text', help: 'folder where problems are kept' },
  ],
  examples: [
    'skerry work --redis redis://queue.works.example:6379',
    'skerry work --record /shared/culvert --cores 16',
    'skerry work --cores 16 --idle-exit 600',
  ],
  run: async (input) => (await import('./join/agent.js')).serve(input),
}
