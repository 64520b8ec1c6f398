// What a search leaves for people when it stands still: the best machine simulated again on fresh conditions, a
// picture, a replay and a summary, all in the record's folder.
//
// The estimate that made a machine the best was used to choose it and is too good on average; the retest uses
// conditions that no machine was ever selected on: replicates numbered beyond all that a search may use.

import { renameSync, writeFileSync } from 'node:fs'
import { join } from 'node:path'
import { conditionStream } from '../../../shared/conditions.js'
import { hex } from '../../../shared/digests.js'
import { nameOf } from '../../../shared/ids.js'
import { limits } from '../../../shared/limits.js'
import type { AnyProblem } from '../../../shared/problem.js'
import type { EvaluationResult } from '../../../shared/result.js'
import type { Dispatcher } from '../../engine/ports.js'
import { drawPictures } from '../../evidence/pictures/draw.js'
import {
  alwaysCaution,
  cautionText,
  type PictureFacts,
  resultSentence,
} from '../../evidence/pictures/facts.js'
import { estimateOf, replicateValues } from '../../evolution/estimate.js'
import type { SearchPlan } from '../../evolution/plan.js'
import type { Search } from '../../evolution/search.js'
import type { Individual } from '../../evolution/types.js'
import { bestOf, estimatesOf, standardErrorOf } from './view.js'

export interface Finish {
  readonly summary: readonly string[]
  readonly files: readonly { readonly what: string; readonly path: string }[]
}

/** Fresh conditions the best is simulated on. */
export const retestReplicates = 24
const firstFreshReplicate = limits.replicatesMost
const retestWaitMs = 250

/** Simulates the individual on fresh conditions; undefined when the work is lost or interrupted. Failed simulations are a result. */
export async function retest(
  search: Search,
  best: Individual,
  dispatcher: Dispatcher,
  signal: AbortSignal,
): Promise<EvaluationResult | undefined> {
  const island = search.islands[0]!
  dispatcher.submit([
    {
      island: 0,
      evaluation: 0,
      individual: best.id,
      firstReplicate: firstFreshReplicate,
      replicates: retestReplicates,
      genome: island.bytesOf(best.genome),
      expectedCost: island.tools.expectedCost(best.genome),
      attempt: 1,
      purpose: 'evaluate',
      isolation: 'shared',
      avoid: [],
    },
  ])
  while (!signal.aborted) {
    for (const fact of await dispatcher.facts(retestWaitMs)) {
      if (fact.item.island !== 0) continue
      return fact.kind === 'result' ? fact.result : undefined
    }
  }
  return undefined
}

/** Writes picture, replay and summary of the best so far. Nothing where there is no best yet. */
export function writeFinish(
  folder: string,
  search: Search,
  problem: AnyProblem,
  tested: EvaluationResult | undefined,
): Finish {
  // A mean over the simulations that did not fail would flatter: the failures are told instead.
  const retested = tested?.failures.length === 0 ? tested : undefined
  const { plan } = search
  const best = bestOf(search.islands.filter((island) => !island.isControl))
  if (!best) return { summary: ['No machine has been simulated without failure yet.'], files: [] }
  const facts = { ...factsOf(search, problem, best, retested), ...failedOf(plan, tested) }
  const summary = summaryOf(search, best, facts, retested)
  const files = [write(folder, 'summary.txt', 'this summary', `${summary.join('\n')}\n`)]
  const { frames } = problem
  if (frames) {
    const condition = problem.drawCondition(
      conditionStream(plan.seed, plan.replicates.shared, best.id, firstFreshReplicate),
    )
    const situation = { condition, case: plan.problem.cases[0] ?? '' }
    const drawn = drawPictures(() => frames(best.genome as never, situation), facts)
    if ('fault' in drawn) return { summary: [...summary, drawn.fault], files }
    files.unshift(
      write(folder, 'best.svg', 'picture of the best machine', drawn.svg),
      write(folder, 'replay.html', 'replay, opens in a browser', drawn.html),
    )
  }
  return { summary, files }
}

