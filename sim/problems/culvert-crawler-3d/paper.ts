// What a person is told of a crawler on three chains, what it is made of, and its replay.

import { asin, cos, sin } from '../../../shared/detmath/index.js'
import type { Parts, Process, Use } from '../../../shared/making/types.js'
import type { Caution, Frames, FrameWall, Situation } from '../../../shared/problem.js'
import { firstXM, lastXM } from '../culvert-crawler/floor.js'
import { crawlerProcess, partsOfMachine, useOfMachine } from '../culvert-crawler/making.js'
import { numbers } from '../culvert-crawler/numbers.js'
import { cautionsOfMachine, linesOfMachine, mm } from '../culvert-crawler/paper.js'
import { machineFrames } from '../culvert-crawler/replay.js'
import { buildBody3d, nodeName3d } from './body.js'
import { halfBreadthM, type PipeCondition, pipe, pipeGround } from './floor.js'
import { type Crawler3dGenome, placesPerColumn } from './genome.js'

/** Lines for a person, part by part, with units. */
export function describeCrawler3d(genome: Crawler3dGenome): readonly string[] {
  const body = buildBody3d(genome)
  const columns = Array.from({ length: body.columns }, (_, i) => {
    const [left, right] = [body.footNodes[2 * i]!, body.footNodes[2 * i + 1]!]
    return (
      `Column ${i + 1}: ${mm(-body.positionsM[3 * i]![0]!)} behind the front, ${mm(genome.width[i]!)} broad, ` +
      `${mm(genome.height[i]!)} high, feet ${left.foot} (left) and ${right.foot} (right).`
    )
  })
  return linesOfMachine(body, columns, nodeName3d)
}

export function cautionsOf3d(genome: Crawler3dGenome): readonly Caution[] {
  return cautionsOfMachine(buildBody3d(genome), 'it has no buckling, wear, water, roof, side walls or hoses')
}

export const crawler3dProcess: Process = { ...crawlerProcess, envelopeM: [0.7, 0.12, 0.12] }

export function partsOf3d(genome: Crawler3dGenome): Parts {
  return partsOfMachine(buildBody3d(genome))
}

export function useOf3d(genome: Crawler3dGenome): Use {
  return useOfMachine(buildBody3d(genome), placesPerColumn)
}

/** Frames from the settled body on, over the bottom of the pipe; its wall is drawn for scale. */
export function crawler3dFrames(genome: Crawler3dGenome, { condition }: Situation<PipeCondition>): Frames {
  const { spacingM, heightsM, rows, firstZM = 0 } = pipeGround(condition.debris)
  return {
    ...machineFrames(buildBody3d(genome), pipe, condition),
    ground: [],
    groundGrid: {
      firstXM,
      firstZM,
      spacingXM: spacingM,
      spacingZM: spacingM,
      countX: heightsM.length / rows,
      countZ: rows,
      heightsM: Float64Array.from(heightsM),
    },
    walls: pipeWall,
  }
}

const ringEveryM = 0.15
const ringPieces = 14

/** The pipe above the bottom that is simulated, for scale: rings, and lines along it. */
const pipeWall: readonly FrameWall[] = (() => {
  const label = 'wall of the culvert'
  const radiusM = numbers.boreM / 2
  const round = (value: number) => Math.round(1e4 * value) / 1e4
  // From where the bottom ends on one side, over the crown, to the other; 0 is the crown.
  const most = Math.PI - asin(halfBreadthM / radiusM)
  const around = (share: number) => {
    const turn = (2 * share - 1) * most
    return [round(radiusM + radiusM * cos(turn)), round(radiusM * sin(turn))]
  }
  const rings = Array.from({ length: Math.floor((lastXM - firstXM) / ringEveryM) + 1 }, (_, ring) => ({
    label,
    pointsM: Array.from({ length: ringPieces + 1 }, (_, i) => [
      round(firstXM + ring * ringEveryM),
      ...around(i / ringPieces),
    ]).flat(),
  }))
  const along = [0, 0.25, 0.5, 0.75, 1].map((share) => ({
    label,
    pointsM: [firstXM, ...around(share), lastXM, ...around(share)],
  }))
  return [...rings, ...along]
})()
