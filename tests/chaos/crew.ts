// The cluster's dispatcher in the test's own process, a real Redis, and real `skerry work` processes: the test sees
// every fact and when it came.

import { availableParallelism, loadavg } from 'node:os'
import { join } from 'node:path'
import type { RedisDispatcher } from '../../coordinator/dispatch/redis/dispatcher.js'
import { type ClusterTimes, clusterTimes } from '../../shared/cluster/times.js'
import { genomeBytes } from '../../shared/encodings.js'
import type { DispatchFact, WorkItem } from '../../shared/result.js'
import { bundlePlugin } from '../../worker/plugin/bundle.js'
import { dispatcherOver } from '../tools/dispatcher-over.js'
import { pause, RedisServer } from '../tools/redis-server.js'
import { Bench, type Life } from './programs.js'

export const search = 'weir'
const genome = { x: { kind: 'real', length: 1, low: 0, high: 1000, scale: 'linear' } } as const

/** Waits for x hundredths of a second; above 900 it never ends. */
const problem = `import { defineProblem, real } from 'skerry'
export default defineProblem({
  name: 'probe', version: '1', summary: 'Takes as long as it is told.',
  genome: { x: real({ low: 0, high: 1000 }) },
  objectives: { value: { direction: 'maximise', unit: '1' } },
  drawCondition: () => 0,
  simulate: ({ x: [x] }, situations) => situations.map(() => {
    Atomics.wait(new Int32Array(new SharedArrayBuffer(4)), 0, 0, x > 900 ? undefined : 10 * x)
    return { objectives: { value: x } }
  }),
})
`
export const endless = 950

/**
 * How much longer things may take than promised, because others use this machine too: 1 on a calm one. A promise about
 * seconds is about a machine that has a processor for it.
 */
export const patience = (): number => Math.max(1, loadavg()[0]! / availableParallelism())

export type Fact = DispatchFact & { readonly atMs: number }

export class Crew {
  readonly bench: Bench
  readonly server: RedisServer
  readonly dispatcher: RedisDispatcher
  readonly times: ClusterTimes
  readonly facts: Fact[] = []
  private closed = false
  private evaluations = 0
  private readonly reading: Promise<void>

  private constructor(bench: Bench, server: RedisServer, dispatcher: RedisDispatcher, times: ClusterTimes) {
    this.bench = bench
    this.server = server
    this.dispatcher = dispatcher
    this.times = times
    this.reading = this.read()
  }

  static async open(scale: number): Promise<Crew> {
    const bench = new Bench(scale)
    bench.write('problem.js', problem)
    const { code } = await bundlePlugin(join(bench.folder, 'problem.js'))
    const server = await RedisServer.start()
    const times = clusterTimes(scale)
    const dispatcher = dispatcherOn(server.url, new TextEncoder().encode(code), times)
    await dispatcher.start()
    return new Crew(bench, server, dispatcher, times)
  }

  worker(host: string): Life {
    return this.bench.work(this.server.url, host)
  }

  item(x: number, attempt = 1, evaluation = ++this.evaluations): WorkItem {
    return {
      island: 1,
      evaluation,
      individual: evaluation,
      firstReplicate: 0,
      replicates: 1,
      genome: genomeBytes(genome, { x: Float64Array.of(x) }),
      expectedCost: 1,
      attempt,
      purpose: 'evaluate',
      isolation: 'shared',
      avoid: [],
    }
  }

  /** Evaluations that were answered, each as often as it was. */
  get answered(): number[] {
    return this.facts.flatMap((fact) => (fact.kind === 'result' ? [fact.item.evaluation] : []))
  }
  get lost(): Fact[] {
    return this.facts.filter(({ kind }) => kind === 'lost')
  }

  /** Jobs that living agents say they hold, by host. */
  holders(): string[] {
    return this.dispatcher
      .agents()
      .flatMap(
        ({ heartbeat, silent }) => (silent ? [] : heartbeat.held[search]?.map(() => heartbeat.host)) ?? [],
      )
  }

  async close(): Promise<void> {
    this.closed = true
    await this.dispatcher.close()
    await this.reading
    await this.bench.close()
    await this.server.close()
  }

  private async read(): Promise<void> {
    while (!this.closed) {
      const facts = await this.dispatcher.facts(100)
      const atMs = performance.now()
      this.facts.push(...facts.map((fact) => ({ ...fact, atMs })))
    }
  }
}

function dispatcherOn(url: string, plugin: Uint8Array, times: ClusterTimes): RedisDispatcher {
  const shape = { columns: 1, cases: 1 }
  const made = { search, record: 'record-1', plugin, shape, seed: 1, sharedConditions: true, memoryMB: 256 }
  return dispatcherOver(url, times, made)
}

/** Resolves when it holds. */
export async function until(what: string, holds: () => boolean, seconds = 120): Promise<number> {
  const startMs = performance.now()
  while (!holds()) {
    if (performance.now() - startMs > 1000 * seconds) throw new Error(`not within ${seconds} s: ${what}`)
    await pause(5)
  }
  return performance.now()
}
