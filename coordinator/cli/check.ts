// `skerry check FILE`: everything that can be known before a search is started.

import { availableParallelism } from 'node:os'
import { noMachine } from '../../shared/making/types.js'
import { type Needs, needsOf, needsWords, placesFor } from '../../shared/needs.js'
import { exitCodes } from '../../shared/refusals.js'
import { memoryMB } from '../../worker/cluster/machine.js'
import type { IslandPlan } from '../evolution/plan.js'
import {
  type DriftExpectation,
  expectedDrift,
  type Recommendation,
  recommend,
  type Spread,
  spreadOf,
} from './check/advice.js'
import { tryFresh } from './check/fresh.js'
import {
  cautionLines,
  type DeclaredCautions,
  declaredCautions,
  type MakingTrial,
  makingLines,
  tryMaking,
} from './check/making.js'
import { preemptionLine } from './check/preemption.js'
import type { StepTrial } from './check/step.js'
import { stepLines } from './check/step-lines.js'
import type { ProblemFault, TrialPlan } from './check/trials.js'
import { type ProcessTrials, tryInProcess } from './check/trials-process.js'
import type { Command, CommandInput, Output } from './command.js'
import { counted, duration, grouped, percent, short } from './numbers.js'
import { searchTables } from './search-tables.js'
import { type Finding, printFindings } from './searchfile/finding.js'
import { type OpenedSearch, openSearch } from './searchfile/open.js'
import { quotas } from './searchfile/relations.js'
import { wrap } from './terminal.js'

const machinesTried = 8
const secondsMost = 20
const waitSeconds = 120

export const checkCommand: Command = {
  name: 'check',
  summary:
    'Try a search file and its problem: mistakes, determinism, time, cost, fitting order and lookahead.',
  arguments: [{ name: 'FILE', help: 'the search file' }],
  options: [
    {
      flag: '--machines',
      value: 'N',
      kind: 'count',
      help: `random machines to simulate (default ${machinesTried})`,
    },
    {
      flag: '--seconds',
      value: 'N',
      kind: 'count',
      help: `begin no further machine after this time (default ${secondsMost})`,
    },
    {
      flag: '--wait',
      value: 'N',
      kind: 'count',
      help: `seconds for one evaluation before it is called hanging (default ${waitSeconds})`,
    },
  ],
  examples: ['skerry check search.yaml', 'skerry check search.yaml --machines 20 --json'],
  run,
}

export interface CheckReport {
  readonly ok: boolean
  readonly warnings: readonly Finding[]
  readonly bundleWarnings: readonly string[]
  readonly faults: readonly ProblemFault[]
  readonly machines: number
  readonly simulations: number
  readonly failedSimulations: number
  readonly failedBecause?: string
  /** Why the fresh process did not run; absent when it did. */
  readonly freshNotRun?: string
  /** What a simulation asks for, and how many this machine runs at once; absent where the problem says nothing. */
  readonly needs?: Needs & { readonly atOnceHere: number }
  /** Absent where the problem declares no process or no parts. */
  readonly making?: MakingTrial
  readonly cautions: DeclaredCautions
  /** Absent where the trials found a mistake: numbers of a broken problem would mislead. */
  readonly measured?: Measured
}

/** What the trials measured, and what follows from it. */
export interface Measured {
  readonly secondsPerSimulation: Spread
  /** Spread of time divided by expected cost. */
  readonly aroundCost: Spread
  readonly coreHours: {
    readonly search: number
    readonly controls: number
    readonly confirmation: number
    readonly total: number
  }
  readonly memory: {
    /** Largest resident size of the trial process. */
    readonly peakBytes?: number
    /** Of that, beyond the process before its first simulation. */
    readonly addedBytes?: number
    /** Held after a full collection, more than before. */
    readonly keptBytesPerSimulation?: number
  }
  /** Absent where the problem cannot simulate with a smaller step. */
  readonly step?: StepTrial
  /** Absent without migration. */
  readonly epoch?: EpochMeaning
  readonly workers: number
  readonly lookahead: number
  readonly recommendation: Recommendation
  readonly drift?: DriftExpectation
}

/** What `every: N rounds` is for this problem. */
export interface EpochMeaning {
  readonly rounds: number
  /** Mean expected cost of an evaluation. */
  readonly meanCost: number
  readonly evaluationsPerSlot: number
  /** Whole search, of the island that has the fewest. */
  readonly epochs: number
}

