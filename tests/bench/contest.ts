// Is the search better than luck? The demo's search, and beside it the same number of simulations without selection
// (drift) and on fresh random individuals (random-sampling); the best of each is then simulated on fresh conditions,
// the same for all three, as every search ends (coordinator/cli/join/finish.ts).

import { retest, retestReplicates } from '../../coordinator/cli/join/finish.js'
import { bestOf } from '../../coordinator/cli/join/view.js'
import type { Island } from '../../coordinator/evolution/island.js'
import { demoSearch } from './crawler.js'
import type { Measure } from './measure.js'
import { openBenchSearch, type SearchParts } from './search.js'
import { bootstrapInterval, mean, signTest } from './statistics.js'

export interface ContestSeed {
  readonly seed: number
  /** Mean distance of the best on fresh conditions; a failed simulation counts as no way at all. */
  readonly metres: { readonly search: number; readonly drift: number; readonly randomSampling: number }
  readonly failedSimulations: {
    readonly search: number
    readonly drift: number
    readonly randomSampling: number
  }
}

export async function runContest(options: {
  readonly folder: string
  readonly seed: number
  readonly simulations: number
  readonly threads: number
}): Promise<ContestSeed> {
  const { folder, seed, simulations, threads } = options
  const text = demoSearch(simulations, seed, 'control: [{ kind: drift }, { kind: random-sampling }]')
  const parts = await openBenchSearch(folder, text, { threads })
  try {
    await parts.dispatcher.start()
    await parts.run()
    const [search, drift, randomSampling] = await retested(parts)
    return {
      seed,
      metres: { search: search.metres, drift: drift.metres, randomSampling: randomSampling.metres },
      failedSimulations: {
        search: search.failed,
        drift: drift.failed,
        randomSampling: randomSampling.failed,
      },
    }
  } finally {
    await parts.close()
  }
}

interface Retested {
  readonly metres: number
  readonly failed: number
}

/** The bests of the search, of drift and of random sampling, by the first objective, on the same fresh conditions. */
async function retested({
  engine,
  dispatcher,
  record,
}: SearchParts): Promise<readonly [Retested, Retested, Retested]> {
  const { islands } = engine.search
  const control = (method: string) => (island: Island) =>
    island.isControl && island.tools.island.method === method
  const sides = [(island: Island) => !island.isControl, control('drift'), control('random-sampling')]
  const bests = sides.map((side) => {
    const best = bestOf(islands.filter(side))
    if (!best) throw new Error('a contestant has no machine that does not fail')
    return best
  })
  const tests = await retest(engine.search, bests, dispatcher, new AbortController().signal)
  const { objectives, measures } = record.plan.problem
  const columns = objectives.length + measures.length
  const [search, drift, randomSampling] = bests.map((best) => {
    const result = tests.get(best)
    if (!result) throw new Error('a retest was lost')
    let sum = 0
    for (let row = 0; row < retestReplicates; row++) sum += result.values[row * columns]!
    return { metres: sum / retestReplicates, failed: result.failures.length }
  })
  return [search!, drift!, randomSampling!]
}

/** What the seeds say together. A seed is won by more metres than the better of the two controls. */
export function contestMeasures(seeds: readonly ContestSeed[]): readonly Measure[] {
  const ahead = seeds.map(({ metres }) => metres.search - Math.max(metres.drift, metres.randomSampling))
  const wins = ahead.filter((difference) => difference > 0).length
  const [low, high] = bootstrapInterval(ahead)
  const failed = seeds.reduce((sum, { failedSimulations: of }) => sum + of.search, 0)
  const searched = mean(seeds.map(({ metres }) => metres.search))
  const controls = mean(seeds.map(({ metres }) => Math.max(metres.drift, metres.randomSampling)))
  return [
    {
      name: `crawler: seeds of ${seeds.length} in which the search beats both controls`,
      unit: '1',
      goal: { atLeast: Math.ceil(0.9 * seeds.length) },
      value: wins,
      remark: `sign test p = ${signTest(wins, seeds.length).toPrecision(2)}; metres ahead: ${ahead.map((metres) => metres.toFixed(3)).join(' ')}`,
    },
    {
      name: 'crawler: mean way ahead of the better control',
      unit: 'm',
      goal: { atLeast: 0 },
      value: mean(ahead),
      remark: `95 % bootstrap interval ${low.toFixed(3)} to ${high.toFixed(3)} m; search ${searched.toFixed(3)} m, better control ${controls.toFixed(3)} m; ${failed} of ${seeds.length * retestReplicates} retests of the search failed`,
    },
  ]
}
