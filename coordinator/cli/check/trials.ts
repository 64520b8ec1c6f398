// Trying a problem: a few random machines simulated twice, in another order and in a fresh process, every number
// compared bit by bit, and timed. What is found is told in sentences that name the number and where it stands.

import { equalBytes, resultBytes } from '../../../shared/digests.js'
import { randomGenome } from '../../../shared/encodings.js'
import type { Genome } from '../../../shared/genome.js'
import { idOf } from '../../../shared/ids.js'
import { limits } from '../../../shared/limits.js'
import type { AnyProblem } from '../../../shared/problem.js'
import { stream } from '../../../shared/streams.js'
import { ulpDistance } from '../../../shared/ulp.js'
import { evaluateStrict, type StrictEvaluation } from '../../../sim/evaluate.js'
import { columnsOf, simulationsPerReplicate } from '../../../sim/problem.js'
import { type StepTrial, tryStep } from './step.js'

export interface TrialPlan {
  readonly seed: number
  readonly shared: boolean
  /** Replicates in one evaluation. */
  readonly replicates: number
  /** At most this many machines. */
  readonly machines: number
  /** No further machine is begun after this time. */
  readonly secondsMost: number
}

export interface Machine {
  /** 1, 2, ... */
  readonly number: number
  readonly genome: Genome
  readonly expectedCost: number
  readonly first: StrictEvaluation
  /** Of one simulation, in the third run. */
  secondsPerSimulation: number
}

/** Something wrong with the problem. `kind` is the code of the refusal it ends in. */
export interface ProblemFault {
  readonly kind: 'wrong-results' | 'not-deterministic' | 'problem-throws' | 'cannot-be-made'
  readonly sentence: string
}

export interface Trials {
  readonly machines: readonly Machine[]
  readonly faults: readonly ProblemFault[]
  /** Simulations whose machine failed by the problem's own word, of the first runs. */
  readonly failed: number
  readonly simulations: number
  /** The reason of the first of them. */
  readonly failedBecause: string | undefined
  /** Growth of what the process holds, over the second and third runs; absent where nothing measured it. */
  readonly keptBytesPerSimulation?: number
  /** Absent where the problem cannot simulate with a smaller step. */
  readonly step?: StepTrial
}

/** The world around the trials. */
export interface TrialWatch {
  /** An evaluation of the machine begins; `run` is 1, 2 or 3, or 4 with a smaller step. */
  readonly begin: (machine: number, run: number) => void
  /** Bytes held after a full collection. */
  readonly keptBytes?: () => number
}

type Evaluate = (genome: Genome, machine: number) => StrictEvaluation

/** Runs all trials in this process; `clockSeconds` is monotonic. */
export function tryProblem(
  problem: AnyProblem,
  plan: TrialPlan,
  clockSeconds: () => number,
  watch: TrialWatch = { begin: () => {} },
): Trials {
  const run: Evaluate = (genome, machine) => evaluateOnce(problem, plan, genome, machine)
  const faults: ProblemFault[] = []
  const machines = firstRuns(problem, plan, run, clockSeconds, watch, faults)
  const keptBefore = watch.keptBytes?.()
  const second = secondRuns(problem, machines, run, clockSeconds, watch)
  faults.push(...second.faults)
  const grown = keptBefore === undefined ? undefined : watch.keptBytes!() - keptBefore
  // What a broken problem says at another step means nothing.
  const step =
    faults.length > 0
      ? undefined
      : tryStep(problem, plan, machines, clockSeconds, (machine) => watch.begin(machine, 4))
  const failures = machines.flatMap(({ first }) =>
    first.failures.filter((failure) => !isFault(first, failure.simulation)),
  )
  return {
    machines,
    faults: firstOfEach(faults),
    failed: failures.length,
    simulations: machines.length * plan.replicates * simulationsPerReplicate(problem),
    failedBecause: failures[0]?.reason,
    ...(grown === undefined || second.simulations === 0
      ? {}
      : { keptBytesPerSimulation: Math.max(0, grown / second.simulations) }),
    ...(step === undefined ? {} : { step }),
  }
}

/** One evaluation under the conditions of `check`. */
export function evaluateOnce(
  problem: AnyProblem,
  plan: TrialPlan,
  genome: Genome,
  machine: number,
): StrictEvaluation {
  return evaluateStrict(
    problem,
    genome,
    plan.seed,
    plan.shared,
    idOf(1, machine),
    0,
    plan.replicates,
    'check',
  )
}

function firstRuns(
  problem: AnyProblem,
  plan: TrialPlan,
  run: Evaluate,
  clockSeconds: () => number,
  watch: TrialWatch,
  faults: ProblemFault[],
): Machine[] {
  const machines: Machine[] = []
  const began = clockSeconds()
  for (let number = 1; number <= plan.machines; number++) {
    watch.begin(number, 1)
    const made = makeMachine(problem, plan.seed, number)
    if ('sentence' in made) {
      faults.push(made)
      break
    }
    const first = run(made.genome, number)
    machines.push({ ...made, number, first, secondsPerSimulation: 0 })
    faults.push(...resultFaults(problem, number, first))
    // Two machines are needed to notice that one disturbs the other.
    if (machines.length >= 2 && clockSeconds() - began > plan.secondsMost / 2) break
  }
  return machines
}

/** A machine is timed over at least this long, unless it takes more runs than the most. */
const timedSecondsLeast = 0.02
const timedRunsMost = 100