async function run(input: CommandInput): Promise<number> {
  const { output } = input
  const opened = await openSearch(input.arguments.FILE!, searchTables(), Date.now())
  const report = await checkSearch(opened, {
    machines: input.counts['--machines'] ?? machinesTried,
    secondsMost: input.counts['--seconds'] ?? secondsMost,
    waitSeconds: input.counts['--wait'] ?? waitSeconds,
  })
  if (output.json) output.print(JSON.stringify(report, undefined, 2))
  else printReport(output, opened, report)
  return report.ok ? exitCodes.done : exitCodes.configuration
}

/** All trials of an opened search; prints nothing. */
export async function checkSearch(
  opened: OpenedSearch,
  effort: Pick<TrialPlan, 'machines' | 'secondsMost'> & { readonly waitSeconds?: number },
): Promise<CheckReport> {
  const { plan, problem } = opened
  const trialPlan: TrialPlan = {
    seed: plan.seed,
    shared: plan.replicates.shared,
    replicates: plan.replicates.first,
    machines: effort.machines,
    secondsMost: effort.secondsMost,
  }
  const patience = effort.waitSeconds ?? waitSeconds
  const trials = await tryInProcess(problem, opened.bundle.code, trialPlan, patience)
  const isSound = trials.faults.length === 0
  const fresh = isSound
    ? await tryFresh(
        problem,
        opened.bundle.code,
        trialPlan,
        trials.machines,
        patience * (trials.machines.length + 1),
      )
    : { faults: [], notRun: 'the trials had failed already' }
  // A problem that promises less than bits may differ; that is said, not refused.
  const making = tryMaking(problem, plan.seed)
  const faults = [...trials.faults, ...fresh.faults, ...making.faults]
  const binding = faults.filter(({ kind }) => kind !== 'not-deterministic' || isExact(problem.exactness))
  return {
    ok: binding.length === 0,
    warnings: opened.warnings,
    bundleWarnings: opened.bundle.warnings,
    faults,
    machines: trials.machines.length,
    simulations: trials.simulations,
    failedSimulations: trials.failed,
    ...(trials.failedBecause === undefined ? {} : { failedBecause: trials.failedBecause }),
    ...(fresh.notRun === undefined ? {} : { freshNotRun: fresh.notRun }),
    ...needsHere(opened),
    ...(making.trial === undefined ? {} : { making: making.trial }),
    cautions: declaredCautions(problem, plan.seed),
    ...(binding.length === 0 ? { measured: measure(opened, trials) } : {}),
  }
}

function needsHere({ plan, fields }: OpenedSearch): Pick<CheckReport, 'needs'> {
  const { needs } = plan.problem
  if (needs === undefined) return {}
  const cores = fields.cores ?? availableParallelism()
  return {
    needs: { ...needs, atOnceHere: placesFor(needs, { cores, memoryMB: memoryMB(), tokens: fields.tokens }) },
  }
}

function needsLines({ needs }: CheckReport): string[] {
  if (needs === undefined) return []
  const { atOnceHere } = needs
  const here =
    atOnceHere === 0 ? 'not even one fits on this machine' : `this machine runs ${atOnceHere} at once`
  return [`A simulation takes ${needsWords(needs)}; ${here}.`]
}

function isExact(exactness: string): boolean {
  return exactness === 'bits' || exactness === 'bits-per-processor'
}

function measure(opened: OpenedSearch, trials: ProcessTrials): Measured {
  const { plan, fields } = opened
  const { machines, memory, keptBytesPerSimulation } = trials
  const secondsPerSimulation = spreadOf(machines.map((machine) => machine.secondsPerSimulation))
  const aroundCost = spreadOf(machines.map((machine) => machine.secondsPerSimulation / machine.expectedCost))
  const workers = fields.workersExpected ?? fields.cores ?? availableParallelism()
  const { cores } = needsOf(plan.problem.needs)
  const search = (plan.budget.simulations * secondsPerSimulation.mean * cores) / 3600
  const controls = search * plan.controls.length
  const confirmation = search * plan.confirm.fraction
  const drift = driftOf(
    plan.islands,
    machines.map(({ expectedCost }) => expectedCost),
  )
  const epoch = epochOf(opened)
  return {
    secondsPerSimulation,
    aroundCost,
    coreHours: { search, controls, confirmation, total: search + controls + confirmation },
    memory: { ...memory, ...(keptBytesPerSimulation === undefined ? {} : { keptBytesPerSimulation }) },
    ...(trials.step === undefined ? {} : { step: trials.step }),
    ...(epoch === undefined ? {} : { epoch }),
    workers,
    lookahead: plan.islands.reduce((sum, island) => sum + island.lookahead, 0),
    recommendation: recommend(
      tellable(secondsPerSimulation),
      tellable(aroundCost, secondsPerSimulation),
      workers,
    ),
    ...(drift === undefined ? {} : { drift }),
  }
}

