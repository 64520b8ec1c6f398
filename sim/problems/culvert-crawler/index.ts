// The culvert crawler as a problem: a soft truss that carries a sensor puck along a culvert with debris on its
// floor. What it is and which handbook cases stand behind it: README.md beside this file.

import { defineProblem } from '../../problem.js'
import { buildBody } from './body.js'
import { crawlerCost } from './cost.js'
import { culvert, drawCulvert } from './floor.js'
import { crawlerGenome, repairCrawler } from './genome.js'
import { crawlerProcess, partsOf, useOf } from './making.js'
import { measuresUpTo, objectives, simulateMachine } from './measure.js'
import { cautionsOf, describeCrawler } from './paper.js'
import { crawlerFrames } from './replay.js'

export default defineProblem({
  name: 'culvert-crawler',
  version: '3',
  summary: 'A soft truss crawls along a culvert with debris on its floor, carrying a sensor puck.',
  genome: crawlerGenome,
  objectives,
  measures: measuresUpTo(8, 41),
  drawCondition: drawCulvert,
  simulate: (genome, situations) => simulateMachine(buildBody(genome), culvert, situations),
  simulateFiner: (genome, situations, divide) =>
    simulateMachine(buildBody(genome), culvert, situations, divide),
  expectedCost: (genome) => crawlerCost(genome, culvert.slopeMost),
  repair: repairCrawler,
  frames: crawlerFrames,
  describe: describeCrawler,
  cautions: cautionsOf,
  process: crawlerProcess,
  parts: partsOf,
  use: useOf,
})
