// Promises of the ramp walker as a problem. The published gaits themselves: tests/reference/walking-*.test.ts.

import { describe, expect, test } from 'vitest'
import { searchTools } from '../../../coordinator/evolution/build.js'
import { defaultOperators } from '../../../coordinator/evolution/operators/index.js'
import type { SearchPlan } from '../../../coordinator/evolution/plan.js'
import { conditionStream } from '../../../shared/conditions.js'
import type { Genome } from '../../../shared/genome.js'
import { stream } from '../../../shared/streams.js'
import { drivenSearch, gateOf } from '../../../tests/drive-search.js'
import { islandPlan, mixedPlan } from '../../../tests/fixture.js'
import { evaluate } from '../../evaluate.js'
import { asProblem, problemPlan } from '../../problem.js'
import { findGait } from './gaits.js'
import problem from './index.js'
import { numbers, timeSeconds } from './numbers.js'
import { releaseOf, walkerProblem } from './release.js'
import { drawRamp, walk } from './walk.js'

/** Start values of the published gaits at slope 0.009 (Bhounsule, 2014), in SI units. */
function gait(theta: number, thetaRate: number, phiRate: number): Genome {
  return {
    legAngle: Float64Array.of(theta),
    pace: Float64Array.of(-thetaRate / theta / timeSeconds),
    swing: Float64Array.of(phiRate / ((1 - Math.cos(2 * theta)) * thetaRate)),
  }
}
const long = gait(0.20031090054, -0.199832473, -0.01582299995)
const short = gait(0.19393736981, -0.20386692744, -0.01514426085)

const situation = (replicate: number) => ({
  condition: problem.drawCondition(conditionStream(20_261_201, true, 1, replicate)),
  case: '',
})
function simulated(genome: Genome, replicate: number) {
  const outcome = problem.simulate(genome, [situation(replicate)])[0]!
  if ('failed' in outcome) throw new Error(outcome.failed)
  return { ...outcome.objectives, ...outcome.measures }
}

describe('a walk', () => {
  test('the long gait walks to the end under nearly all conditions, the short one under few', () => {
    const whole = (genome: Genome) =>
      Array.from({ length: 40 }, (_, j) => simulated(genome, j).steps!).filter(
        (steps) => steps === numbers.stepsMost,
      ).length
    expect(whole(long)).toBeGreaterThan(36)
    expect(whole(short)).toBeLessThan(20)
  })

  test('measures are the published ones in SI units', () => {
    const measured = simulated(long, 0)
    // Garcia and others, 1998; Bhounsule, 2014: period 3.8824637529, speed 0.102498844594, multiplier 0.58911319.
    expect(measured.unsteadiness).toBeLessThan(1e-8)
    expect(measured.speed! / (0.102498844594 * Math.sqrt(9.81 * 0.8))).toBeCloseTo(1, 6)
    expect(measured.period! / (3.8824637529 * Math.sqrt(0.8 / 9.81))).toBeCloseTo(1, 6)
    expect(measured.stepLength! / (0.397948048842 * 0.8)).toBeCloseTo(1, 8)
    expect(measured.multiplier).toBeCloseTo(0.58911319, 6)
    expect(simulated(short, 0).multiplier).toBeCloseTo(4.00386436, 5)
  })

  test('a quarter of the step changes no angle and no period by more than 1e-6', () => {
    const { stance, gamma } = releaseOf(long)
    const even = { unevenness: Array(numbers.stepsMost).fill(0), nudges: Array(numbers.stepsMost).fill(0) }
    const [coarse, fine] = [1, 4].map((parts) => walk(stance, gamma, even, numbers.step / parts))
    for (const [i, { next, period }] of coarse!.taken.entries()) {
      expect(Math.abs(next.theta - fine!.taken[i]!.next.theta)).toBeLessThan(1e-6)
      expect(Math.abs(period - fine!.taken[i]!.period)).toBeLessThan(1e-6)
    }
  })

  test('a walker that does not get through its first step fails, and says how and when', () => {
    const slow = gait(0.3, -0.25, 0)
    const fast = gait(0.1, -0.13, 0.05)
    const reasonOf = (genome: Genome) => {
      const outcome = problem.simulate(genome, [situation(0)])[0]!
      return 'failed' in outcome ? outcome.failed : 'walked'
    }
    expect(reasonOf(slow)).toMatch(/^fell backwards in the first step, at \d\.\d\d s$/)
    expect(reasonOf(fast)).toMatch(/^fell forwards in the first step, at \d\.\d\d s$/)
  })

  test('conditions scatter as stated: three standard deviations at most, a nudge every fourth step', () => {
    const ramps = Array.from({ length: 200 }, (_, j) => drawRamp(stream(1, 'condition', 0, 0, j)))
    const uneven = ramps.flatMap((ramp) => ramp.unevenness)
    const variance = uneven.reduce((sum, one) => sum + one * one, 0) / uneven.length
    // 4 standard errors; cutting off at 3 deviations takes 1 % of the variance.
    const ratio = variance / (numbers.unevennessRad * numbers.unevennessRad)
    expect(Math.abs(ratio - 0.987)).toBeLessThan(4 * Math.sqrt(2 / uneven.length))
    expect(Math.max(...uneven.map(Math.abs))).toBeLessThanOrEqual(3 * numbers.unevennessRad)
    for (const { nudges } of ramps) {
      for (const [i, nudge] of nudges.entries()) {
        if (i % 4 === 3) expect(Math.abs(nudge)).toBeLessThanOrEqual(numbers.nudgeMost)
        else expect(nudge).toBe(0)
      }
    }
  })

  test('the same twice, to the bit, and in any order', () => {
    const both = problem.simulate(long, [situation(1), situation(2)])
    expect(problem.simulate(long, [situation(2), situation(1)])).toEqual([both[1], both[0]])
  })
})

