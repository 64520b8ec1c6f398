// The ground and what stands on it: a filled outline in 2-D; in 3-D a grid of round step with the machine's shadow, from
// which depth can be read. Walls are always drawn; in 2-D they are hatched on the side where the solid is.

import type { Frames } from '../frames.js'
import type { Point } from './boxes.js'
import { clippedLine, clippedPiece, withoutStraightPoints } from './clip.js'
import { roundStepUp } from './measure.js'
import type { Operation } from './operations.js'
import { dot } from './projection.js'
import { type Scene, wallPieces } from './scene.js'
import { nearness, pxOf, type View } from './view.js'

/** The ground of a 2-D scene from edge to edge of the view. */
export function groundOperations(scene: Scene, view: View): Operation[] {
  const { height } = scene
  if (height === undefined) return []
  const bottom = view.topPx + view.heightPx
  const [left, right] = [view.originRightM, view.originRightM + view.widthPx / view.pxPerM]
  const inside = scene.frames.ground.filter(([x]) => x > left && x < right)
  const points = [[left, height(left, 0)] as const, ...inside, [right, height(right, 0)] as const]
  const line = withoutStraightPoints(
    points.flatMap(([x, y]) => {
      const [px, py] = pxOf(view, x, y, 0)
      return [px, Math.min(bottom, Math.max(view.topPx, py))]
    }),
  )
  const edge = [line[line.length - 2]!, bottom, line[0]!, bottom]
  return [
    { shape: 'lines', role: 'ground', lines: [[...line, ...edge]], isClosed: true, fill: 'groundFill' },
    { shape: 'lines', role: 'ground', lines: [line], stroke: 'ground', widthPx: 2 * view.unit },
  ]
}

/** Step of the 3-D ground grid: round, and no finer than reads well. */
export function gridStepM({ pxPerM, unit }: View): number {
  return roundStepUp((34 * unit) / pxPerM)
}

/** Lines of the 3-D ground over a stretch around the middle of the view. */
export function gridOperations(scene: Scene, view: View): Operation[] {
  const { height } = scene
  if (height === undefined) return []
  const step = gridStepM(view)
  const [lowX, highX, lowZ, highZ] = gridEdges(scene, view, step)
  const samples = 4
  const lines: number[][] = []
  const add = (points: number, at: (i: number) => readonly [number, number]) => {
    const line: number[] = []
    for (let i = 0; i <= points; i++) {
      const [x, z] = at(i)
      line.push(...pxOf(view, x, height(x, z), z))
    }
    lines.push(...clippedLine(line, view))
  }
  const [pointsX, pointsZ] = [highX - lowX, highZ - lowZ].map((long) => Math.ceil((samples * long) / step))
  for (const z of crossings(lowZ, highZ, step))
    add(pointsX!, (i) => [lowX + ((highX - lowX) * i) / pointsX!, z])
  for (const x of crossings(lowX, highX, step))
    add(pointsZ!, (k) => [x, lowZ + ((highZ - lowZ) * k) / pointsZ!])
  return [{ shape: 'lines', role: 'ground', lines, stroke: 'grid', widthPx: view.unit }]
}

/** Both ends and the whole steps between them. */
function crossings(low: number, high: number, step: number): number[] {
  const first = Math.ceil(low / step + 1e-6)
  const count = Math.max(0, Math.floor(high / step - 1e-6) - first + 1)
  return [low, ...Array.from({ length: count }, (_, i) => (first + i) * step), high]
}

/** Whole steps around what the view shows of the ground, and around the machine's way across. */
function gridEdges({ wayBox, frames }: Scene, view: View, step: number) {
  const middleRight = view.originRightM + view.widthPx / view.pxPerM / 2
  // The view's middle on the ground: go along the way until it lies there.
  const { right } = view.axes
  const halfM = (0.6 * view.widthPx) / view.pxPerM / Math.max(0.2, Math.abs(right[0]))
  const acrossM = dot(right, 0, 0, (wayBox.low[2] + wayBox.high[2]) / 2)
  const middleX =
    Math.abs(right[0]) > 0.2 ? (middleRight - acrossM) / right[0] : (wayBox.low[0] + wayBox.high[0]) / 2
  const sideM = Math.max(2 * step, 0.35 * (wayBox.high[2] - wayBox.low[2]))
  const [lowX, highX] = [
    Math.max(middleX - halfM, wayBox.low[0] - sideM),
    Math.min(middleX + halfM, wayBox.high[0] + sideM),
  ]
  const down = (value: number) => Math.floor(value / step) * step
  const up = (value: number) => Math.ceil(value / step) * step
  const [mostX, mostZ] = groundEnds(frames)
  return [
    Math.max(mostX[0], down(Math.min(lowX, highX))),
    Math.min(mostX[1], up(Math.max(lowX, highX))),
    Math.max(mostZ[0], down(wayBox.low[2] - sideM)),
    Math.min(mostZ[1], up(wayBox.high[2] + sideM)),
  ] as const
}