/** Shorter simulations travel in batches, and what differs between their times is mostly the clock. */
const tellableSeconds = 0.001

function tellable(spread: Spread, times = spread): Spread {
  return times.mean < tellableSeconds ? { mean: spread.mean, cv: 0 } : spread
}

function epochOf({ plan, fields, meanCost }: OpenedSearch): EpochMeaning | undefined {
  if (!plan.migration || plan.islands.length < 2) return undefined
  const { everyRounds } = plan.migration
  const block = plan.replicates.first * Math.max(1, plan.problem.cases.length)
  const rounds = quotas(fields).map(
    (quota, group) => ((quota / block) * meanCost) / fields.islands[group]!.lookahead,
  )
  return {
    rounds: everyRounds,
    meanCost,
    evaluationsPerSlot: everyRounds / meanCost,
    epochs: Math.floor(Math.min(...rounds) / everyRounds),
  }
}

/** For the widest island in order cost: what the order alone does between the cheapest and the dearest machine seen. */
function driftOf(islands: readonly IslandPlan[], costs: readonly number[]): DriftExpectation | undefined {
  const widest = islands.filter(({ order }) => order === 'cost').sort((a, b) => b.lookahead - a.lookahead)[0]
  const ratio = costs.length > 0 ? Math.max(...costs) / Math.min(...costs) : 1
  if (!widest || ratio <= 1) return undefined
  return expectedDrift(ratio, widest.lookahead, widest.population)
}

function printReport(output: Output, opened: OpenedSearch, report: CheckReport): void {
  const { problem, plan } = opened
  const say = (text: string) => output.print(wrap(text, Math.min(100, output.columns - 1)).join('\n'))
  if (report.warnings.length > 0) output.print(`${printFindings(opened.file, report.warnings)}\n`)
  for (const warning of report.bundleWarnings) output.print(`warning: ${warning}`)
  say(`${problem.name} ${problem.version}: ${problem.summary}`)
  say(
    `${counted(plan.islands.length, 'island')}, ${counted(plan.controls.length, 'control')}, ${grouped(plan.budget.simulations)} simulations.`,
  )
  output.print('')
  for (const line of faultLines(report, problem.exactness)) say(line)
  for (const line of makeLines(report, problem)) say(line)
  for (const line of needsLines(report)) say(line)
  const { measured } = report
  if (measured) for (const line of measuredLines(measured, report, opened)) say(line)
  output.print('')
  say(
    report.ok
      ? 'Nothing stands in the way of this search.'
      : 'This search should not be started before the above is mended.',
  )
}

function faultLines(report: CheckReport, exactness: string): string[] {
  const tried = `${counted(report.machines, 'random machine')}, ${counted(report.simulations, 'simulation')} each three times`
  const also = report.freshNotRun === undefined ? ' and in a fresh process' : ''
  const lines = report.faults.map(({ kind, sentence }) => `${kind}: ${sentence}`)
  if (lines.length === 0) lines.push(`Same results to the last bit: ${tried}, in two orders${also}.`)
  else if (report.ok)
    lines.push(
      `The problem promises no more than "${exactness}", so this is no mistake; the search cannot be repeated to the bit.`,
    )
  if (report.freshNotRun !== undefined && report.ok)
    lines.push(`Not tried in a fresh process: ${report.freshNotRun}`)
  if (report.failedSimulations > 0) {
    lines.push(
      `${grouped(report.failedSimulations)} of ${counted(report.simulations, 'simulation')} failed by the problem's own word, the first because: ${report.failedBecause}. Failed machines rank last.`,
    )
  }
  return lines
}