describe('a replay', () => {
  const frames = problem.frames!(long, situation(0))

  test('has rigid legs, feet on the ramp, and walks as far as the steps say', () => {
    for (const frame of frames.positions) {
      const [hipX, hipY, stanceX, stanceY, swingX, swingY] = Array.from(frame)
      expect(Math.hypot(hipX! - stanceX!, hipY! - stanceY!)).toBeCloseTo(0.8, 12)
      expect(Math.hypot(hipX! - swingX!, hipY! - swingY!)).toBeCloseTo(0.8, 12)
    }
    const feet = frames.ground.slice(1, -1)
    expect(feet).toHaveLength(numbers.stepsMost)
    const last = feet.at(-1)!
    expect(last[0]).toBeGreaterThan(0.9 * (numbers.stepsMost - 1) * 0.318)
    expect(last[1] / last[0]).toBeCloseTo(-0.009, 3)
  })

  test('the swing foot is at the ramp at both ends of a step, and runs on where it stops being one', () => {
    const steps: number[] = []
    for (const [i, frame] of frames.positions.entries()) {
      if (i > 0 && frame[2] !== frames.positions[i - 1]![2]) steps.push(i)
    }
    expect(steps).toHaveLength(numbers.stepsMost - 1)
    for (const i of steps) {
      // The new stance foot is where the swing foot came down, less than a frame before.
      const before = frames.positions[i - 1]!
      const now = frames.positions[i]!
      expect(Math.hypot(before[4]! - now[2]!, before[5]! - now[3]!)).toBeLessThan(0.03)
      expect(Math.hypot(before[2]! - now[4]!, before[3]! - now[5]!)).toBeLessThan(0.03)
    }
  })
})

describe('a small search', () => {
  const seed = 20_261_201

  /** The best of a steady-state search on one island, all in memory, by the settings of search.yaml. */
  function found(aim: 'steady' | 'fast', simulations: number): Genome {
    const over = asProblem(walkerProblem({ aim }))
    const { migration: _, ...mixed } = mixedPlan()
    const finely = { operator: 'gaussian', settings: { sigma: 0.02, changes: 0.5 } }
    const operators = Object.fromEntries(
      Object.entries(defaultOperators(over.genome)).map(([part, plan]) => [
        part,
        { ...plan, mutation: finely },
      ]),
    )
    const plan: SearchPlan = {
      ...mixed,
      seed,
      problem: problemPlan(over, '0'.repeat(64)),
      islands: [islandPlan(1, { method: 'steady-state', population: 40, lookahead: 4, operators })],
      controls: [],
      replicates: { first: 2, topUp: 2, most: 8, shared: true },
      budget: { simulations },
    }
    const gate = gateOf((_island, { individual, firstReplicate, replicates }) =>
      evaluate(over, individual.genome, seed, true, individual.id, firstReplicate, replicates),
    )
    const { best } = drivenSearch(plan, gate, searchTools(plan, over)).islands[0]!
    return best!.genome
  }

  /** Newton's method from the release that a search found. */
  function refined(genome: Genome) {
    const { stance, gamma } = releaseOf(genome)
    return findGait([stance.theta, stance.thetaRate], gamma, 1, 0.02)!
  }

  test('finds the long gait at slope 0.009', () => {
    const genome = found('steady', 3_000)
    const measured = simulated(genome, 100)
    expect(Math.abs(releaseOf(genome).stance.theta / 0.200310900544 - 1)).toBeLessThan(0.02)
    expect(measured.steps).toBe(numbers.stepsMost)
    expect(measured.multiplier).toBeLessThan(0.7)
    expect(refined(genome).theta).toBeCloseTo(0.200310900544, 9)
  }, 60_000)

  test('finds the short gait when only the first step counts', () => {
    const genome = found('fast', 2_000)
    expect(Math.abs(releaseOf(genome).stance.theta / 0.19393736981 - 1)).toBeLessThan(0.02)
    expect(simulated(genome, 100).multiplier).toBeGreaterThan(3)
    expect(refined(genome).theta).toBeCloseTo(0.19393736981, 9)
  }, 60_000)
})