function factsOf(
  search: Search,
  problem: AnyProblem,
  best: Individual,
  retested: EvaluationResult | undefined,
): PictureFacts {
  const { plan } = search
  const results = retested
    ? retestEstimates(plan, retested)
    : estimatesOf(plan, best).map(({ objective, unit, value, standardError }) => ({
        name: objective,
        unit,
        value,
        ...(standardError === undefined ? {} : { standardError }),
      }))
  const firstCase = plan.problem.cases[0]
  return {
    search: plan.name,
    id: nameOf(best.id),
    results,
    replicates: retested ? retestReplicates : best.replicates,
    shown: `the first fresh condition${firstCase ? `, case ${firstCase}` : ''}`,
    selected: retested === undefined,
    description: problem.describe?.(best.genome as never) ?? [],
    cautions: problem.cautions?.(best.genome as never) ?? [],
    provenance: [
      `Search digest ${hex(search.digest())}`,
      `Problem ${plan.problem.name} version ${plan.problem.version}, digest ${plan.problem.digest.slice(0, 16)}`,
      `Seed ${plan.seed}, rules ${plan.semantics}`,
    ],
  }
}

function failedOf(plan: SearchPlan, tested: EvaluationResult | undefined): Pick<PictureFacts, 'failed'> {
  const first = tested?.failures[0]
  if (!tested || !first) return {}
  const of = retestReplicates * Math.max(1, plan.problem.cases.length)
  return { failed: { simulations: tested.failures.length, of, because: first.reason } }
}

function retestEstimates(plan: SearchPlan, retested: EvaluationResult): PictureFacts['results'] {
  return plan.problem.objectives.map((objective, column) => {
    const standardError =
      objective.reduce === 'mean'
        ? standardErrorOf(replicateValues(plan.problem, objective, column, retested.values))
        : undefined
    return {
      name: objective.name,
      unit: objective.unit,
      value: estimateOf(plan.problem, objective, column, retested.values),
      ...(standardError === undefined ? {} : { standardError }),
    }
  })
}

function summaryOf(
  search: Search,
  best: Individual,
  facts: PictureFacts,
  retested: EvaluationResult | undefined,
): string[] {
  const chosen = {
    ...facts,
    results: toResults(search.plan, best),
    replicates: best.replicates,
    selected: true,
  }
  return [
    `Best machine: ${facts.id}`,
    ...(retested ? [`  On fresh conditions: ${resultSentence(facts)}`] : []),
    `  ${retested ? 'When it was chosen' : 'Estimate'}: ${resultSentence(chosen)}`,
    ...controlLines(search),
    ...facts.description.map((line) => `  ${line}`),
    `Search digest: ${hex(search.digest())}`,
    'Cautions:',
    ...facts.cautions.map((caution) => `  ${cautionText(caution)}`),
    `  ${alwaysCaution}`,
  ]
}

function toResults(plan: SearchPlan, individual: Individual): PictureFacts['results'] {
  return estimatesOf(plan, individual).map(({ objective, ...rest }) => ({ name: objective, ...rest }))
}

/** The controls' bests: what chance alone finds with as much work. */
function controlLines(search: Search): string[] {
  const controls = search.islands.filter((island) => island.isControl)
  return controls.flatMap((island) => {
    const { best } = island
    if (!best || best.failedSimulations > 0) return []
    const [first] = toResults(search.plan, best)
    const value = first ? `${first.name} ${Number(first.value.toPrecision(3))} ${first.unit}` : ''
    return [
      `  Control ${island.tools.island.method} after ${island.counters.committedSimulations} simulations: best ${nameOf(best.id)}, ${value} when it was chosen, on ${best.replicates} ${best.replicates === 1 ? 'replicate' : 'replicates'}`,
    ]
  })
}

/** Whole or not at all: a reader never sees half a file. */
export function write(
  folder: string,
  name: string,
  what: string,
  text: string,
): { what: string; path: string } {
  const path = join(folder, name)
  writeFileSync(`${path}.new`, text)
  renameSync(`${path}.new`, path)
  return { what, path }
}