function makeLines({ making, cautions }: CheckReport, { process, use }: OpenedSearch['problem']): string[] {
  const lines = cautionLines(cautions)
  return use === noMachine ? lines : [...makingLines(making, process !== undefined), ...lines]
}

function measuredLines(measured: Measured, report: CheckReport, opened: OpenedSearch): string[] {
  return [
    timeLine(measured, report),
    ...stepLines(measured.step),
    memoryLine(measured.memory),
    costLine(measured),
    ...preemptionLines(measured, opened),
    ...epochLines(measured.epoch),
    ...adviceLines(measured, opened),
  ]
}

function timeLine({ secondsPerSimulation, aroundCost }: Measured, { machines }: CheckReport): string {
  const milliseconds = `${short(secondsPerSimulation.mean * 1000)} ms`
  return `A simulation takes ${milliseconds} of one core on this machine (mean of ${counted(machines, 'random machine')}; standard deviation between them ${percent(secondsPerSimulation.cv)} of the mean, ${percent(aroundCost.cv)} once divided by expected cost).`
}

const megabyte = 1e6
/** What a simulation may keep before it is called a leak; less is what caches and compiled code make. */
const leakBytes = 20_000

function memoryLine({ peakBytes, addedBytes, keptBytesPerSimulation: kept }: Measured['memory']): string {
  if (peakBytes === undefined) return 'Memory was not measured.'
  const peak = `A process that simulates holds ${short(peakBytes / megabyte)} MB at most, ${short((addedBytes ?? 0) / megabyte)} MB of it since its first simulation`
  if (kept === undefined) return `${peak}.`
  return kept > leakBytes
    ? `${peak}. Memory LEAKS: each simulation keeps about ${short(kept / 1000)} kB for ever; look for lists and caches that only grow.`
    : `${peak}; simulations keep nothing that would grow (${short(kept / 1000)} kB each).`
}

function costLine({ coreHours }: Measured): string {
  const extra = coreHours.controls + coreHours.confirmation
  return `The whole budget costs about ${hours(coreHours.total)}: search ${hours(coreHours.search)}, controls ${hours(coreHours.controls)}, confirmation ${hours(coreHours.confirmation)}${extra > 0 ? ' and more for every new best' : ' (none)'}. Evolved machines may take longer than random ones.`
}

function preemptionLines({ secondsPerSimulation }: Measured, { plan }: OpenedSearch): string[] {
  const simulations = plan.replicates.first * Math.max(1, plan.problem.cases.length)
  return [preemptionLine(secondsPerSimulation.mean * simulations, false) ?? []].flat()
}

function epochLines(epoch: EpochMeaning | undefined): string[] {
  if (!epoch) return []
  const { rounds, meanCost, evaluationsPerSlot, epochs } = epoch
  return [
    `Migration every ${rounds} rounds: an evaluation costs ${short(meanCost)} on average (expectedCost, 64 random machines), so that is about ${short(evaluationsPerSlot)} evaluations for each slot of the lookahead, and about ${counted(epochs, 'time')} in the search.`,
  ]
}

function hours(coreHours: number): string {
  return coreHours >= 0.1 ? `${short(coreHours)} core-hours` : `${duration(coreHours * 3600)} of one core`
}

function adviceLines(
  { workers, lookahead, recommendation, drift }: Measured,
  { plan }: OpenedSearch,
): string[] {
  const { order, busy, because } = recommendation
  const busyWords = busy === undefined ? '' : `, which keeps them busy ${percent(busy)} of the time`
  const each = Math.ceil(recommendation.lookahead / plan.islands.length)
  const lines = [
    `For ${counted(workers, 'worker')}: order ${order} and lookaheads of ${recommendation.lookahead} in all (about ${each} an island)${busyWords}; ${because}. The file has ${lookahead} in all, order ${[...new Set(plan.islands.map((island) => island.order))].join(' and ')}.`,
  ]
  if (drift) {
    lines.push(
      `Order cost by itself favours cheap bodies: without selection, with costs 1 to ${short(drift.ratio)}, lookahead ${drift.lookahead} and population ${drift.population}, ${percent(drift.cheapShare)} of commits ${grouped(drift.fromCommit)} to ${grouped(drift.toCommit)} would be cheap bodies instead of 50 %.`,
    )
  }
  return lines
}
