// The replay of one trial: every rigid piece, from the end of the settling on.

import type { FrameBody, Frames, Situation } from '../../../shared/problem.js'
import type { RigidWorld } from '../../rigid/rigid2d.js'
import type { RakeGenome } from './genome.js'
import { buildMachine, type Outline } from './machine.js'
import { bendStartM, numbers } from './numbers.js'
import { type IntakeCondition, type Piece, walls } from './screen.js'
import { runTrial } from './trial.js'

/** Frames of the work; a machine that cannot be put up has the one frame of how it was meant to stand. */
export function rakeFrames(genome: RakeGenome, { condition }: Situation<IntakeCondition>): Frames {
  const machine = buildMachine(genome, condition.strengths)
  const parts = machine.outlines.map((outline) => ({ body: outline.body, shape: partShape(outline) }))
  const pieces = condition.pieces.map((piece, i) => ({
    body: `${piece.kind} ${i + 1}`,
    shape: pieceShape(piece),
  }))
  const all = [...parts, ...pieces]
  const poses: Float64Array[][] = all.map(() => [])
  const pins = machine.driven.map(() => [] as number[])
  const positions: Float64Array[] = []
  runTrial(genome, condition, 1, (world) => {
    for (const [i, { body }] of all.entries()) poses[i]!.push(world.pose(world.body(body)))
    for (const [i, { joint }] of machine.driven.entries()) {
      const { effort, spec } = world.driveOf(world.joint(joint))
      pins[i]!.push(Math.max(-1, Math.min(1, effort / spec.effortMost)))
    }
    positions.push(pinPlaces(world, machine.joints))
  })
  if (positions.length === 0) {
    const start = new Map(
      [...machine.bodies].map((body) => [body.name, [...body.positionM, body.turn as number]]),
    )
    for (const [i, piece] of condition.pieces.entries()) {
      start.set(pieces[i]!.body, [...piece.positionM, 0])
    }
    for (const [i, { body }] of all.entries()) poses[i]!.push(Float64Array.from(start.get(body)!))
    positions.push(new Float64Array(2 * machine.joints.length))
    for (const pin of pins) pin.push(0)
  }
  return {
    dimensions: 2,
    secondsPerFrame: 1 / numbers.framesPerSecond,
    positions,
    links: [],
    nodeRadiiM: machine.joints.map(() => 0.015),
    ground: [
      [-1.2, 0],
      [0, 0],
    ],
    markers: [],
    drive: [],
    bodies: all.map(({ shape }, i): FrameBody => ({ ...shape, poses: poses[i]! })),
    motors: machine.driven.map(({ joint }, i) => ({
      node: machine.joints.findIndex(({ name }) => name === joint),
      label: `${joint} motor`,
      // A slide goes out along the arm, away from the pin at its other end.
      ...(machine.joints.find(({ name }) => name === joint)?.kind === 'slider' ? { slidesFrom: 0 } : {}),
      values: Float64Array.from(pins[i]!),
    })),
    walls: [
      { label: 'screen', pointsM: walls.screen, solid: 'right' },
      { label: 'apron and trough', pointsM: walls.apron, solid: 'right' },
      { label: 'apron and trough', pointsM: walls.trough, solid: 'right' },
      { label: 'water line', pointsM: waterLine(condition) },
    ],
    worthSeeing: { lowM: [-1.3, -0.1], highM: [1.6, 2.4] },
  }
}

/** From the edge of the picture to the screen; the crest stands higher than any water. */
function waterLine({ waterM }: IntakeCondition): number[] {
  return [-1.3, waterM, (waterM * bendStartM[0]) / bendStartM[1], waterM]
}

function pinPlaces(world: RigidWorld, joints: ReturnType<typeof buildMachine>['joints']): Float64Array {
  const places = new Float64Array(2 * joints.length)
  for (const [i, { a, onAM }] of joints.entries()) places.set(world.pointOf(world.body(a), onAM), 2 * i)
  return places
}

type Shape = Pick<FrameBody, 'label' | 'role' | 'cornersM' | 'radiusM'>

function partShape({ label, from, to, radiusM }: Outline): Shape {
  if (from === to) return { label, role: 'machine', cornersM: [...from], radiusM }
  const [dx, dy] = [to[0] - from[0], to[1] - from[1]]
  const scale = radiusM / Math.sqrt(dx * dx + dy * dy)
  const [nx, ny] = [-dy * scale, dx * scale]
  const corners = [
    [from[0] + nx, from[1] + ny],
    [from[0] - nx, from[1] - ny],
    [to[0] - nx, to[1] - ny],
    [to[0] + nx, to[1] + ny],
  ]
  return { label, role: 'machine', cornersM: corners.flat() }
}

function pieceShape({ kind, radiusM }: Piece): Shape {
  return { label: kind, role: 'load', cornersM: [0, 0], radiusM }
}
