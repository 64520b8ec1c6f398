// What is evolved, how it is simulated and what is measured, for a ramp of given slope and for one whose slope is
// evolved too. The genome is in SI units; the model works in its own.

import { sin } from '../../../shared/detmath/trigonometry.js'
import { real } from '../../../shared/encodings.js'
import type { Genome, GenomeSpec } from '../../../shared/genome.js'
import type { Situation } from '../../../shared/problem.js'
import { defineProblem, type ObjectiveInput } from '../../problem.js'
import { type Stance, stanceAfterStrike } from './model.js'
import { numbers, timeSeconds } from './numbers.js'
import { describeWalker, partsOfWalker, useOfWalker, walkerProcess } from './paper.js'
import { walkerFrames } from './replay.js'
import { drawRamp, multiplierAt, type Ramp, unsteadiness, walk } from './walk.js'

const start = {
  legAngle: real({ low: 0.08, high: 0.35, unit: 'rad' }),
  // Angular speed of the front leg over its angle: an inverted pendulum of the leg's length needs about
  // sqrt(gravity / leg), 3.5 / s, to come over the top, so that useful angles and speeds go together.
  pace: real({ low: 2.8, high: 4.6, unit: '1/s' }),
  // Angular speed between the legs, as a multiple of what a heel strike at this angle and speed leaves behind.
  swing: real({ low: -1, high: 3, unit: '1' }),
} as const
const slopeEvolved = real({ low: numbers.gammaLow, high: numbers.gammaHigh, unit: 'rad' })

/**
 * What is asked of a walker; a row each. Both count a walk in full only where its first step ends as it began, half
 * where it ends `numbers.steadiness` away. Two gaits do: the long one, which is stable and takes all steps there
 * are, and the faster short one, which errors throw out after a few.
 */
const aims = {
  steady: { steadySteps: { direction: 'maximise', unit: '1' } },
  fast: { steadySpeed: { direction: 'maximise', unit: 'm/s' } },
} as const satisfies { readonly [aim: string]: { readonly [name: string]: ObjectiveInput } }

export interface WalkerOptions {
  /** 'steady' unless said. */
  readonly aim?: keyof typeof aims
  /** 'given': 0.009 rad, for which gaits are published; 'evolved': a part of the genome. 'given' unless said. */
  readonly slope?: 'given' | 'evolved'
}

/** How a genome lets the walker go. */
export interface Release {
  readonly stance: Stance
  readonly gamma: number
}

export function releaseOf(genome: Genome): Release {
  const value = (part: string) => genome[part]![0]!
  const theta = value('legAngle')
  const { thetaRate, phiRate } = stanceAfterStrike(theta, -value('pace') * theta * timeSeconds)
  return {
    stance: { theta, thetaRate, phiRate: phiRate * value('swing') },
    gamma: genome.slope?.[0] ?? numbers.gamma,
  }
}

/** Every number of a walk that a row of `aims` or the measures may name. */
function numbersOf({ stance, gamma }: Release, multiplier: number, condition: Ramp, divide: number) {
  const { taken, fall } = walk(stance, gamma, condition, numbers.step / divide)
  const first = taken[0]
  if (!first) {
    const { fell, period } = fall!
    return { failed: `${fell} in the first step, at ${(period * timeSeconds).toFixed(2)} s` }
  }
  const period = first.period * timeSeconds
  // Both feet are on the ramp, the legs at theta and -theta from its normal.
  const stepLength = 2 * numbers.legM * sin(first.next.theta)
  const away = unsteadiness(stance, first.next)
  const speed = stepLength / period
  return {
    steps: taken.length,
    unsteadiness: away,
    speed,
    steadySteps: taken.length / (1 + away / numbers.steadiness),
    steadySpeed: speed / (1 + away / numbers.steadiness),
    period,
    stepLength,
    multiplier,
    slope: gamma,
  }
}

const measures = {
  steps: { low: 0, high: numbers.stepsMost, unit: '1' },
  unsteadiness: { low: 0, high: 1, unit: '1' },
  speed: { low: 0, high: 2, unit: 'm/s' },
  period: { low: 0, high: 4, unit: 's' },
  stepLength: { low: 0, high: 1.6, unit: 'm' },
  multiplier: { low: 0, high: numbers.multiplierMost, unit: '1' },
  slope: { low: 0, high: 0.03, unit: 'rad' },
} as const

/** The problem with another aim or slope than the one that comes as the default export. */
export function walkerProblem({ aim = 'steady', slope = 'given' }: WalkerOptions = {}) {
  const objectives: { readonly [name: string]: ObjectiveInput } = aims[aim]
  const chosen = <T>(names: readonly string[], from: { readonly [name: string]: T }) =>
    Object.fromEntries(names.map((name) => [name, from[name]!]))
  function simulated(genome: Genome, situations: readonly Situation<Ramp>[], divide: number) {
    const release = releaseOf(genome)
    const multiplier = multiplierAt(release.stance, release.gamma)
    return situations.map(({ condition }) => {
      const found = numbersOf(release, multiplier, condition, divide)
      if (typeof found.failed === 'string') return { failed: found.failed }
      return {
        objectives: chosen(Object.keys(objectives), found),
        measures: chosen(Object.keys(measures), found),
      }
    })
  }
  return defineProblem<GenomeSpec, Ramp>({
    name: 'ramp-walker',
    version: '1',
    summary:
      'A passive walker on two straight legs is let go on the ramp of a drained channel and walks down it.',
    genome: slope === 'given' ? start : { ...start, slope: slopeEvolved },
    objectives,
    measures,
    drawCondition: drawRamp,
    simulate: (genome, situations) => simulated(genome, situations, 1),
    simulateFiner: simulated,
    frames: (genome, { condition }) => walkerFrames(releaseOf(genome), condition),
    describe: (genome) => describeWalker(releaseOf(genome)),
    process: walkerProcess,
    parts: partsOfWalker,
    use: useOfWalker,
  })
}
