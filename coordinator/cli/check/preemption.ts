// What preemptions destroy: an evaluation that is cut off begins again from nothing, so the longer it lasts beside the
// life of a worker, the more of the work is thrown away.

import { check } from '../../../shared/check.js'
import { duration, percent } from '../numbers.js'

/** Mean lives of workers that `check` speaks of, in seconds: a crowded queue, and an ordinary one. */
const lives = [300, 3600] as const
/** Less than this is not worth a line. */
const shareLeast = 0.01

/**
 * Expected time until a piece of work is done once, over its own time, when every cut (a Poisson process of rate lambda)
 * sends it back to the start at no further cost: (e^(lambda T) - 1) / (lambda T). A. Duda, The effects of checkpointing on
 * program execution time, 1983, without checkpoints (from memory).
 */
export function restartFactor(workSeconds: number, meanLifeSeconds: number): number {
  check(workSeconds >= 0 && meanLifeSeconds > 0, 'times are positive')
  const cuts = workSeconds / meanLifeSeconds
  return cuts === 0 ? 1 : Math.expm1(cuts) / cuts
}

/** Share of all time simulated that is lost to cuts. */
export function destroyedShare(workSeconds: number, meanLifeSeconds: number): number {
  return 1 - 1 / restartFactor(workSeconds, meanLifeSeconds)
}

/** A line for a person, undefined where evaluations are short. */
export function preemptionLine(evaluationSeconds: number, savesState: boolean): string | undefined {
  const told = lives
    .map((life) => ({ life, share: destroyedShare(evaluationSeconds, life) }))
    .filter(({ share }) => share >= shareLeast)
  if (told.length === 0 || savesState) return undefined
  const shares = told.map(
    ({ life, share }) => `${percent(share)} where workers live ${duration(life)} on average`,
  )
  return `An evaluation lasts ${duration(evaluationSeconds)} and begins again when its worker is taken away: that destroys ${shares.join(', ')}. Shorter evaluations (fewer replicates at first) lose less.`
}
