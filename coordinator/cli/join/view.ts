// From a search to what a person may know of it (progress-view.ts), running or at rest.

import { hex } from '../../../shared/digests.js'
import { islandName, nameOf } from '../../../shared/ids.js'
import { confirmedBy } from '../../engine/confirmed.js'
import type { RecordReader } from '../../engine/ports.js'
import { naturalValue, replicateValues, simulationsPerReplicate } from '../../evolution/estimate.js'
import type { Island } from '../../evolution/island.js'
import type { SearchPlan } from '../../evolution/plan.js'
import type { Search, Standing } from '../../evolution/search.js'
import type { Individual } from '../../evolution/types.js'
import { recordVersion } from '../../record/index.js'
import type { BestView, EstimateView, IslandView, ProgressView } from '../progress-view.js'
import { populationView } from './population.js'

export interface ViewFacts {
  readonly search: Search
  readonly reader: RecordReader
  readonly folder: string
  readonly state: ProgressView['state']
  readonly because?: string
  readonly standing?: (island: number) => Standing | undefined
  readonly rate?: ProgressView['rate']
}

export function progressView(facts: ViewFacts): ProgressView {
  const { search, reader, folder, state } = facts
  const islands = search.islands.filter((island) => !island.isControl)
  const sum = (of: (island: Island) => number) => islands.reduce((total, island) => total + of(island), 0)
  const best = bestOf(islands)
  const events = worldEvents(reader)
  return {
    state,
    ...(facts.because === undefined ? {} : { because: facts.because }),
    name: search.plan.name,
    record: folder,
    recordVersion,
    semantics: search.plan.semantics,
    committed: sum((island) => island.counters.commits),
    proposed: sum((island) => island.counters.evaluations),
    simulations: sum((island) => island.counters.committedSimulations),
    budget: sum((island) => island.quota),
    failedSimulations: sum((island) => island.counters.failedSimulations),
    setAside: events.setAside,
    ...(best ? { best: bestView(search.plan, reader, best) } : {}),
    islands: islands.map((island) => islandView(facts, island)),
    controls: search.islands.filter((island) => island.isControl).map((island) => islandView(facts, island)),
    digest: hex(search.digest()),
    purity: events.purity,
    ...(facts.rate ? { rate: facts.rate } : {}),
  }
}

/** The best by the first objective over these islands; ties go to the older. */
export function bestOf(islands: readonly Island[]): Individual | undefined {
  const bests = islands.flatMap((island) => island.best ?? []).filter((best) => best.failedSimulations === 0)
  return bests.reduce<Individual | undefined>((a, b) => {
    if (!a || b.score[0]! < a.score[0]!) return b
    return b.score[0] === a.score[0] && b.id < a.id ? b : a
  }, undefined)
}

export function bestView(plan: SearchPlan, reader: RecordReader, best: Individual): BestView {
  const by = confirmedBy(reader, best)
  return {
    id: nameOf(best.id),
    replicates: best.replicates,
    estimates: estimatesOf(plan, best),
    confirmed: by !== undefined,
    ...(by === undefined ? {} : { confirmedBy: by }),
  }
}

/** Every objective's estimate with its standard error where the reduction is a mean of two or more replicates. */
export function estimatesOf(plan: SearchPlan, individual: Individual): EstimateView[] {
  return plan.problem.objectives.map((objective, column) => {
    const values = replicateValues(plan.problem, objective, column, individual.values)
    const standardError = objective.reduce === 'mean' ? standardErrorOf(values) : undefined
    return {
      objective: objective.name,
      unit: objective.unit,
      value: naturalValue(objective, individual.score[column]!),
      ...(standardError === undefined ? {} : { standardError }),
    }
  })
}

/** Standard error of the mean, with n - 1; undefined for fewer than two values. */
export function standardErrorOf(values: Float64Array): number | undefined {
  const n = values.length
  if (n < 2) return undefined
  const mean = values.reduce((a, b) => a + b, 0) / n
  const squares = values.reduce((sum, value) => sum + (value - mean) * (value - mean), 0)
  return Math.sqrt(squares / (n - 1) / n)
}

function islandView(facts: ViewFacts, island: Island): IslandView {
  const { counters } = island
  const standing = facts.standing?.(island.number)
  return {
    name: islandName(island.number),
    method: island.tools.island.method,
    committed: counters.commits,
    proposed: counters.evaluations,
    simulations: counters.committedSimulations,
    quota: island.quota,
    epoch: counters.epochsPassed,
    state: stateOf(island, standing),
    ...becauseOf(facts, island, standing),
    ...(island.best ? { best: bestView(facts.search.plan, facts.reader, island.best) } : {}),
    ...(island.members().length < 2 ? {} : { population: populationView(facts.search.plan, island) }),
  }
}

function stateOf(island: Island, standing: Standing | undefined): IslandView['state'] {
  if (island.ended) return 'ended'
  if (island.paused) return 'paused'
  return standing === undefined || standing === 'result' ? 'searching' : 'waiting'
}

const standingWords: Partial<Record<Standing, string>> = {
  mail: 'for emigrants of its neighbours',
  confirmation: 'for emigrants to be confirmed',
  resting: 'because --stop-after asked for it',
}

function becauseOf(facts: ViewFacts, island: Island, standing: Standing | undefined): { because?: string } {
  if (island.ended) return { because: endedWords(facts.search.plan, island) }
  if (island.paused) return { because: 'by a change of the search file' }
  const words = standing && standingWords[standing]
  return words ? { because: words } : {}
}

/** An island may also end by target, stagnation, hours or date. */
function endedWords({ problem, replicates }: SearchPlan, island: Island): string {
  const block = replicates.first * simulationsPerReplicate(problem)
  const left = island.quota - island.counters.committedSimulations
  return left < block ? 'its part of the budget is used' : 'it ended before its part of the budget was used'
}

/** Facts of the world that entered: how many of each kind, as purity tells them. */
function worldEvents(reader: RecordReader): { setAside: number; purity: ProgressView['purity'] } {
  const kinds = new Map<string, { count: number; readonly sentence: string }>()
  const seen = new Set<string>()
  for (const event of reader.events()) {
    if (!event.changesSearch) continue
    // One fact is written down for every island it concerns.
    const key = `${event.kind} ${event.sentence}`
    if (seen.has(key)) continue
    seen.add(key)
    const known = kinds.get(event.kind)
    if (known) known.count++
    else kinds.set(event.kind, { count: 1, sentence: event.sentence })
  }
  const purity = [...kinds.values()].map(({ count, sentence }) =>
    count === 1 ? sentence : `${sentence} (and ${count - 1} more like it)`,
  )
  return { setAside: kinds.get('set-aside')?.count ?? 0, purity: purity.length === 0 ? 'none' : purity }
}
