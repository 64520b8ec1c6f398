// The culvert crawler in space: a soft truss of three chains that carries a sensor puck along the round bottom of a pipe
// with debris left and right. Trial, measures and making are those of the plane one (../culvert-crawler).

import { defineProblem } from '../../problem.js'
import { costOf, measuresUpTo, objectives, simulateMachine } from '../culvert-crawler/measure.js'
import { buildBody3d } from './body.js'
import { drawPipe, pipe } from './floor.js'
import { crawler3dGenome, repairCrawler3d } from './genome.js'
import {
  cautionsOf3d,
  crawler3dFrames,
  crawler3dProcess,
  describeCrawler3d,
  partsOf3d,
  useOf3d,
} from './paper.js'

export default defineProblem({
  name: 'culvert-crawler-3d',
  version: '2',
  summary: 'A soft truss of three chains crawls along the round bottom of a pipe, carrying a sensor puck.',
  genome: crawler3dGenome,
  objectives,
  measures: measuresUpTo(6, 75),
  drawCondition: drawPipe,
  simulate: (genome, situations) => simulateMachine(buildBody3d(genome), pipe, situations),
  simulateFiner: (genome, situations, divide) =>
    simulateMachine(buildBody3d(genome), pipe, situations, divide),
  expectedCost: (genome) => costOf(buildBody3d(genome), pipe),
  repair: repairCrawler3d,
  frames: crawler3dFrames,
  describe: describeCrawler3d,
  cautions: cautionsOf3d,
  process: crawler3dProcess,
  parts: partsOf3d,
  use: useOf3d,
})
