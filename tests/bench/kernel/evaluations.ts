// Whole evaluations of the crawlers against their kernel alone: what the kernel wins must not be lost around it. Whole:
// conditions drawn, body built, ground laid out, lanes packed, moved, sampled, watched for collapse, measured. Alone: the
// same lattices moved for the same number of steps in one call.

import { conditionStream } from '../../../shared/conditions.js'
import { randomGenome } from '../../../shared/encodings.js'
import type { Genome } from '../../../shared/genome.js'
import type { AnyProblem } from '../../../shared/problem.js'
import { stream } from '../../../shared/streams.js'
import { evaluate } from '../../../sim/evaluate.js'
import { advanceLanes, lanesMost, packLanes } from '../../../sim/lattice/lanes.js'
import type { Lattice } from '../../../sim/lattice/layout.js'
import { asProblem } from '../../../sim/problem.js'
import { buildBody } from '../../../sim/problems/culvert-crawler/body.js'
import { culvert } from '../../../sim/problems/culvert-crawler/floor.js'
import type { CrawlerGenome } from '../../../sim/problems/culvert-crawler/genome.js'
import plane from '../../../sim/problems/culvert-crawler/index.js'
import type { Machine } from '../../../sim/problems/culvert-crawler/machine.js'
import {
  baseLattice,
  type Surroundings,
  situate,
  stepsOf,
  type World,
} from '../../../sim/problems/culvert-crawler/trial.js'
import { buildBody3d } from '../../../sim/problems/culvert-crawler-3d/body.js'
import { pipe } from '../../../sim/problems/culvert-crawler-3d/floor.js'
import type { Crawler3dGenome } from '../../../sim/problems/culvert-crawler-3d/genome.js'
import space from '../../../sim/problems/culvert-crawler-3d/index.js'

const seed = 20_261_201
const replicates = lanesMost.double
const bodies = 3

/** A problem with what makes its body. */
interface Crawler {
  readonly problem: AnyProblem
  readonly machineOf: (genome: Genome) => Machine
  readonly world: World<Surroundings>
}

const crawlers: { readonly 2: Crawler; readonly 3: Crawler } = {
  2: {
    problem: asProblem(plane),
    machineOf: (genome) => buildBody(genome as CrawlerGenome),
    world: culvert as World<Surroundings>,
  },
  3: {
    problem: asProblem(space),
    machineOf: (genome) => buildBody3d(genome as Crawler3dGenome),
    world: pipe as World<Surroundings>,
  },
}

const evaluateOnce = ({ problem }: Crawler, genome: Genome) =>
  evaluate(problem, genome, seed, true, 1, 0, replicates)

/** The first founders whose machines hold in every replicate: a trial that ends early measures nothing. */
function soundFounders(crawler: Crawler): Genome[] {
  const found: Genome[] = []
  for (let number = 0; found.length < bodies; number++) {
    const draw = stream(seed, 'founder', 1, number)
    const genome = crawler.problem.repair(randomGenome(crawler.problem.genome, draw))
    if (evaluateOnce(crawler, genome).failures.length === 0) found.push(genome)
  }
  return found
}

/** Microseconds of CPU for `times` evaluations of every founder. */
export function evaluationTimer(dimensions: 2 | 3): (times: number) => number {
  const crawler = crawlers[dimensions]
  const founders = soundFounders(crawler)
  return (times) => {
    const from = process.cpuUsage()
    for (let i = 0; i < times; i++) for (const genome of founders) evaluateOnce(crawler, genome)
    const { user, system } = process.cpuUsage(from)
    return user + system
  }
}

/** Microseconds of CPU of the kernel for the same. */
export function kernelTimer(dimensions: 2 | 3): (times: number) => number {
  const crawler = crawlers[dimensions]
  const { problem, world, machineOf } = crawler
  const trials = soundFounders(crawler).map((genome) => {
    const machine = machineOf(genome)
    const conditions = Array.from({ length: replicates }, (_, replicate) =>
      problem.drawCondition(conditionStream(seed, true, 1, replicate)),
    ) as Surroundings[]
    const base = baseLattice(machine, world.steepest)
    return {
      lattices: () => situate(base, machine, world, conditions),
      steps: stepsOf(machine, world.steepest),
    }
  })
  return (times) => {
    let spent = 0
    for (let i = 0; i < times; i++)
      for (const { lattices, steps } of trials) spent += moveOnly(lattices(), steps)
    return spent
  }
}

function moveOnly(lattices: readonly Lattice[], steps: number): number {
  const lanes = packLanes(lattices)
  const settling = lattices[0]!.driveStartStep
  const from = process.cpuUsage()
  advanceLanes(lanes, settling)
  for (const lattice of lattices) lattice.dragNspm = 0
  const faults = advanceLanes(lanes, steps - settling)
  const { user, system } = process.cpuUsage(from)
  if (faults.some((fault) => fault !== undefined)) throw new Error(JSON.stringify(faults))
  return user + system
}
