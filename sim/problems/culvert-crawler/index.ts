// The culvert crawler as a problem: a soft truss that carries a sensor puck along a culvert with debris on its
// floor. What it is and which handbook cases stand behind it: README.md beside this file.

import type { Situation } from '../../../shared/problem.js'
import { defineProblem } from '../../problem.js'
import { buildBody } from './body.js'
import { type CulvertCondition, drawCulvert } from './floor.js'
import { type CrawlerGenome, crawlerGenome, repairCrawler } from './genome.js'
import { crawlerProcess, partsOf, useOf } from './making.js'
import { numbers } from './numbers.js'
import { cautionsOf, describeCrawler } from './paper.js'
import { crawlerFrames } from './replay.js'
import { advanceFrame, distanceM, framesPerTrial, startTrial, stepsOf, type Trial } from './trial.js'

/** Highest value that is kept of the cost of transport: a body that stands still has none. */
const costMost = 10_000

function measure(trial: Trial) {
  const { tally, body } = trial
  const distance = distanceM(trial)
  const weightN = body.massKg * numbers.gravityMps2
  const cost = distance > 0 ? tally.workJ / (weightN * distance) : costMost
  return {
    objectives: { distance, material: body.materialKg },
    measures: {
      puckTravel: tally.puckHighM - tally.puckLowM,
      costOfTransport: Math.min(costMost, cost),
      contactDuty: tally.contacts / (tally.samples * body.columns),
      peakForce: tally.peakTensionN,
      bays: body.columns - 1,
      actuators: body.members.length - body.passiveCount,
    },
  }
}

function simulateOne(genome: CrawlerGenome, { condition }: Situation<CulvertCondition>) {
  const body = buildBody(genome)
  const trial = startTrial(genome, body, condition)
  if ('reason' in trial) return failed(trial)
  for (let frame = 0; frame < framesPerTrial; frame++) {
    const fault = advanceFrame(trial)
    if (fault) return failed(fault)
  }
  return measure(trial)
}

function failed({ reason, seconds }: { reason: string; seconds: number }) {
  return { failed: `${reason} at ${seconds.toFixed(2)} s` }
}

export default defineProblem({
  name: 'culvert-crawler',
  version: '1',
  summary: 'A soft truss crawls along a culvert with debris on its floor, carrying a sensor puck.',
  genome: crawlerGenome,
  objectives: {
    distance: { direction: 'maximise', unit: 'm' },
    material: { direction: 'minimise', unit: 'kg' },
  },
  measures: {
    puckTravel: { low: 0, high: 0.2, unit: 'm' },
    costOfTransport: { low: 0, high: costMost, unit: '1' },
    contactDuty: { low: 0, high: 1, unit: '1' },
    peakForce: { low: 0, high: 50, unit: 'N' },
    bays: { low: 2, high: 8, unit: '1' },
    actuators: { low: 0, high: 41, unit: '1' },
  },
  drawCondition: drawCulvert,
  simulate: (genome, situations) => situations.map((situation) => simulateOne(genome, situation)),
  expectedCost: (genome) => {
    const body = buildBody(genome)
    // In units of 20,000 strut steps; a node costs about as much as two struts.
    const work = (body.members.length + 2 * 2 * body.columns) * stepsOf(genome, body)
    return Math.max(1, Math.round(work / 20_000))
  },
  repair: repairCrawler,
  frames: crawlerFrames,
  describe: describeCrawler,
  cautions: cautionsOf,
  process: crawlerProcess,
  parts: partsOf,
  use: useOf,
})
