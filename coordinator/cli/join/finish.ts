// What a search leaves for people when it stands still: the best machine simulated again on fresh conditions, a
// picture, a replay and a summary, all in the record's folder.
//
// The estimate that made a machine the best was used to choose it and is too good on average; the retest uses
// conditions that no machine was ever selected on: replicates numbered beyond all that a search may use.

import { renameSync, writeFileSync } from 'node:fs'
import { join } from 'node:path'
import { conditionStream } from '../../../shared/conditions.js'
import { hex } from '../../../shared/digests.js'
import { exactnessRules } from '../../../shared/exactness.js'
import { nameOf } from '../../../shared/ids.js'
import { limits } from '../../../shared/limits.js'
import { cautionsOf } from '../../../shared/making/cautions.js'
import type { AnyProblem } from '../../../shared/problem.js'
import type { EvaluationResult, LossCause, WorkItem } from '../../../shared/result.js'
import type { Dispatcher, RecordReader } from '../../engine/ports.js'
import { drawPictures } from '../../evidence/pictures/draw.js'
import {
  alwaysCaution,
  cautionText,
  type PictureFacts,
  resultSentence,
  resultText,
} from '../../evidence/pictures/facts.js'
import { estimateOf, replicateValues } from '../../evolution/estimate.js'
import type { Island } from '../../evolution/island.js'
import type { SearchPlan } from '../../evolution/plan.js'
import type { Search } from '../../evolution/search.js'
import type { Individual } from '../../evolution/types.js'
import { grouped } from '../numbers.js'
import { compareFresh, differenceSentence } from './comparison.js'
import { failureLines, nothingFound } from './failures.js'
import { bestOf, estimatesOf, standardErrorOf } from './view.js'

export interface Finish {
  /** Everything, as in summary.txt. */
  readonly summary: readonly string[]
  /** The same for a terminal: how it is built and the cautions in full stand in summary.txt. */
  readonly brief: readonly string[]
  readonly files: readonly { readonly what: string; readonly path: string }[]
}

/** Fresh conditions the best is simulated on. */
export const retestReplicates = 24
const firstFreshReplicate = limits.replicatesMost
const retestWaitMs = 250

/** Fresh simulations by individual; one that died, or was interrupted, is missing. Failed simulations are a result. */
export type Retests = ReadonlyMap<Individual, EvaluationResult>

/** Simulates the individuals on the same fresh conditions (each on its own, where the search has them so). */
export async function retest(
  search: Search,
  individuals: readonly Individual[],
  dispatcher: Dispatcher,
  signal: AbortSignal,
): Promise<Retests> {
  const island = search.islands[0]!
  const itemOf = (evaluation: number, attempt: number): WorkItem => {
    const { id, genome } = individuals[evaluation]!
    return {
      island: 0,
      evaluation,
      individual: id,
      firstReplicate: firstFreshReplicate,
      replicates: retestReplicates,
      genome: island.bytesOf(genome),
      expectedCost: island.tools.expectedCost(genome),
      attempt,
      purpose: 'evaluate',
      isolation: 'shared',
      avoid: [],
    }
  }
  const tested = new Map<Individual, EvaluationResult>()
  const open = new Set(individuals.keys())
  dispatcher.submit([...open].map((evaluation) => itemOf(evaluation, 1)))
  while (!signal.aborted && open.size > 0) {
    for (const fact of await dispatcher.facts(retestWaitMs)) {
      if (fact.kind === 'fleet' || fact.item.island !== 0 || !open.has(fact.item.evaluation)) continue
      const { evaluation, attempt } = fact.item
      if (fact.kind === 'lost' && isOfTheWorld[fact.cause]) {
        dispatcher.submit([itemOf(evaluation, attempt + 1)])
        continue
      }
      open.delete(evaluation)
      if (fact.kind === 'result') tested.set(individuals[evaluation]!, fact.result)
    }
  }
  return tested
}

/** Losses that say nothing of the individual: its worker went away, and another one may do it. */
const isOfTheWorld: { readonly [cause in LossCause]: boolean } = {
  died: false,
  'time-limit': false,
  memory: false,
  'agent-lost': true,
  'handed-back': true,
}

/** Whom a finished search simulates again: its best, then the best of every control. */
export function toRetest(search: Search): Individual[] {
  const best = bestOf(search.islands.filter((island) => !island.isControl))
  return best ? [best, ...controlBests(search).map(({ best: individual }) => individual)] : []
}

