// Whether the machines of a problem can be made, and which cautions would leave with them: what `check` knows from
// the problem's declarations before anything is simulated.

import { randomGenome } from '../../../shared/encodings.js'
import type { Genome } from '../../../shared/genome.js'
import { cautionsOf, undeclaredOf } from '../../../shared/making/cautions.js'
import { partsFault } from '../../../shared/making/declare.js'
import { type MakingFault, makingFaults, makingFaultText } from '../../../shared/making/makeability.js'
import type { AnyProblem } from '../../../shared/problem.js'
import { stream } from '../../../shared/streams.js'
import { counted, percent } from '../numbers.js'
import type { ProblemFault } from './trials.js'

/** Founders that are held against the process. */
const foundersTried = 64

export interface MakingTrial {
  readonly founders: number
  /** Of them, those that cannot be made although they were repaired. */
  readonly cannot: number
  /** Rules that are broken, by the most founders first. */
  readonly rules: readonly BrokenRule[]
}
export interface BrokenRule {
  readonly rule: string
  readonly founders: number
  /** The first part that breaks it, with what was found and expected. */
  readonly example: string
}

export interface DeclaredCautions {
  /** Of the first founder. */
  readonly hazards: readonly string[]
  /** What is not declared, in words. */
  readonly notDeclared: readonly string[]
}

/** Founders against the declared process; nothing where none is declared. Faults are those of the problem. */
export function tryMaking(
  problem: AnyProblem,
  seed: number,
): { readonly trial?: MakingTrial; readonly faults: readonly ProblemFault[] } {
  const { process, parts } = problem
  if (process === undefined || parts === undefined) return { faults: [] }
  const broken = new Map<string, { founders: number; example: string }>()
  let cannot = 0
  for (let founder = 1; founder <= foundersTried; founder++) {
    let faults: readonly MakingFault[]
    try {
      const listed: unknown = parts(founderOf(problem, seed, founder))
      const malformed = partsFault(listed)
      if (malformed !== undefined) return wrong('wrong-results', `founder ${founder}: ${malformed}`)
      faults = makingFaults(process, listed as ReturnType<typeof parts>)
    } catch (error) {
      const text = error instanceof Error ? error.message : String(error)
      return wrong('problem-throws', `repair or parts threw for founder ${founder}: ${text}`)
    }
    if (faults.length > 0) cannot++
    count(broken, faults)
  }
  const rules = [...broken]
    .map(([rule, counts]) => ({ rule, ...counts }))
    .sort((a, b) => b.founders - a.founders || (a.rule < b.rule ? -1 : 1))
  const trial: MakingTrial = { founders: foundersTried, cannot, rules }
  if (cannot < foundersTried) return { trial, faults: [] }
  return {
    trial,
    ...wrong('cannot-be-made', `not one of ${foundersTried} founders can be made; ${rules[0]!.example}.`),
  }
}

function wrong(kind: ProblemFault['kind'], sentence: string): { readonly faults: readonly ProblemFault[] } {
  return { faults: [{ kind, sentence }] }
}

/** Founders as `check` simulates them, the first ones the same. */
function founderOf(problem: AnyProblem, seed: number, founder: number): Genome {
  return problem.repair(randomGenome(problem.genome, stream(seed, 'check', 1, founder)))
}

/** Each rule once a founder. */
function count(
  broken: Map<string, { founders: number; example: string }>,
  faults: readonly MakingFault[],
): void {
  for (const rule of new Set(faults.map((fault) => fault.rule))) {
    const before = broken.get(rule)
    const example = before?.example ?? makingFaultText(faults.find((fault) => fault.rule === rule)!)
    broken.set(rule, { founders: (before?.founders ?? 0) + 1, example })
  }
}

/** What would leave with the first founder; nothing where it cannot be drawn (the trials say why). */
export function declaredCautions(problem: AnyProblem, seed: number): DeclaredCautions {
  try {
    const genome = founderOf(problem, seed, 1)
    return {
      hazards: cautionsOf(problem, genome).map(({ hazard }) => hazard),
      notDeclared: undeclaredOf(problem, genome),
    }
  } catch {
    return { hazards: [], notDeclared: [] }
  }
}

/** Above this share of founders most of the budget would go into what nobody can build. Common practice, no source. */
const muchShare = 0.1

export function makingLines(trial: MakingTrial | undefined, hasProcess: boolean): string[] {
  if (!trial) {
    const missing = hasProcess ? 'parts' : 'process'
    return [`Whether its machines can be made was not tried: the problem declares no ${missing}.`]
  }
  const { founders, cannot, rules } = trial
  if (cannot === 0) return [`All of ${counted(founders, 'founder')} can be made by the declared process.`]
  const most = rules.map((one) => `${one.example} (${counted(one.founders, 'founder')})`).join('; ')
  const much = cannot > muchShare * founders ? ' REPAIR should leave fewer.' : ''
  return [
    `${cannot} of ${counted(founders, 'founder')} (${percent(cannot / founders)}) cannot be made after repair and would fail: ${most}.${much}`,
  ]
}

export function cautionLines({ hazards, notDeclared }: DeclaredCautions): string[] {
  const lines =
    hazards.length === 0 ? [] : [`Cautions that would leave with a machine: ${hazards.join('; ')}.`]
  if (notDeclared.length > 0)
    lines.push(`Not declared, and therefore cautioned against: ${notDeclared.join(', ')}.`)
  return lines
}
