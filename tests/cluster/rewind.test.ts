// Promise: a search that committed lies and was corrected later can be begun again from before the first of them, with
// all that was true, and is then the search that no lie had entered.

import { describe, expect, it } from 'vitest'
import type { Engine } from '../../coordinator/engine/engine.js'
import { openEngine } from '../../coordinator/engine/recover.js'
import { KnownResults, rewind } from '../../coordinator/engine/rewind.js'
import { hex, resultDigest } from '../../shared/digests.js'
import { genomeFromBytes } from '../../shared/encodings.js'
import type { DispatchFact } from '../../shared/result.js'
import { stream } from '../../shared/streams.js'
import { fixtureTools, islandPlan, mixedPlan, simulated } from '../fixture.js'
import { Disk } from './disk.js'
import { steady } from './machines.js'
import { calm, World } from './world.js'

const plan = mixedPlan({
  islands: [islandPlan(1), islandPlan(2, { method: 'generational', order: 'cost' })],
  controls: [],
  migration: { everyRounds: 6, emigrants: 1, topology: 'ring', lag: 1, leave: 'best', arrive: 'worst' },
  replicates: { first: 1, topUp: 1, most: 2, shared: true },
  budget: { simulations: 400 },
})
const tools = fixtureTools(plan)

/** Honest machines simulate what is left. */
function continueHonestly(
  engine: Engine,
  disk: Disk,
): { readonly simulated: number; readonly digest: string } {
  let count = 0
  for (let look = 0; look < 10_000 && engine.status() === 'running'; look++) {
    const facts: DispatchFact[] = engine.work(1_000, 0).map((item) => {
      const genome = genomeFromBytes(plan.problem.spec, item.genome)
      const result = simulated(plan, genome, item.firstReplicate, item.replicates)
      const worker = ['a/1', 'a/2', 'a/3', 'a/4'].find((one) => !item.avoid.includes(one))!
      const executor = { kind: 'process', worker, host: 'a' } as const
      count++
      return {
        kind: 'result',
        item,
        result,
        digest: resultDigest(result),
        executor,
        cpuSeconds: 1,
        wallSeconds: 1,
      }
    })
    // What was handed out before and has no answer in the record is asked for once more.
    engine.take(facts, look * 60_000)
    for (let rows = engine.rows(); rows; rows = engine.rows()) {
      disk.append(rows)
      engine.appended()
    }
  }
  return { simulated: count, digest: hex(engine.search.digest()) }
}

describe('rewinding', () => {
  it('leads to the search of a calm day, with what was true before used again', () => {
    const truth = new World(plan, 1, calm).run(0)
    let corrected = 0
    let reused = 0
    for (let seed = 1; seed <= 60; seed++) {
      const fleet = { ...steady, hosts: 4, threads: 1, bad: 1, wrong: 300, lie: 'slight' } as const
      const { disk, engine } = new World(plan, seed, { ...calm, fleet }).run(4_000)
      const known = new KnownResults(tools, disk)
      const again = new Disk(stream(seed, 'weather', 13))
      again.append({
        arrivals: [],
        confirmations: [],
        births: [],
        commits: [],
        mail: [],
        events: known.decided,
        snapshots: [],
      })
      const options = { leaseMs: Number.POSITIVE_INFINITY, snapshotCommits: 50 }
      const { engine: begun } = openEngine(tools, again, options)
      const used = rewind(begun, known, again)
      if (engine.counts.corrections === 0) continue
      corrected++
      expect(known.doubtful.length, `seed ${seed}`).toBeGreaterThan(0)
      expect(begun.impurities()).toEqual([])
      const { engine: next } = openEngine(tools, again, options)
      const { simulated: more, digest } = continueHonestly(next, again)
      expect(digest, `seed ${seed}`).toBe(truth.digest)
      expect(more, `seed ${seed}`).toBeLessThan(truth.engine.counts.results)
      reused += used
    }
    expect(corrected).toBeGreaterThan(3)
    expect(reused).toBeGreaterThan(100)
  })
})