/** Again in reverse order, so that anything kept from one simulation to the next shows. */
function secondRuns(
  problem: AnyProblem,
  machines: readonly Machine[],
  run: Evaluate,
  clockSeconds: () => number,
  watch: TrialWatch,
): { readonly faults: ProblemFault[]; readonly simulations: number } {
  const faults: ProblemFault[] = []
  let simulations = 0
  for (const machine of [...machines].reverse()) {
    watch.begin(machine.number, 2)
    const again = run(machine.genome, machine.number)
    watch.begin(machine.number, 3)
    const rows = rowsOf(problem, again)
    // Timed after the first runs, which also warm the compiler up; short simulations are timed over several.
    const start = clockSeconds()
    const alone = run(machine.genome, machine.number)
    let runs = 1
    while (runs < timedRunsMost && clockSeconds() - start < timedSecondsLeast) {
      run(machine.genome, machine.number)
      runs++
    }
    machine.secondsPerSimulation = (clockSeconds() - start) / (runs * rows)
    simulations += (1 + runs) * rows
    const repeated = differences(problem, machine, again, alone, 'when it was simulated twice in a row')
    faults.push(...repeated)
    if (repeated.length === 0) {
      faults.push(
        ...differences(
          problem,
          machine,
          machine.first,
          again,
          'when machines were simulated in another order',
        ),
      )
    }
  }
  return { faults, simulations }
}

function makeMachine(
  problem: AnyProblem,
  seed: number,
  number: number,
): { readonly genome: Genome; readonly expectedCost: number } | ProblemFault {
  try {
    const drawn = randomGenome(problem.genome, stream(seed, 'check', 1, number))
    const genome = problem.repair(drawn)
    const expectedCost = problem.expectedCost(genome)
    if (!Number.isSafeInteger(expectedCost) || expectedCost < 1 || expectedCost > limits.expectedCostMost) {
      const expected = `a whole number from 1 to ${limits.expectedCostMost}`
      return {
        kind: 'wrong-results',
        sentence: `expectedCost gave ${expectedCost} for machine ${number}; expected ${expected}.`,
      }
    }
    return { genome, expectedCost }
  } catch (error) {
    const text = error instanceof Error ? error.message : String(error)
    return { kind: 'problem-throws', sentence: `repair or expectedCost threw for machine ${number}: ${text}` }
  }
}

function rowsOf(problem: AnyProblem, result: StrictEvaluation): number {
  return Math.max(1, result.values.length / columnsOf(problem).length)
}

function isFault(result: StrictEvaluation, simulation: number): boolean {
  return result.faults.some((fault) => fault.simulation === simulation)
}

/** Where a row of an evaluation stands, for a person: replicate 2, case idle. */
export function rowName(problem: AnyProblem, row: number): string {
  const cases = simulationsPerReplicate(problem)
  const name = problem.cases[row % cases]
  return `replicate ${Math.floor(row / cases) + 1}${name === undefined ? '' : `, case ${name}`}`
}

function resultFaults(problem: AnyProblem, machine: number, result: StrictEvaluation): ProblemFault[] {
  return result.faults.map(({ simulation, reason }) => ({
    kind: reason.startsWith('the problem threw') ? 'problem-throws' : 'wrong-results',
    sentence: `machine ${machine}, ${rowName(problem, simulation)}: ${reason}.`,
  }))
}

/** Every number that differs between two results of one machine, worst column first. */
export function differences(
  problem: AnyProblem,
  machine: Pick<Machine, 'number'>,
  one: StrictEvaluation,
  two: StrictEvaluation,
  when: string,
): ProblemFault[] {
  if (equalBytes(resultBytes(one), resultBytes(two))) return []
  const columns = columnsOf(problem)
  const found: { column: string; row: number; ulps: bigint; a: number; b: number }[] = []
  for (const [index, a] of one.values.entries()) {
    const b = two.values[index]!
    const row = Math.floor(index / columns.length)
    if (!Object.is(a, b))
      found.push({ column: columns[index % columns.length]!, row, ulps: ulpDistance(a, b), a, b })
  }
  found.sort((x, y) => (x.ulps < y.ulps ? 1 : x.ulps > y.ulps ? -1 : x.row - y.row))
  const named = columns.flatMap((column) => found.find((one) => one.column === column) ?? [])
  if (named.length === 0) {
    const sentence = `machine ${machine.number} failed for another reason ${when}: "${one.failures[0]?.reason ?? 'it did not fail'}", then "${two.failures[0]?.reason ?? 'it did not fail'}".`
    return [{ kind: 'not-deterministic', sentence }]
  }
  return named.map(({ column, row, ulps, a, b }) => ({
    kind: 'not-deterministic' as const,
    sentence: `${column} of machine ${machine.number} (${rowName(problem, row)}) differs by ${ulps} ulp ${when}: ${a}, then ${b}.`,
  }))
}

/** One sentence of each kind and number: the same fault of eight machines is one fault. */
function firstOfEach(faults: readonly ProblemFault[]): ProblemFault[] {
  const key = ({ sentence }: ProblemFault) =>
    sentence
      .replace(/machine \d+/, '')
      .replace(/\(?replicate.*/, '')
      .replace(/-?\d[\d.e+-]*/g, '')
  const seen = new Set<string>()
  return faults.filter((fault) => {
    const isNew = !seen.has(key(fault))
    seen.add(key(fault))
    return isNew
  })
}
