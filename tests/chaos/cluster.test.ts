// Promise: a search over Redis and eight real worker processes has the digest of one thread of one machine, whatever is
// done to workers, coordinator, Redis and network on the way, and nothing is counted twice.
// Rows 1, 11, 16, 17, 18, 20, 26, 27, 29, 32, 33 and 34 of the table of faults (tests/faults.md), all in one storm.
// Size: SKERRY_CHAOS_SEEDS (default 3). To repeat one: SKERRY_CHAOS_SEED=7 npx vitest run tests/chaos/cluster.test.ts

import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { stream } from '../../shared/streams.js'
import { ensureBuilt } from '../tools/built.js'
import { pause, RedisServer } from '../tools/redis-server.js'
import { Bench, type Ending, reportOf, searchOf, waitingProblem } from './programs.js'
import { BadLine } from './proxy.js'
import { faults, Storm, workers } from './storm.js'

const one = process.env.SKERRY_CHAOS_SEED
const seeds = one
  ? [Number(one)]
  : Array.from({ length: Number(process.env.SKERRY_CHAOS_SEEDS ?? 3) }, (_, at) => at + 1)
const scale = 0.1
const simulations = 2400

let calm: Bench
let reference: Promise<Ending>
beforeAll(() => {
  ensureBuilt()
  calm = benchOf()
  // One thread that waits most of the time: it runs beside the first storm.
  reference = calm.run('records/calm', ['--cores', '1']).ended
}, 120_000)
afterAll(() => calm.close())

function benchOf(): Bench {
  const bench = new Bench(scale)
  bench.write('problem.js', waitingProblem(8))
  bench.write('search.yaml', searchOf(simulations))
  return bench
}

type Fault = keyof typeof faults
/** Every fault once, kills and network more often; the order follows from the seed. */
function faultsOf(seed: number): Fault[] {
  const draw = stream(seed, 'weather', 32)
  const all = Object.keys(faults) as Fault[]
  const again: Fault[] = ['kill -9 a worker', 'kill -9 a worker', 'kill -9 a worker', 'cut connections']
  return shuffled([...all, ...again], (below) => draw.below(below))
}

function shuffled<Item>(items: Item[], below: (count: number) => number): Item[] {
  for (let i = items.length - 1; i > 0; i--) {
    const j = below(i + 1)
    const [a, b] = [items[i]!, items[j]!]
    items[i] = b
    items[j] = a
  }
  return items
}

describe.each(seeds)('a storm over a real cluster, seed %i', (seed) => {
  it('ends with the digest of one thread on a calm day, nothing lost and nothing counted twice', async () => {
    const bench = benchOf()
    const server = await RedisServer.start()
    const proxy = await BadLine.open(server.port, seed)
    const storm = new Storm(bench, server, proxy, seed, scale)
    try {
      storm.begin()
      await working(storm)
      for (const fault of faultsOf(seed)) {
        if (!storm.isOn) break
        await storm.fault(fault)
        await pause(300 + 600 * storm.draw.uniform())
      }
      const ending = await storm.finished(400)
      const { code, out, err } = await reference
      expect(code, err).toBe(0)
      expect(ending).toEqual(reportOf(out))
      expect(storm.killed).toBeGreaterThanOrEqual(0.3 * workers)
      expect(storm.log.length).toBeGreaterThan(12)
      expect(storm.shuffled).toBeGreaterThan(0)
      const again = await bench.start(['rederive', 'records/storm', '--resimulate', '10', '--json']).ended
      expect(again.code, again.err).toBe(0)
      expect(JSON.parse(again.out)).toMatchObject({ digest: ending.digest, resimulated: 10 })
    } catch (fault) {
      const repeat = `repeat with SKERRY_CHAOS_SEED=${seed} npx vitest run tests/chaos/cluster.test.ts`
      throw new Error(`${repeat}\n${storm.told()}`, { cause: fault })
    } finally {
      await bench.close()
      await proxy.close()
      await server.close()
    }
  }, 600_000)
})

/** Resolves when the first results are committed. */
async function working(storm: Storm): Promise<void> {
  while (storm.isOn && storm.bench.committed('records/storm') < 40) await pause(50)
}