/** Where the ground is known, along and across: beyond a grid it only goes on level. */
function groundEnds({ groundGrid }: Frames) {
  if (groundGrid === undefined)
    return [[-Infinity, Infinity] as const, [-Infinity, Infinity] as const] as const
  const { firstXM, firstZM, spacingXM, spacingZM, countX, countZ } = groundGrid
  return [
    [firstXM, firstXM + spacingXM * (countX - 1)] as const,
    [firstZM, firstZM + spacingZM * (countZ - 1)] as const,
  ] as const
}

const hatchEveryPx = 9
const hatchPx = 7

/** Walls of a 2-D scene, with their hatch. */
export function flatWallOperations(scene: Scene, view: View): Operation[] {
  const lines: number[][] = []
  const hatches: number[][] = []
  for (const { pointsM, solid } of scene.frames.walls ?? []) {
    const line: number[] = []
    for (let i = 0; i < pointsM.length; i += 2) line.push(...pxOf(view, pointsM[i]!, pointsM[i + 1]!, 0))
    const pieces = clippedLine(line, view)
    lines.push(...pieces)
    if (solid === undefined) continue
    for (const piece of pieces) hatches.push(...hatchOf(piece, solid === 'left' ? 1 : -1, view))
  }
  if (lines.length === 0) return []
  return [
    { shape: 'lines', role: 'hatch', lines: hatches, stroke: 'wall', widthPx: view.unit },
    { shape: 'lines', role: 'wall', lines, stroke: 'wall', widthPx: 2.6 * view.unit },
  ]
}

/** Slanted strokes along a line. On the picture y runs down, so the left of a line is at (dy, -dx). */
export function hatchOf(
  line: readonly number[],
  side: number,
  view: Pick<View, 'unit'> & Parameters<typeof clippedPiece>[4],
) {
  const strokes: number[][] = []
  const every = hatchEveryPx * view.unit
  const long = hatchPx * view.unit
  let left = every / 2
  for (let i = 0; i + 3 < line.length; i += 2) {
    const [dx, dy] = [line[i + 2]! - line[i]!, line[i + 3]! - line[i + 1]!]
    const length = Math.sqrt(dx * dx + dy * dy)
    for (; left <= length; left += every) {
      const [x, y] = [line[i]! + (left / length) * dx, line[i + 1]! + (left / length) * dy]
      const [alongX, alongY] = [dx / length, dy / length]
      const toX = x + long * (side * alongY - 0.7 * alongX)
      const toY = y + long * (-side * alongX - 0.7 * alongY)
      const cut = clippedPiece(x, y, toX, toY, view)
      if (cut !== undefined) strokes.push([...cut])
    }
    left -= length
  }
  return strokes
}

/** Walls of a 3-D scene: what lies behind the machine's own line first; what lies before it fine and pale, at the end. */
export function solidWallOperations(scene: Scene, view: View, middle: Point) {
  const far: number[][] = []
  const near: number[][] = []
  for (const { pointsM } of scene.frames.walls ?? []) {
    for (const [a, b] of wallPieces(pointsM, 3)) {
      const cut = clippedPiece(...pxOf(view, ...a), ...pxOf(view, ...b), view)
      if (cut === undefined) continue
      // Along the way the comparison goes with the wall: a long pipe has a near and a far side everywhere.
      const along = (a[0] + b[0]) / 2
      const depth = nearness(view, along, middle[1], middle[2])
      const isNear = (nearness(view, ...a) + nearness(view, ...b)) / 2 > depth
      ;(isNear ? near : far).push([...cut])
    }
  }
  const wall = (lines: number[][], widthPx: number, strokeOpacity: number): Operation[] =>
    lines.length === 0
      ? []
      : [{ shape: 'lines', role: 'wall', lines, stroke: 'wall', widthPx: widthPx * view.unit, strokeOpacity }]
  return { far: wall(far, 1.5, 0.85), near: wall(near, 1, 0.5) }
}
