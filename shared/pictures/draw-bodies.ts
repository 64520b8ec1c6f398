// Rigid pieces: outlines filled like paper cut-outs. A machine's pieces are drawn firm, what it moves with a dotted edge
// and another fill. Round pieces carry a spoke, so that one sees them roll.

import { cos, sin } from '../detmath/trigonometry.js'
import type { FrameBody } from '../frames.js'
import { cornersOf, type Moment } from './moment.js'
import type { Operation } from './operations.js'
import type { Scene } from './scene.js'
import { nearness, pxOf, type View } from './view.js'

/** Something that is painted as a whole, at a distance from the viewer. */
export interface Piece {
  readonly nearnessM: number
  readonly operations: readonly Operation[]
}

/** Every body as one piece (2-D) or one a face (3-D). */
export function bodyPieces(scene: Scene, moment: Moment, view: View): Piece[] {
  return (scene.frames.bodies ?? []).flatMap((body, number) => {
    const corners = cornersOf(body, moment.poses[number]!)
    const loops = body.faces ?? [Array.from({ length: corners.length / 3 }, (_, corner) => corner)]
    return loops.map((loop) => {
      const points = loop.flatMap((corner) =>
        pxOf(view, corners[3 * corner]!, corners[3 * corner + 1]!, corners[3 * corner + 2]!),
      )
      const nearnessM = loop.reduce(
        (sum, corner) =>
          sum + nearness(view, corners[3 * corner]!, corners[3 * corner + 1]!, corners[3 * corner + 2]!),
        0,
      )
      const operations = pieceOperations(body, points, view, moment.poses[number]!)
      return { nearnessM: nearnessM / Math.max(1, loop.length), operations }
    })
  })
}

export function bodyLook(role: FrameBody['role']) {
  const isLoad = role === 'load'
  return {
    role: isLoad ? ('load' as const) : ('body' as const),
    edge: isLoad ? ('load' as const) : ('ink' as const),
    fill: isLoad ? ('loadFill' as const) : ('bodyFill' as const),
    dash: isLoad ? [1.5, 2] : [],
  }
}

function pieceOperations(body: FrameBody, points: number[], view: View, pose: Float64Array): Operation[] {
  const { role, edge, fill, dash } = bodyLook(body.role)
  const widthPx = 1.8 * view.unit
  const dashPx = dash.length > 0 ? { dashPx: dash.map((one) => one * widthPx) } : {}
  const radiusPx = (body.radiusM ?? 0) * view.pxPerM
  if (radiusPx === 0)
    return [
      {
        shape: 'lines',
        role,
        lines: [points],
        isClosed: true,
        fill,
        stroke: edge,
        widthPx,
        isRound: true,
        ...dashPx,
      },
    ]
  if (points.length === 2) return discOperations(body, points, radiusPx, view, pose)
  // A thick line in the edge's ink and a slightly thinner one in the fill's leave a rounded outline.
  const shape = { shape: 'lines', role, lines: [points], isClosed: points.length > 4, isRound: true } as const
  return [
    { ...shape, fill, stroke: edge, widthPx: 2 * radiusPx + widthPx },
    { ...shape, fill, stroke: fill, widthPx: Math.max(0.1, 2 * radiusPx - widthPx) },
  ]
}

function discOperations(
  body: FrameBody,
  [x, y]: number[],
  radiusPx: number,
  view: View,
  pose: Float64Array,
): Operation[] {
  const { role, edge, fill, dash } = bodyLook(body.role)
  const widthPx = 1.8 * view.unit
  const dashPx = dash.length > 0 ? { dashPx: dash.map((one) => one * widthPx) } : {}
  const disc: Operation = {
    shape: 'discs',
    role,
    discs: [x!, y!, radiusPx],
    fill,
    stroke: edge,
    widthPx,
    ...dashPx,
  }
  if (pose.length !== 3) return [disc]
  const spoke = cornersOf(
    { ...body, cornersM: [body.cornersM[0]! + (body.radiusM ?? 0), body.cornersM[1]!] },
    pose,
  )
  const end = pxOf(view, spoke[0]!, spoke[1]!, 0)
  return [disc, { shape: 'lines', role, lines: [[x!, y!, ...end]], stroke: edge, widthPx: view.unit }]
}

/** Outlines of a 3-D body's faces seen from straight above, as x, z; a ball's is a ring. */
export function bodyOutlines(body: FrameBody, pose: Float64Array): (readonly [number, number])[][] {
  const corners = cornersOf(body, pose)
  const radiusM = body.radiusM ?? 0
  if (corners.length === 3 && radiusM > 0) {
    const ring = Array.from({ length: 17 }, (_, i) => (i * Math.PI) / 8)
    return [
      ring.map((turn) => [corners[0]! + radiusM * cos(turn), corners[2]! + radiusM * sin(turn)] as const),
    ]
  }
  const loops = body.faces ?? [Array.from({ length: corners.length / 3 }, (_, corner) => corner)]
  return loops.map((loop) =>
    [...loop, loop[0]!].map((corner) => [corners[3 * corner]!, corners[3 * corner + 2]!] as const),
  )
}
