// Figures of this agent for Prometheus, on a port of this machine only, where somebody asks for them. One row a figure;
// the text format is version 0.0.4 of the Prometheus exposition formats. Base units; moments as Unix times.

import { createServer } from 'node:http'
import { agentStates } from '../../shared/cluster/messages.js'
import { refuse } from '../../shared/refusals.js'
import type { Agent } from './agent.js'

interface Reading {
  readonly labels?: { readonly [name: string]: string }
  readonly value: number
}

export interface MetricRow {
  /** Without the prefix; a counter ends in _total, the unit stands last before it. */
  readonly name: string
  readonly kind: 'counter' | 'gauge'
  /** '1' for what is counted and for truths. */
  readonly unit: 'seconds' | 'bytes' | '1'
  readonly help: string
  readonly read: (agent: Agent) => number | readonly Reading[]
}

const prefix = 'skerry_worker_'
const startSeconds = Date.now() / 1000

export const metricRows: readonly MetricRow[] = [
  {
    name: 'info',
    kind: 'gauge',
    unit: '1',
    help: 'Who this worker is; always 1.',
    read: ({ options: { agent, host, processor, skerry } }) => [
      { labels: { agent, host, processor, version: skerry }, value: 1 },
    ],
  },
  {
    name: 'state',
    kind: 'gauge',
    unit: '1',
    help: 'Which of its states the worker is in: 1 for that one, 0 for the others.',
    read: ({ condition }) =>
      Object.keys(agentStates).map((state) => ({
        labels: { state },
        value: condition.state === state ? 1 : 0,
      })),
  },
  {
    name: 'start_time_seconds',
    kind: 'gauge',
    unit: 'seconds',
    help: 'When it started.',
    read: () => startSeconds,
  },
  {
    name: 'simulations_total',
    kind: 'counter',
    unit: '1',
    help: 'Simulations that ended, failed ones among them.',
    read: ({ counters }) => counters.simulations,
  },
  {
    name: 'simulations_failed_total',
    kind: 'counter',
    unit: '1',
    help: 'Simulations that the problem answered as failed.',
    read: ({ counters }) => counters.failures,
  },
  {
    name: 'evaluations_lost_total',
    kind: 'counter',
    unit: '1',
    help: 'Evaluations that died, took too long or too much memory.',
    read: ({ counters }) => counters.lost,
  },
  {
    name: 'evaluations_handed_back_total',
    kind: 'counter',
    unit: '1',
    help: 'Evaluations given back unfinished.',
    read: ({ counters }) => counters.handedBack,
  },
  {
    name: 'leases_lost_total',
    kind: 'counter',
    unit: '1',
    help: 'Jobs whose lease ran out while they were held.',
    read: ({ counters }) => counters.leasesLost,
  },
  {
    name: 'simulated_seconds_total',
    kind: 'counter',
    unit: 'seconds',
    help: 'Time that simulations took on their cores.',
    read: ({ counters }) => counters.simulatedSeconds,
  },
  { name: 'cores', kind: 'gauge', unit: '1', help: 'Cores it may use.', read: ({ room }) => room.cores },
  {
    name: 'cores_busy',
    kind: 'gauge',
    unit: '1',
    help: 'Cores that simulations are using.',
    read: ({ room }) => room.coresInUse,
  },
  {
    name: 'jobs_held',
    kind: 'gauge',
    unit: '1',
    help: 'Jobs it has taken and not finished.',
    read: ({ hands }) => hands.jobs().length,
  },
  {
    name: 'answers_kept',
    kind: 'gauge',
    unit: '1',
    help: 'Answers and losses that Redis does not have yet.',
    read: ({ hands }) => [...hands.lanes.values()].reduce((sum, box) => sum + box.length, 0),
  },
  {
    name: 'searches',
    kind: 'gauge',
    unit: '1',
    help: 'Searches it serves.',
    read: ({ services }) => services.lanes().length,
  },
  {
    name: 'searches_refused',
    kind: 'gauge',
    unit: '1',
    help: 'Searches that are announced and that it does not serve.',
    read: ({ services }) =>
      [...services.bySearch.values()].filter(({ refused }) => refused !== undefined).length,
  },
  {
    name: 'redis_connected',
    kind: 'gauge',
    unit: '1',
    help: '1 while Redis answers.',
    read: ({ server }) => (server.connected ? 1 : 0),
  },
  {
    name: 'last_answer_time_seconds',
    kind: 'gauge',
    unit: 'seconds',
    help: 'When Redis last took an answer; 0 before the first.',
    read: ({ counters }) => counters.lastAnswerSeconds,
  },
  {
    name: 'resident_memory_bytes',
    kind: 'gauge',
    unit: 'bytes',
    help: 'Memory of the worker itself, without its simulating processes.',
    read: () => process.memoryUsage.rss(),
  },
]

export function metricsText(agent: Agent): string {
  return metricRows
    .flatMap(({ name, kind, help, read }) => {
      const found = read(agent)
      const readings: readonly Reading[] = typeof found === 'number' ? [{ value: found }] : found
      const lines = readings.map(({ labels, value }) => `${prefix}${name}${labelText(labels)} ${value}`)
      return [`# HELP ${prefix}${name} ${help}`, `# TYPE ${prefix}${name} ${kind}`, ...lines]
    })
    .map((line) => `${line}\n`)
    .join('')
}

function labelText(labels: Reading['labels']): string {
  if (labels === undefined) return ''
  const escaped = (text: string) => text.replace(/[\\"]/g, '\\$&').replace(/\n/g, '\\n')
  return `{${Object.entries(labels)
    .map(([name, text]) => `${name}="${escaped(text)}"`)
    .join(',')}}`
}

/** Serves /metrics on this port of 127.0.0.1; resolves with how to end that. @throws Refusal when the port is taken */
export function serveMetrics(port: number, agent: Agent): Promise<() => void> {
  const server = createServer((request, response) => {
    // Another name for this machine in Host is a page elsewhere that looks in through a visitor's browser.
    const isHere = /^(127\.0\.0\.1|localhost)(:\d+)?$/.test(request.headers.host ?? '')
    if (!isHere) response.writeHead(403).end()
    else if (request.method !== 'GET' || request.url !== '/metrics') response.writeHead(404).end()
    else
      response
        .writeHead(200, { 'content-type': 'text/plain; version=0.0.4; charset=utf-8' })
        .end(metricsText(agent))
  })
  // Whoever reads slowly holds up nobody.
  server.requestTimeout = 5000
  return new Promise((resolve, reject) => {
    server.once('error', (error) => {
      const cure = 'Name another port with --metrics.'
      reject(
        refuse('usage', {
          detail: `no metrics can be served on port ${port}: ${error.message}`,
          cure,
          cause: error,
        }),
      )
    })
    server.listen(port, '127.0.0.1', () =>
      resolve(() => {
        server.close()
        server.closeAllConnections()
      }),
    )
  })
}
