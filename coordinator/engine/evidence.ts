// What was seen when simulations of the same differed, as data for the record: who said what, on which processor and
// version, and by how much the first numbers that differ do. For whoever must find out what is wrong with a machine.

import { hex } from '../../shared/digests.js'
import { ulpDistance } from '../../shared/ulp.js'
import type { SearchPlan } from '../evolution/plan.js'
import type { Vote } from './votes.js'
import type { Work } from './works.js'

export interface Evidence {
  readonly island: number
  readonly evaluation: number
  readonly individual: number
  readonly firstReplicate: number
  readonly replicates: number
  readonly votes: readonly {
    readonly worker: string
    readonly host: string
    readonly processor?: string
    readonly skerry?: string
    readonly digest: string
  }[]
  readonly difference?: Difference
  readonly problem: { readonly name: string; readonly version: string; readonly digest: string }
  readonly semantics: number
}

interface Difference {
  /** The first number that differs: its name, its simulation within the evaluation, both values. */
  readonly number: string
  readonly simulation: number
  readonly used: number
  readonly other: number
  /** Steps between neighbouring doubles, as a decimal number. */
  readonly ulp: string
}

export function evidenceOf(plan: SearchPlan, work: Work, used: Vote, other: Vote): Evidence {
  const { island, evaluation, individual, firstReplicate, replicates } = work
  const { name, version, digest } = plan.problem
  const difference = differenceOf(plan, used, other)
  return {
    island,
    evaluation,
    individual,
    firstReplicate,
    replicates,
    votes: work.votes.map(({ digest: said, executor }) => ({
      worker: executor.worker,
      host: executor.host,
      ...(executor.processor === undefined ? {} : { processor: executor.processor }),
      ...(executor.skerry === undefined ? {} : { skerry: executor.skerry }),
      digest: hex(said).slice(0, 16),
    })),
    ...(difference ? { difference } : {}),
    problem: { name, version, digest },
    semantics: plan.semantics,
  }
}

function differenceOf({ problem }: SearchPlan, used: Vote, other: Vote): Difference | undefined {
  const names = [...problem.objectives, ...problem.measures].map(({ name }) => name)
  const at = used.result.values.findIndex((value, i) => value !== other.result.values[i])
  const [a, b] = [used.result.values[at], other.result.values[at]]
  if (a === undefined || b === undefined) return undefined
  return {
    number: names[at % names.length]!,
    simulation: Math.floor(at / names.length),
    used: a,
    other: b,
    ulp: String(ulpDistance(a, b)),
  }
}

/** 'error of simulation 0 by 3 ulp', or '' where only the failures differ. */
export function differenceInWords({ difference }: Evidence): string {
  if (!difference) return ''
  const { number, simulation, used, other, ulp } = difference
  return `; ${number} of simulation ${simulation} is ${used} against ${other}, ${ulp} ulp apart`
}
