// How far a problem's results repeat, and what follows from it: when two simulations of the same agree, whether a
// difference can convict a machine, what is promised to whoever repeats the search. One table, read by votes,
// rederive, reports and the documents.

import { equalBytes } from './digests.js'
import type { Exactness, Tolerance } from './problem.js'
import type { EvaluationResult } from './result.js'

export interface ExactnessRule {
  /** Two results agree when their digests are equal, or when every number is within its tolerance. */
  readonly agree: 'digest' | 'tolerance'
  /** The search runs on one class of processors from its start, because others give other bits. */
  readonly oneProcessorClass: boolean
  /** Whoever stands alone against two is shut out. Where chance differs as well, only the result is replaced. */
  readonly convicts: boolean
  /** For the documents: votes, digests, `rederive --resimulate`. */
  readonly votes: string
  readonly digests: string
  readonly resimulate: string
  /** The sentence that a report shows about it; '' where there is nothing to be said. */
  readonly said: string
}

export const exactnessRules: { readonly [exactness in Exactness]: ExactnessRule } = {
  bits: {
    agree: 'digest',
    oneProcessorClass: false,
    convicts: true,
    votes: 'equal digests; one against two of its own processor class is shut out',
    digests: 'the same on every machine, from the search file alone',
    resimulate: 'every result again, to the last bit, on any machine',
    said: '',
  },
  'bits-per-processor': {
    agree: 'digest',
    oneProcessorClass: true,
    convicts: true,
    votes: 'as bits, among machines of one processor class; others are not used',
    digests: 'the same on every machine of that class',
    resimulate: 'every result again, to the last bit, on a machine of that class',
    said: 'Results repeat to the bit on one class of processors only: this search is of one class.',
  },
  tolerance: {
    agree: 'tolerance',
    oneProcessorClass: false,
    convicts: true,
    votes: 'numbers within the declared tolerances, the same failures; one against two is shut out',
    digests: 'of the results that came first: derivable from the journal, not repeatable from the file',
    resimulate: 'every number again within its tolerance',
    said: 'Results repeat within a tolerance: the journal leads to this search again, its file alone does not.',
  },
  statistical: {
    agree: 'tolerance',
    oneProcessorClass: false,
    convicts: false,
    votes:
      'numbers within the declared tolerances count as confirmed; otherwise two that agree are used, nobody is shut out',
    digests: 'of the results that came first: derivable from the journal, not repeatable from the file',
    resimulate: 'how many of the results are within tolerance is told, none is required to be',
    said: 'Results differ by chance from one simulation to the next: the journal leads to this search again, its file alone does not, and a wrong machine can be noticed only where it is far off.',
  },
}

/** What a problem promises, as plain data. `tolerances` has one entry a column of a result. */
export interface Promised {
  readonly exactness?: Exactness
  readonly tolerances?: readonly Tolerance[]
}

export function ruleOf(promised: Promised): ExactnessRule {
  return exactnessRules[promised.exactness ?? 'bits']
}

export interface Compared {
  readonly result: EvaluationResult
  readonly digest: Uint8Array
}

/** True when the two say the same as far as the problem promises it. */
export function agree(promised: Promised, a: Compared, b: Compared): boolean {
  if (equalBytes(a.digest, b.digest)) return true
  if (ruleOf(promised).agree === 'digest') return false
  return agreeWithin(promised.tolerances ?? [], a.result, b.result)
}

function agreeWithin(tolerances: readonly Tolerance[], a: EvaluationResult, b: EvaluationResult): boolean {
  if (a.values.length !== b.values.length || a.failures.length !== b.failures.length) return false
  if (a.failures.some(({ simulation }, at) => simulation !== b.failures[at]!.simulation)) return false
  return a.values.every((value, at) => {
    const other = b.values[at]!
    const { absolute = 0, relative = 0 } = tolerances[at % tolerances.length] ?? {}
    return Math.abs(value - other) <= absolute + relative * Math.max(Math.abs(value), Math.abs(other))
  })
}
