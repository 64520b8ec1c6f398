// The dispatcher of a search whose simulations run on this machine, joined: as many at once as there are cores, or as
// there is room and licences for where the problem says what one of them needs.

import { resolve } from 'node:path'
import { type Needs, needsOf, needsWords, placesFor } from '../../../shared/needs.js'
import { refuse } from '../../../shared/refusals.js'
import { memoryMB } from '../../../worker/cluster/machine.js'
import { createPool } from '../../../worker/pool.js'
import { type LocalPoolEvents, localDispatcher } from '../../dispatch/local.js'
import { inPlaces } from '../../dispatch/places.js'
import { underWeather } from '../../dispatch/weather.js'
import type { Dispatcher } from '../../engine/ports.js'
import type { SearchPlan } from '../../evolution/plan.js'

export interface HereOptions {
  readonly pluginFile: string
  readonly plan: Pick<SearchPlan, 'seed' | 'replicates' | 'problem'>
  readonly cores: number
  /** Of each licence, how many there are for this search. */
  readonly tokens: Needs['tokens']
}

/** @throws Refusal 'machine-too-small' where not even one simulation has room */
export function dispatcherHere({ pluginFile, plan, cores, tokens }: HereOptions): Dispatcher {
  const { needs } = plan.problem
  const threads = needs === undefined ? cores : placesHere(needs, cores, tokens)
  const pool = (events: LocalPoolEvents) =>
    createPool(
      {
        pluginFile: resolve(pluginFile),
        seed: plan.seed,
        sharedConditions: plan.replicates.shared,
        threads,
        megabytes: needsOf(needs).memoryMB,
      },
      events,
    )
  // Licences are counted in every process; so is room that is scarce.
  const isCounted = threads < cores || Object.keys(needs?.tokens ?? {}).length > 0
  const local = localDispatcher(isCounted ? inPlaces(threads, pool) : pool)
  // For tests of the promise that the order of arrival changes nothing; no option, because nobody else wants it.
  const weather = process.env.SKERRY_TEST_WEATHER
  return weather === undefined ? local : underWeather(local, { seed: Number(weather), baseMs: 1, oneIn: 12 })
}

function placesHere(needs: Needs, cores: number, tokens: Needs['tokens']): number {
  const there = { cores, memoryMB: memoryMB(), tokens }
  const places = placesFor(needs, there)
  if (places >= 1) return places
  const has = needsWords({
    ...there,
    tokens: Object.fromEntries(Object.keys(needs.tokens).map((name) => [name, tokens[name] ?? 0])),
  })
  throw refuse('machine-too-small', {
    detail: `a simulation takes ${needsWords(needs)}; here there are ${has}.`,
  })
}
