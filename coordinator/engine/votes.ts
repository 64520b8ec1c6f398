// Which of several simulations of one evaluation is believed. Simulations are deterministic, so two honest workers
// agree to the bit; whoever stands alone against two is wrong.
//
// One vote a worker. `needed` agreeing workers settle it; a disagreement always needs two.

import { equalBytes } from '../../shared/digests.js'
import type { EvaluationResult, Executor } from '../../shared/result.js'

export interface Vote {
  readonly result: EvaluationResult
  readonly digest: Uint8Array
  readonly executor: Executor
}

export type Verdict =
  | { readonly kind: 'open' }
  /** One vote, nobody against it. */
  | { readonly kind: 'unconfirmed'; readonly vote: Vote }
  | { readonly kind: 'confirmed'; readonly vote: Vote; readonly wrong: readonly Vote[] }
  /** Votes differ and none has two. */
  | { readonly kind: 'disputed' }

/** More different answers than this and no worker is to blame: the simulation itself does not repeat. */
export const answersTolerated = 4

export function verdictOf(votes: readonly Vote[]): Verdict {
  const first = votes[0]
  if (!first) return { kind: 'open' }
  if (votes.length === 1) return { kind: 'unconfirmed', vote: first }
  for (const vote of votes) {
    const agreeing = votes.filter((other) => equalBytes(other.digest, vote.digest))
    if (agreeing.length >= 2) {
      return {
        kind: 'confirmed',
        vote,
        wrong: votes.filter((other) => !equalBytes(other.digest, vote.digest)),
      }
    }
  }
  return { kind: 'disputed' }
}

/** How many different answers there are. */
export function answersOf(votes: readonly Vote[]): number {
  return votes.filter((vote, at) => votes.findIndex((other) => equalBytes(other.digest, vote.digest)) === at)
    .length
}