/** Writes picture, replay and summary of the best so far. Nothing where there is no best yet. */
export function writeFinish(
  folder: string,
  search: Search,
  problem: AnyProblem,
  tests: Retests,
  reader: Pick<RecordReader, 'arrival'>,
): Finish {
  const { plan } = search
  const best = bestOf(search.islands.filter((island) => !island.isControl))
  if (!best) {
    const summary = nothingFound(search, reader)
    return { summary, brief: summary, files: [] }
  }
  const tested = tests.get(best)
  // A mean over the simulations that did not fail would flatter: the failures are told instead.
  const retested = tested?.failures.length === 0 ? tested : undefined
  const facts = { ...factsOf(search, problem, best, retested), ...failedOf(plan, tested) }
  const { summary, brief } = summaryOf(search, problem, best, facts, tests)
  const files = [write(folder, summaryFile, 'this summary, in full', `${summary.join('\n')}\n`)]
  const { frames } = problem
  if (frames) {
    const condition = problem.drawCondition(
      conditionStream(plan.seed, plan.replicates.shared, best.id, firstFreshReplicate),
    )
    const situation = { condition, case: plan.problem.cases[0] ?? '' }
    const drawn = drawPictures(() => frames(best.genome as never, situation), facts)
    if ('fault' in drawn) return { summary: [...summary, drawn.fault], brief: [...brief, drawn.fault], files }
    files.unshift(
      write(folder, 'best.svg', 'picture of the best machine', drawn.svg),
      write(folder, 'replay.html', 'replay, opens in a browser', drawn.html),
    )
  }
  return { summary, brief, files }
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
    cautions: cautionsOf(problem, best.genome),
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

const summaryFile = 'summary.txt'
/** Lines on how it is built that a terminal still shows. */
const briefLines = 6

function summaryOf(
  search: Search,
  problem: Pick<AnyProblem, 'exactness'>,
  best: Individual,
  facts: PictureFacts,
  tests: Retests,
): { readonly summary: string[]; readonly brief: string[] } {
  const chosen = {
    ...facts,
    results: toResults(search.plan, best),
    replicates: best.replicates,
    selected: true,
  }
  const { failed: _, ...chosenFacts } = chosen
  const found = [
    `Best machine: ${facts.id}`,
    ...(facts.selected
      ? untested(facts, tests.get(best))
      : [`  On fresh conditions: ${resultSentence(facts)}`]),
    `  ${facts.selected ? 'Estimate' : 'When it was chosen'}: ${resultSentence(chosenFacts)}`,
    ...controlLines(search, best, tests),
    ...failureLines(search),
    ...repeatLines(search.plan, problem.exactness),
  ]
  const digest = `Search digest: ${hex(search.digest())}`
  const { description, cautions } = facts
  const more = description.length - briefLines
  return {
    summary: [
      ...found,
      ...description.map((line) => `  ${line}`),
      digest,
      'Cautions:',
      ...cautions.map((caution) => `  ${cautionText(caution)}`),
      `  ${alwaysCaution}`,
    ],
    brief: [
      ...found,
      ...description.slice(0, more > 1 ? briefLines : briefLines + 1).map((line) => `  ${line}`),
      ...(more > 1 ? [`  and ${more} more lines on how it is built, in ${summaryFile}`] : []),
      digest,
      ...(cautions.length > 0
        ? [`Cautions, in full in ${summaryFile}: ${cautions.map(({ hazard }) => hazard).join('; ')}.`]
        : []),
      alwaysCaution,
    ],
  }
}

/** What cannot be repeated to the bit, and why. */
export function repeatLines(plan: SearchPlan, exactness: AnyProblem['exactness']): string[] {
  const { said } = exactnessRules[exactness]
  const byArrival = plan.islands.some(({ order }) => order === 'arrival')
  return [
    ...(byArrival
      ? [
          '  Results were taken in the order of arrival: `skerry rederive` can check this search, its file alone cannot repeat it.',
        ]
      : []),
    ...(said === '' ? [] : [`  ${said}`]),
  ]
}

/** Why there are no numbers from fresh conditions. */
function untested({ failed }: PictureFacts, tested: EvaluationResult | undefined): string[] {
  if (failed) {
    return [
      `  On fresh conditions: it failed in ${failed.simulations} of ${failed.of} simulations, first because: ${failed.because}.`,
    ]
  }
  return tested ? [] : ['  On fresh conditions: not simulated; the work was lost or interrupted.']
}

function toResults(plan: SearchPlan, individual: Individual): PictureFacts['results'] {
  return estimatesOf(plan, individual).map(({ objective, ...rest }) => ({ name: objective, ...rest }))
}

function controlBests(search: Search): { readonly island: Island; readonly best: Individual }[] {
  return search.islands.flatMap((island) => {
    const { best } = island
    return island.isControl && best && best.failedSimulations === 0 ? [{ island, best }] : []
  })
}

/** What chance alone found with as much work, simulated on the same fresh conditions as the search's best. */
function controlLines(search: Search, best: Individual, tests: Retests): string[] {
  const { plan } = search
  const objective = plan.problem.objectives[0]!
  return controlBests(search).map(({ island, best: control }) => {
    const who = `  Control ${island.tools.island.method} (${nameOf(control.id)}, the best of ${grouped(island.counters.committedSimulations)} simulations)`
    const difference = compareFresh(plan, tests.get(best), tests.get(control))
    if (!difference) {
      const [first] = toResults(plan, control)
      return `${who}: ${first ? resultText(first) : 'no number'} when it was chosen; not compared, because not both ran through fresh conditions without failure.`
    }
    const theirs = resultText({ name: objective.name, unit: objective.unit, ...difference.control })
    return `${who}: ${theirs} on fresh conditions. ${differenceSentence(objective, difference)}`
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
