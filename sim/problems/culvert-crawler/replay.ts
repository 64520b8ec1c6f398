// The replay of one trial: where every node was, 25 times a second of simulated time.

import type { Frames, FrameWall, Situation } from '../../../shared/problem.js'
import { groundHeightM } from '../../lattice/ground.js'
import { planeStride as stride } from '../../lattice/layout.js'
import { commandedStrain } from '../../lattice/observe.js'
import { type Body, buildBody } from './body.js'
import { type CulvertCondition, culvertGround, firstXM, lastXM } from './floor.js'
import type { CrawlerGenome } from './genome.js'
import { numbers } from './numbers.js'
import { advanceFrame, framesPerTrial, startTrial, type Trial } from './trial.js'

/** Frames from the settled body on. A trial that fails ends where it failed; one that cannot settle has one frame. */
export function crawlerFrames(genome: CrawlerGenome, situation: Situation<CulvertCondition>): Frames {
  const body = buildBody(genome)
  const positions: Float64Array[] = []
  const contacts: Uint8Array[] = []
  const drives: number[][] = body.members.slice(body.passiveCount).map(() => [])
  const trial = startTrial(genome, body, situation.condition)
  if ('reason' in trial) {
    positions.push(Float64Array.from(body.positionsM.flat()))
    contacts.push(new Uint8Array(body.positionsM.length))
    for (const drive of drives) drive.push(0)
  } else {
    record(trial, positions, contacts, drives)
    for (let frame = 0; frame < framesPerTrial && !advanceFrame(trial); frame++) {
      record(trial, positions, contacts, drives)
    }
  }
  return {
    dimensions: 2,
    secondsPerFrame: 1 / numbers.framesPerSecond,
    positions,
    links: body.members.map(({ a, b, kind, group }) => ({
      a,
      b,
      kind: group < 0 ? kind : `actuator ${group + 1}`,
      ...(group < 0 ? { weight: weights[kind as 'soft'] } : {}),
    })),
    nodeRadiiM: radiiM(body),
    ground: groundLine(situation.condition),
    markers: [{ node: body.puckNode, label: 'sensor puck', radiusM: numbers.puckRadiusM }],
    drive: drives.map((values, i) => ({ link: body.passiveCount + i, values: Float64Array.from(values) })),
    contacts,
    walls: [crown],
  }
}

/** How bold a stiffness class is drawn. */
const weights = { soft: 0, firm: 0.5, hard: 1 }

/** The culvert's crown, for scale: bodies do not reach it, so it is not simulated. */
const crown: FrameWall = {
  label: 'crown of the culvert',
  pointsM: [firstXM, numbers.boreM, lastXM, numbers.boreM],
  solid: 'left',
}

function record(
  { lattice, body }: Trial,
  positions: Float64Array[],
  contacts: Uint8Array[],
  drives: number[][],
): void {
  const frame = new Float64Array(2 * lattice.nodeCount)
  const touches = new Uint8Array(lattice.nodeCount)
  for (let i = 0; i < lattice.nodeCount; i++) {
    frame[2 * i] = lattice.nodes[i * stride]!
    frame[2 * i + 1] = lattice.nodes[i * stride + 1]!
    touches[i] = frame[2 * i + 1]! < groundHeightM(lattice, frame[2 * i]!) ? 1 : 0
  }
  positions.push(frame)
  contacts.push(touches)
  for (const [i, drive] of drives.entries()) {
    const strain = body.strains[body.members[body.passiveCount + i]!.group]!
    drive.push(strain > 0 ? Math.min(1, Math.max(-1, commandedStrain(lattice, i) / strain)) : 0)
  }
}

/** Feet are drawn as large as their pads; nothing is simulated with these radii. */
function radiiM(body: Body): number[] {
  return body.positionsM.map((_, i) => (i % 2 === 0 && body.feet[i / 2] !== 'bare' ? 0.006 : 0.004))
}

function groundLine({ debris }: CulvertCondition): (readonly [number, number])[] {
  const { firstXM, spacingM, heightsM } = culvertGround(debris)
  return Array.from(heightsM, (height, i) => [firstXM + i * spacingM, height] as const)
}
