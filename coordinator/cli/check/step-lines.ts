// What `check` says about the size of the simulator's step.

import { counted, percent, short } from '../numbers.js'
import type { StepChange, StepTrial } from './step.js'

/** One sentence for each objective; one that says so where the step could not be judged. */
export function stepLines(step: StepTrial | undefined): string[] {
  if (step === undefined) {
    return [
      'The size of the step was not judged: the problem has no simulateFiner, so how far its numbers are from the physics is unknown.',
    ]
  }
  const { machines, simulations, failedAtOne, changes } = step
  const lines = changes.map(changeLine)
  if (lines.length > 0)
    lines[0] = `With half the step (${counted(machines, 'random machine')}, ${counted(simulations, 'simulation')}): ${lines[0]}`
  if (failedAtOne > 0)
    lines.push(
      `${counted(failedAtOne, 'simulation')} failed at one step size and not at the other: look at what they do when they fail.`,
    )
  return lines
}

/** Changes below this part of the spread disappear in it. Common practice, no source. */
const smallPart = 0.3

/** Relative changes below this are rounding. */
const roundingPart = 1e-9

function changeLine({ objective, unit, mean, change, largestChange, bias, spread }: StepChange): string {
  if (largestChange <= roundingPart * Math.abs(mean)) return `${objective} does not change beyond rounding.`
  const u = unit === '1' ? '' : ` ${unit}`
  const ofMean = mean === 0 ? '' : ` (${percent(Math.abs(change / mean))} of its mean)`
  const sizes = `${objective} changes by ${short(change)}${u}${ofMean} on average, ${short(largestChange)}${u} at most, ${short(bias)}${u} with its sign`
  if (spread === undefined) return `${sizes}.`
  if (spread === 0)
    return `${sizes}; replicates of one machine do not differ${change === 0 ? '' : ', so nothing else hides it'}.`
  const against = `${sizes}; replicates of one machine differ by ${short(spread)}${u} (standard deviation)`
  return change <= smallPart * spread
    ? `${against}, so the step matters little.`
    : `${against}. The STEP MATTERS: choose a smaller one, or distrust differences of that size.`
}
